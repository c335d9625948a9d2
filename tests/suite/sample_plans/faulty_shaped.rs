//! Plans of shaped and moving fields with one fault each, planted after the
//! doses were fixed. One fault cannot be seen from the dose at the point, and says so.

use counterfoil::audit::Verdict;

use super::arcs::{modulated_arc, short_arc};
use super::course::{Course, PointStated, beam, beside_isocentre};
use super::faulty::transposed;
use super::sample::Sample;
use super::shaped::{corner_blocks, leaf_shaped, sliding_window, step_and_shoot};
use super::shapes::{Segment, in_segments, leaves, rowan_leaves};
use crate::builder::PlanSpec;

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    let mut samples = misplaced_leaves();
    samples.extend(misplaced_parts());
    samples.extend(misplaced_meterset());
    samples.extend(misplaced_gantry());
    samples
}

/// The same course as another patient's.
fn of(mut course: Course, serial: u16, family: &str, label: &str) -> Course {
    course = course.map(|plan| {
        plan.uid_root = format!("2.25.202611091{serial:04}");
        plan.patient_name = format!("Sample^{family}");
        plan.patient_id = format!("DEMO-{serial:04}");
        plan.label = label.to_owned();
    });
    course
}

/// Every leaf position of a beam, bank at negative x first.
fn each_leaf(plan: &mut PlanSpec, beam_index: usize, change: impl Fn(usize, &mut f64)) {
    for point in &mut plan.beams[beam_index].control_points {
        for (kind, positions_cm) in &mut point.positions_cm {
            if kind == "MLCX" {
                for (leaf, position_cm) in positions_cm.iter_mut().enumerate() {
                    change(leaf, position_cm);
                }
            }
        }
    }
}

/// 5 mm towards -x, to the hundredth of a millimetre.
fn shift(position_cm: &mut f64) {
    *position_cm = format!("{:.3}", *position_cm - 0.5)
        .parse()
        .expect("a number");
}

fn misplaced_leaves() -> Vec<Sample> {
    let bank_out = |leaf: usize, position_cm: &mut f64| {
        if leaf < 60 {
            shift(position_cm);
        }
    };
    vec![
        of(sliding_window(), 301, "Mulberry", "BANKOUT").faulty(
            "bank-shifted.dcm",
            "one leaf bank of beam 1 stands 5 mm too far out, over which the gap slides",
            (Verdict::BeyondAction, &[]),
            |plan| each_leaf(plan, 0, bank_out),
        ),
        of(leaf_shaped(), 302, "Palm", "UNSEEN").faulty(
            "bank-shifted-unseen.dcm",
            "the same at a field that stands still: **cannot be seen from the dose at this point**, 4 cm from the leaves",
            (Verdict::Within, &[]),
            |plan| each_leaf(plan, 0, bank_out),
        ),
        of(leaf_shaped(), 303, "Pear", "STUCK").faulty(
            "leaf-pair-closed.dcm",
            "the leaf pair of beam 2 that passes over the point is closed",
            (Verdict::NotVerifiable, &["point-under-device"]),
            |plan| {
                each_leaf(plan, 1, |leaf, position_cm| {
                    if leaf % 60 == 32 {
                        *position_cm = 0.0;
                    }
                });
            },
        ),
    ]
}

fn misplaced_parts() -> Vec<Sample> {
    vec![
        of(corner_blocks(), 304, "Plane", "NOBLOCK").faulty(
            "block-missing.dcm",
            "beam 1 has neither its blocks nor their tray",
            (Verdict::BeyondAction, &[]),
            |plan| plan.beams[0].blocks.clear(),
        ),
        elongated().faulty(
            "collimator-quarter-turn.dcm",
            "the collimator of an elongated field stands at 90 degrees instead of 0",
            (Verdict::NotVerifiable, &["point-under-device"]),
            |plan| plan.beams[0].control_points[0].collimator_deg = Some(90.0),
        ),
    ]
}

/// One field of about 5 cm by 18 cm, the point 5 cm from its middle along it.
fn elongated() -> Course {
    let sides = leaves(|y_cm| (y_cm.abs() < 9.0).then(|| [-2.4 - 0.02 * y_cm, 2.5]));
    let field = beam(1, "Spine", "ROWAN-1", 6.0)
        .with_field(6.0, 18.0)
        .with_gantry(180.0)
        .with_ssd(93.6)
        .with_leaves(rowan_leaves(), sides);
    Course::new(305, "Poplar", "SPINE", "One long field")
        .point(beside_isocentre([0.0, 0.0, 5.0]), PointStated::AtBeam)
        .fractions(5)
        .treat(field, 4.0, -0.4)
}

fn misplaced_meterset() -> Vec<Sample> {
    vec![
        of(step_and_shoot(), 306, "Sallow", "STEPTYPO").faulty(
            "segments-mu-typo.dcm",
            "two digits of beam 3's MU are transposed",
            (Verdict::BeyondAction, &[]),
            |plan| {
                let meterset_mu = &mut plan.groups[0].beams[2].meterset_mu;
                *meterset_mu = meterset_mu.map(transposed);
            },
        ),
        spared().faulty(
            "segment-weights-swapped.dcm",
            "the meterset weights of beam 1's two openings are exchanged",
            (Verdict::BeyondAction, &[]),
            |plan| {
                for point in &mut plan.beams[0].control_points {
                    if point.weight == Some(0.75) {
                        point.weight = Some(0.25);
                    }
                }
            },
        ),
    ]
}

/// An open field, and a quarter of the meterset beside the point.
fn spared() -> Course {
    let shaped = |number, name, gantry_deg, ssd_cm| {
        let segment = |share, right_cm| Segment {
            share,
            leaves_cm: leaves(|y_cm| (y_cm.abs() < 7.0).then_some([-6.0, right_cm])),
        };
        in_segments(
            beam(number, name, "ROWAN-1", 18.0)
                .with_field(12.0, 14.0)
                .with_gantry(gantry_deg)
                .with_ssd(ssd_cm),
            vec![segment(0.75, 6.0), segment(0.25, -2.0)],
        )
    };
    Course::new(307, "Service", "WEIGHTS2", "Two openings a field")
        .fractions(20)
        .treat(shaped(1, "Anterior", 0.0, 89.4), 1.05, 0.3)
        .treat(shaped(2, "Posterior", 180.0, 88.2), 0.95, -0.9)
}

fn misplaced_gantry() -> Vec<Sample> {
    vec![
        of(modulated_arc(), 308, "Sycamore", "FIRSTSSD").faulty(
            "arc-first-ssd-only.dcm",
            "the SSD stands at the first of 178 control points only",
            (Verdict::NotVerifiable, &[]),
            |plan| {
                for point in plan.beams[0].control_points.iter_mut().skip(1) {
                    point.ssd_cm = None;
                }
            },
        ),
        of(modulated_arc(), 309, "Thorn", "SLIPPED").faulty(
            "arc-bank-out.dcm",
            "one leaf bank of the arc stands 5 mm too far out",
            (Verdict::BeyondAction, &[]),
            |plan| each_leaf(plan, 0, |leaf, position_cm| {
                if leaf < 60 {
                    shift(position_cm);
                }
            }),
        ),
        short_arc().faulty(
            "arc-direction-reversed.dcm",
            "Gantry Rotation Direction is CC instead of CW: the gantry would go round the back between any two control points",
            (Verdict::NotVerifiable, &[]),
            |plan| {
                for point in &mut plan.beams[0].control_points {
                    if point.gantry_direction.as_deref() == Some("CW") {
                        point.gantry_direction = Some("CC".to_owned());
                    }
                }
            },
        ),
    ]
}
