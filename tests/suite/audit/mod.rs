//! The audit of whole plans, from DICOM bytes to verdicts, against the one
//! number that a dosimetry protocol fixes by definition: under reference
//! conditions (10 cm x 10 cm, SSD 90 cm, depth 10 cm) the TG-71 6 MV data set
//! gives 0.8 cGy/MU, so 100 MU give 0.8 Gy. Where another field is needed, its
//! dose per MU is worked by hand from the tables beside it.

mod absent;
mod compare;
mod group;
mod plan;

use std::path::Path;
use std::sync::LazyLock;

use counterfoil::audit::{BeamEntry, PlanEntry, PlanInput, Rivals, audit_plan};
use counterfoil::beam_model::{ModelSet, load_models};
use counterfoil::dose::DepthRow;
use counterfoil::plan::read_plan;
use counterfoil::settings::Site;

use crate::builder::{BeamSpec, Encoding, PlanSpec, encode};

/// 0.8 cGy/MU x 100 MU: AAPM TG-71 6 MV reference data set, D'0 at SSD 90 cm, d0 10 cm.
const REFERENCE_DOSE_GY: f64 = 0.8;

static MODELS: LazyLock<ModelSet> = LazyLock::new(|| {
    load_models(&Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/models")).unwrap()
});

/// One beam under reference conditions, 100 MU, with the dose that the data set gives.
fn reference_plan() -> PlanSpec {
    PlanSpec::default()
        .map_beam(|beam| beam.with_machine("TG71-TPR"))
        .with_beam_dose(REFERENCE_DOSE_GY)
}

/// Another beam under reference conditions, from another side.
fn second_beam() -> BeamSpec {
    BeamSpec::new(2, "Posterior")
        .with_machine("TG71-TPR")
        .with_gantry(180.0)
}

fn audit_bytes(bytes: &[u8], site: &Site, rivals: &Rivals, rows: &[DepthRow]) -> PlanEntry {
    let plan = read_plan(bytes).unwrap();
    audit_plan(PlanInput {
        file: "a.dcm",
        sha256: "",
        plan: &plan,
        rivals,
        models: &MODELS,
        site,
        depth_rows: rows,
    })
}

fn audit(spec: &PlanSpec) -> PlanEntry {
    let bytes = encode(&spec.object(), Encoding::ExplicitLittle);
    audit_bytes(&bytes, &Site::default(), &Rivals::default(), &[])
}

fn only_beam(spec: &PlanSpec) -> BeamEntry {
    let entry = audit(spec);
    assert_eq!(entry.beams.len(), 1);
    entry.beams.into_iter().next().unwrap()
}

fn near(found: Option<f64>, expected: f64, within: f64) {
    let found = found.unwrap();
    assert!(
        (found - expected).abs() <= within,
        "{found} is not {expected} within {within}"
    );
}
