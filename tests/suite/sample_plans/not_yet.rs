//! Plans of techniques that the calculation does not cover yet. Their doses
//! are typed and mean nothing.

use counterfoil::audit::Verdict;

use super::course::{ISOCENTRE_CM, beam, department_plan};
use super::sample::Sample;
use crate::builder::{BeamSpec, DoseReferenceSpec, Encoding, GroupSpec, ReferenceSpec, WedgeSpec};

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    vec![dynamic_wedge(), electrons()]
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

fn dynamic_wedge() -> Sample {
    plan(
        (204, "Sumac", "WEDGE"),
        beam(1, "Left", "ROWAN-2", 6.0)
            .with_field(14.0, 14.0)
            .with_ssd(91.5)
            .with_gantry(90.0)
            .with_wedge(WedgeSpec {
                number: 1,
                kind: "DYNAMIC".to_owned(),
                id: "D30".to_owned(),
                angle_deg: 30,
                factor: None,
                orientation_deg: 0.0,
                source_to_tray_cm: None,
            }),
        (201.7, 1.5),
        "dynamic-wedge.dcm",
        "a dynamic wedge of 30 degrees; how its jaw moves stands in the machine, not in the plan",
    )
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
