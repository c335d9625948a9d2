//! Plans of techniques that the calculation does not cover yet. Their doses
//! are typed and mean nothing.

use counterfoil::audit::Verdict;

use super::course::{ISOCENTRE_CM, department_plan};
use super::sample::Sample;
use crate::builder::{BeamSpec, DoseReferenceSpec, Encoding, GroupSpec, ReferenceSpec};

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    vec![electrons()]
}

/// One beam, 25 fractions.
fn plan(
    (serial, family, label): (u16, &str, &str),
    beam: BeamSpec,
    (meterset_mu, dose_gy): (f64, f64),
    file: &str,
    shows: &'static str,
) -> Sample {
    let mut spec = department_plan(serial, family, label, "One beam");
    let mut reference = ReferenceSpec::new(beam.number, meterset_mu, dose_gy);
    reference.point_cm = Some(ISOCENTRE_CM);
    spec.dose_references = vec![DoseReferenceSpec {
        point_cm: Some(ISOCENTRE_CM),
        prescription_gy: Some(25.0 * dose_gy),
        ..DoseReferenceSpec::default()
    }];
    spec.beams = vec![beam];
    spec.groups = vec![GroupSpec {
        fractions: Some(25),
        beams: vec![reference],
        ..GroupSpec::default()
    }];
    Sample {
        path: format!("not-yet/{file}"),
        shows,
        spec,
        encoding: Encoding::ExplicitLittle,
        scatter_percent: Vec::new(),
        verdict: Verdict::NotVerifiable,
        checks: &[],
        sound: None,
    }
}

fn electrons() -> Sample {
    let mut beam = BeamSpec::new(1, "Boost")
        .with_machine("ROWAN-2")
        .with_electrons(9.0, "A10")
        .with_isocentre(ISOCENTRE_CM)
        .with_ssd(98.0);
    beam.fluence = None;
    plan(
        (206, "Yew", "ELECTRONS"),
        beam,
        (210.4, 2.0),
        "electrons.dcm",
        "a 9 MeV electron beam with an applicator",
    )
}
