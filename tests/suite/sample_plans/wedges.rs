//! Wedged fields: a pair of fixed wedges, a motorised and a dynamic one, and each with one
//! fault, planted after the doses were fixed.

use counterfoil::audit::Verdict;

use super::course::{Course, PointStated, beam, beside_isocentre};
use super::sample::Sample;
use crate::builder::{BeamSpec, PlanSpec, PointSpec, WedgeSpec};

/// The plans that are in order.
pub(super) fn samples() -> Vec<Sample> {
    vec![
        wedged_pair(31, "Viburnum", "WEDGES").sound(
            "wedged-pair.dcm",
            "two fields at a right angle with 45 and 30 degree wedges, the point off both axes",
        ),
        motorised(32, "Willow", "MOTORISED").sound(
            "motorised-wedge.dcm",
            "a motorised 60 degree wedge, in for two fifths and for a quarter of the meterset",
        ),
        dynamic(33, "Sumac", "SWEEP").sound(
            "dynamic-wedge.dcm",
            "dynamic wedges of 30 and 60 degrees; how their jaw moves stands in the machine, not in the plan",
        ),
    ]
}

/// The same with one fault each.
pub(super) fn faulty_samples() -> Vec<Sample> {
    vec![
        wedged_pair(320, "Zelkova", "TURNED").faulty(
            "wedge-reversed.dcm",
            "the wedge of beam 1 is turned round: its orientation is 270 instead of 90 degrees",
            (Verdict::BeyondAction, &[]),
            |plan| first_wedge(plan).orientation_deg = 270.0,
        ),
        wedged_pair(321, "Yucca", "OTHER").faulty(
            "wedge-exchanged.dcm",
            "beam 1 has the 30 degree wedge instead of that of 45 degrees",
            (Verdict::BeyondAction, &[]),
            |plan| {
                first_wedge(plan).id = "W30".to_owned();
                first_wedge(plan).angle_deg = 30;
            },
        ),
        wedged_pair(322, "Wisteria", "UNKNOWN").faulty(
            "wedge-unknown.dcm",
            "the wedge of beam 1 has an ID that no table is for",
            (Verdict::NotVerifiable, &[]),
            |plan| first_wedge(plan).id = "W45L".to_owned(),
        ),
        wedged_pair(323, "Weigela", "LEFTOUT").faulty(
            "wedge-left-out.dcm",
            "beam 1 has no wedge",
            (Verdict::BeyondAction, &[]),
            |plan| {
                plan.beams[0].wedges.clear();
                plan.beams[0].control_points[0].wedges.clear();
            },
        ),
        motorised(324, "Walnut", "SHARE").faulty(
            "wedge-share.dcm",
            "the wedge of beam 1 is in for three fifths of the meterset instead of two",
            (Verdict::BeyondAction, &[]),
            |plan| {
                for point in &mut plan.beams[0].control_points[1..3] {
                    point.weight = Some(0.6);
                }
            },
        ),
        dynamic(325, "Sequoia", "SWEPTBACK").faulty(
            "dynamic-wedge-reversed.dcm",
            "the dynamic wedge of beam 1 is turned round: its orientation is 180 instead of 0 degrees",
            (Verdict::BeyondAction, &[]),
            |plan| first_wedge(plan).orientation_deg = 180.0,
        ),
        dynamic(326, "Sassafras", "STEEPER").faulty(
            "dynamic-wedge-angle.dcm",
            "the dynamic wedge of beam 1 is one of 45 degrees instead of 30",
            (Verdict::BeyondAction, &[]),
            |plan| {
                first_wedge(plan).id = "D45".to_owned();
                first_wedge(plan).angle_deg = 45;
            },
        ),
    ]
}

fn first_wedge(plan: &mut PlanSpec) -> &mut WedgeSpec {
    &mut plan.beams[0].wedges[0]
}

fn wedge(kind: &str, id: &str, angle_deg: i32, orientation_deg: f64) -> WedgeSpec {
    WedgeSpec {
        number: 1,
        kind: kind.to_owned(),
        id: id.to_owned(),
        angle_deg,
        factor: None,
        orientation_deg,
        source_to_tray_cm: Some(58.0),
    }
}

/// From in front and from the left; the thick ends lie towards each other, in front and to the left. The point is nearer to
/// the thick end of the first (2 cm to the left) and to the thin end of the second (1.5 cm to the back).
fn wedged_pair(serial: u16, family: &str, label: &str) -> Course {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-2", 6.0)
            .with_field(11.0, 12.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    // Gantry and collimator at 0: x points to the left. Gantry at 90: x points to the back.
    let anterior = field(1, "Anterior", 0.0, 91.5).with_wedge(wedge("STANDARD", "W45", 45, 90.0));
    let left = field(2, "Left", 90.0, 90.0).with_wedge(wedge("STANDARD", "W30", 30, 270.0));
    Course::new(serial, family, label, "Wedged pair")
        .point(beside_isocentre([2.0, 1.5, 0.5]), PointStated::AtBeam)
        .fractions(20)
        .treat(anterior, 1.0, 0.7)
        .treat(left, 1.0, -0.8)
}

/// A wedge that is in first, and goes out without dose.
fn in_for_share(mut field: BeamSpec, share: f64, orientation_deg: f64) -> BeamSpec {
    field = field.with_wedge(wedge("MOTORIZED", "M60", 60, orientation_deg));
    field.control_points.truncate(1);
    for (weight, is_in) in [(share, true), (share, false), (1.0, false)] {
        let mut point = PointSpec::at_weight(weight);
        point.wedges.push((1, is_in));
        field.control_points.push(point);
    }
    field
}

/// Opposed fields across the body, the thin ends towards the head; the point 2.5 cm that way.
fn motorised(serial: u16, family: &str, label: &str) -> Course {
    let field = |number, name, gantry_deg, ssd_cm, share| {
        let field = beam(number, name, "ROWAN-1", 6.0)
            .with_field(10.0, 12.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm);
        in_for_share(field, share, 0.0)
    };
    Course::new(serial, family, label, "Motorised wedges")
        .point(beside_isocentre([0.0, 0.0, 2.5]), PointStated::AtBeam)
        .fractions(30)
        .treat(field(1, "Left", 90.0, 93.0, 0.4), 1.0, -0.6)
        .treat(field(2, "Right", 270.0, 92.0, 0.25), 1.0, 0.9)
}

/// Opposed fields across the body, 30 degrees and 60, the second asymmetric along its wedge. The thin ends lie towards the head, and
/// the point 2 cm that way.
fn dynamic(serial: u16, family: &str, label: &str) -> Course {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-2", 6.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    let left = field(1, "Left", 90.0, 91.5)
        .with_field(12.0, 14.0)
        .with_wedge(wedge("DYNAMIC", "D30", 30, 0.0));
    let right = field(2, "Right", 270.0, 90.5)
        .with_jaws([-6.0, 6.0], [-8.0, 6.0])
        .with_wedge(wedge("DYNAMIC", "D60", 60, 0.0));
    Course::new(serial, family, label, "Dynamic wedges")
        .point(beside_isocentre([0.0, 0.0, 2.0]), PointStated::AtBeam)
        .fractions(25)
        .treat(left, 1.0, 0.8)
        .treat(right, 1.0, -0.5)
}
