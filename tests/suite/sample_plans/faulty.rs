//! Plans with one fault each, planted after the doses were fixed.

use counterfoil::audit::Verdict;

use super::course::{Course, PointStated, beam, beside_isocentre};
use super::sample::Sample;
use crate::builder::{BeamSpec, DepthSpec, PlanSpec, PointSpec};

/// A verdict and the checks that must speak.
type Caught = (Verdict, &'static [&'static str]);

const fn beyond(checks: &'static [&'static str]) -> Caught {
    (Verdict::BeyondAction, checks)
}

const fn not_verifiable(checks: &'static [&'static str]) -> Caught {
    (Verdict::NotVerifiable, checks)
}

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    let mut samples = deviating();
    samples.extend(wrong_depth());
    samples.extend(unreadable());
    samples.extend(misplaced());
    samples.extend(inconsistent());
    samples
}

fn field(number: i32, name: &str, gantry_deg: f64, ssd_cm: f64) -> BeamSpec {
    beam(number, name, "ROWAN-1", 6.0)
        .with_field(12.0, 15.0)
        .with_gantry(gantry_deg)
        .with_ssd(ssd_cm)
}

/// Two opposed 6 MV fields, 20 times 2 Gy.
fn opposed(serial: u16, family: &str, label: &str) -> Course {
    Course::new(serial, family, label, "Opposed fields")
        .fractions(20)
        .treat(field(1, "Anterior", 0.0, 90.6), 1.1, 0.5)
        .treat(field(2, "Posterior", 180.0, 88.9), 0.9, -0.4)
}

fn first_point(plan: &mut PlanSpec) -> &mut PointSpec {
    &mut plan.beams[0].control_points[0]
}

fn deviating() -> Vec<Sample> {
    vec![
        opposed(101, "Alder", "SSD").faulty(
            "wrong-ssd.dcm",
            "SSD of beam 1 is 95.6 cm instead of 90.6 cm",
            beyond(&[]),
            |plan| first_point(plan).ssd_cm = Some(95.6),
        ),
        Course::new(102, "Aspen", "ENERGY", "Opposed fields, 18 MV")
            .fractions(20)
            .treat(field(1, "Anterior", 0.0, 90.6).with_energy(18.0), 1.1, 0.5)
            .treat(
                field(2, "Posterior", 180.0, 88.9).with_energy(18.0),
                0.9,
                -0.4,
            )
            .faulty(
                "wrong-energy.dcm",
                "MU and doses are those of 18 MV, the plan says 6 MV",
                beyond(&[]),
                |plan| {
                    for beam in &mut plan.beams {
                        beam.control_points[0].energy = Some(6.0);
                    }
                },
            ),
        opposed(103, "Birch", "TYPO").faulty(
            "mu-typo.dcm",
            "two digits of beam 2's MU are transposed",
            beyond(&[]),
            |plan| {
                let meterset_mu = &mut plan.groups[0].beams[1].meterset_mu;
                *meterset_mu = meterset_mu.map(transposed);
            },
        ),
        opposed(104, "Box", "SPLIT").faulty(
            "dose-split-evenly.dcm",
            "both beam doses are half the prescription instead of what each beam adds",
            beyond(&["equal-beam-doses"]),
            |plan| {
                for reference in &mut plan.groups[0].beams {
                    reference.dose_gy = Some(1.0);
                }
            },
        ),
    ]
}

/// The same number with the two digits before its point exchanged.
pub(super) fn transposed(meterset_mu: f64) -> f64 {
    let mut digits: Vec<char> = format!("{meterset_mu:.1}").chars().collect();
    let units = digits.len() - 3;
    assert_ne!(digits[units - 1], digits[units], "it must be seen");
    digits.swap(units - 1, units);
    let text: String = digits.into_iter().collect();
    text.parse().expect("a number")
}

fn wrong_depth() -> Vec<Sample> {
    let depth = |depth_cm| {
        Some(DepthSpec {
            depth_cm: Some(depth_cm),
            ..DepthSpec::default()
        })
    };
    vec![
        opposed(105, "Cherry", "DEPTH")
            .map(|plan| {
                plan.groups[0].beams[0].depths = depth(9.4);
                plan.groups[0].beams[1].depths = depth(11.1);
            })
            .faulty(
                "wrong-depth.dcm",
                "Beam Dose Point Depth of beam 1 is 12.4 cm instead of 9.4 cm; SSD and a flat surface say 9.4 cm",
                beyond(&["depth-bases-disagree"]),
                |plan| plan.groups[0].beams[0].depths = depth(12.4),
            ),
    ]
}

