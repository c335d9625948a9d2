//! Plans of techniques that the calculation does not cover yet. Their doses
//! are typed and mean nothing.

use counterfoil::audit::Verdict;

use super::clean::rowan_leaves;
use super::course::{ISOCENTRE_CM, beam, department_plan};
use super::sample::Sample;
use crate::builder::{
    BeamSpec, BlockSpec, DoseReferenceSpec, Encoding, GroupSpec, PointSpec, ReferenceSpec,
    WedgeSpec,
};

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    vec![
        leaf_shaped(),
        segments(),
        arc(),
        wedge(),
        block(),
        electrons(),
    ]
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

fn field(name: &str) -> BeamSpec {
    beam(1, name, "ROWAN-2", 6.0)
        .with_field(14.0, 14.0)
        .with_ssd(91.5)
}

/// A lens-shaped opening of this half width in the middle, shifted along the leaves.
fn lens(half_cm: f64, shift_cm: f64) -> Vec<f64> {
    let boundaries_cm = rowan_leaves().boundaries_cm;
    let half_widths_cm: Vec<f64> = boundaries_cm
        .windows(2)
        .map(|pair| {
            let middle_cm = (pair[0] + pair[1]) / 2.0;
            // Leaves beyond the lens close 1 mm apart.
            let half_cm = half_cm * (1.0 - (middle_cm / 7.0).powi(2));
            (half_cm.max(0.05) * 100.0).round() / 100.0
        })
        .collect();
    let lower = half_widths_cm.iter().map(|half_cm| shift_cm - half_cm);
    let upper = half_widths_cm.iter().map(|half_cm| shift_cm + half_cm);
    lower.chain(upper).collect()
}

fn leaf_shaped() -> Sample {
    plan(
        (201, "Privet", "LEAVES"),
        field("Anterior").with_leaves(rowan_leaves(), lens(6.0, 0.0)),
        (254.6, 2.0),
        "leaf-shaped.dcm",
        "leaves shape the field",
    )
}

fn segments() -> Sample {
    let mut beam = field("Anterior").with_leaves(rowan_leaves(), lens(6.0, 0.0));
    beam.beam_type = "DYNAMIC".to_owned();
    beam.control_points.truncate(1);
    // Each segment: move without dose, then dose.
    for (number, (start, end)) in [(0.0, 0.5), (0.5, 0.8), (0.8, 1.0)].into_iter().enumerate() {
        if number > 0 {
            let mut moved = PointSpec::at_weight(start);
            let shift_cm = if number == 1 { 1.5 } else { -1.5 };
            moved.positions_cm = vec![("MLCX".to_owned(), lens(4.0, shift_cm))];
            beam.control_points.push(moved);
        }
        beam.control_points.push(PointSpec::at_weight(end));
    }
    plan(
        (202, "Redwood", "SEGMENTS"),
        beam,
        (281.3, 2.0),
        "segments.dcm",
        "step and shoot, three segments",
    )
}

fn arc() -> Sample {
    let mut beam = field("Arc")
        .with_leaves(rowan_leaves(), lens(5.0, 0.0))
        .with_gantry(200.0)
        .with_arc(520.0, "CW", 9);
    for (index, point) in beam.control_points.iter_mut().enumerate().skip(1) {
        let shift_cm = if index % 2 == 0 { 0.5 } else { -0.5 };
        point.positions_cm = vec![("MLCX".to_owned(), lens(5.0, shift_cm))];
        point.gantry_deg = point
            .gantry_deg
            .map(|angle_deg| angle_deg.rem_euclid(360.0));
    }
    plan(
        (203, "Sorb", "ARC"),
        beam,
        (402.8, 2.0),
        "arc.dcm",
        "an arc with moving leaves",
    )
}

fn wedge() -> Sample {
    plan(
        (204, "Sumac", "WEDGE"),
        field("Left").with_gantry(90.0).with_wedge(WedgeSpec {
            number: 1,
            kind: "STANDARD".to_owned(),
            id: "W30".to_owned(),
            angle_deg: 30,
            factor: None,
            orientation_deg: 270.0,
            source_to_tray_cm: Some(58.0),
        }),
        (301.7, 1.5),
        "wedge.dcm",
        "a 30 degree wedge in the beam",
    )
}

fn block() -> Sample {
    plan(
        (205, "Walnut", "BLOCK"),
        field("Anterior").with_block(BlockSpec {
            number: 1,
            name: "Corner".to_owned(),
            kind: "SHIELDING".to_owned(),
            divergent: true,
            tray_id: Some("TRAY-1".to_owned()),
            material: "LEAD_ALLOY".to_owned(),
            thickness_cm: Some(7.5),
            transmission: Some(0.04),
            source_to_tray_cm: Some(65.0),
            outline_cm: vec![[3.0, 7.0], [7.0, 3.0], [7.0, 7.0]],
        }),
        (248.2, 2.0),
        "block.dcm",
        "a block cuts off a corner",
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