fn unreadable() -> Vec<Sample> {
    vec![
        opposed(106, "Chestnut", "NOMU").faulty(
            "missing-meterset.dcm",
            "beam 2 has no Beam Meterset",
            not_verifiable(&["meterset-missing"]),
            |plan| plan.groups[0].beams[1].meterset_mu = None,
        ),
        opposed(107, "Elm", "TWICE").faulty(
            "repeated-beam-number.dcm",
            "a third beam has number 1 too",
            not_verifiable(&["repeated-number"]),
            |plan| *plan = plan.clone().with_repeated_beam_number(),
        ),
        opposed(108, "Fig", "WEIGHTS").faulty(
            "falling-weights.dcm",
            "the cumulative meterset weights of beam 1 are 0, 0.7, 0.3, 1",
            not_verifiable(&["meterset-weights"]),
            |plan| {
                let first = plan.beams[0].control_points[0].clone();
                let others = [0.7, 0.3, 1.0].map(PointSpec::at_weight);
                plan.beams[0].control_points = [first].into_iter().chain(others).collect();
            },
        ),
        opposed(109, "Hawthorn", "CGY").faulty(
            "dose-in-cgy.dcm",
            "the dose of beam 1 is written in cGy",
            not_verifiable(&["value-out-of-range"]),
            |plan| {
                let dose_gy = &mut plan.groups[0].beams[0].dose_gy;
                *dose_gy = dose_gy.map(|dose_gy| (dose_gy * 1e4).round() / 1e2);
            },
        ),
    ]
}

fn misplaced() -> Vec<Sample> {
    vec![
        // One field: from the other side the same point would be deep and merely wrong.
        Course::new(110, "Hickory", "SHALLOW", "One field")
            .fractions(20)
            .treat(field(1, "Anterior", 0.0, 90.6), 2.0, 0.5)
            .faulty(
                "point-in-build-up.dcm",
                "the dose point is 0.6 cm below the skin",
                not_verifiable(&["point-in-build-up"]),
                // 8.8 cm towards the front from the isocentre, which is 9.4 cm deep.
                |plan| put_point(plan, beside_isocentre([0.0, -8.8, 0.0])),
            ),
        opposed(111, "Hornbeam", "JAW").faulty(
            "point-under-jaw.dcm",
            "the X jaws of beam 1 stand at +1 and +7 cm, the point is on the axis",
            not_verifiable(&["point-under-device"]),
            |plan| {
                let positions = &mut first_point(plan).positions_cm;
                positions[0].1 = vec![1.0, 7.0];
            },
        ),
        opposed(112, "Laurel", "EDGE").faulty(
            "point-near-edge.dcm",
            "the dose point is 0.4 cm from the edge of both fields",
            not_verifiable(&["point-near-edge"]),
            |plan| put_point(plan, beside_isocentre([5.6, 0.0, 0.0])),
        ),
    ]
}

fn put_point(plan: &mut PlanSpec, point_cm: [f64; 3]) {
    plan.dose_references[0].point_cm = Some(point_cm);
    for reference in &mut plan.groups[0].beams {
        reference.point_cm = Some(point_cm);
    }
}

fn inconsistent() -> Vec<Sample> {
    vec![
        opposed(113, "Lime", "DANGLING").faulty(
            "dangling-reference.dcm",
            "the fraction group references a beam 7 that is not in the plan",
            not_verifiable(&["dangling-reference"]),
            |plan| *plan = plan.clone().with_dangling_reference(7),
        ),
        opposed(114, "Myrtle", "LEFTOUT").faulty(
            "beam-not-referenced.dcm",
            "no fraction group references beam 2",
            not_verifiable(&["beam-not-referenced"]),
            |plan| plan.groups[0].beams.truncate(1),
        ),
        Course::new(115, "Olive", "FFSHFS", "Opposed fields, point off axis")
            .position("FFS")
            .point(beside_isocentre([3.0, 0.0, 2.0]), PointStated::AtBeam)
            .fractions(20)
            .treat(
                field(1, "Anterior", 0.0, 90.6).with_jaws([-8.0, 1.0], [-8.0, 1.0]),
                1.1,
                0.5,
            )
            .faulty(
                "wrong-position.dcm",
                "calculated feet first, the plan says head first",
                not_verifiable(&["point-under-device"]),
                |plan| *plan = plan.clone().with_patient_position("HFS"),
            ),
    ]
}
