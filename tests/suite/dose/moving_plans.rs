//! Segments, moving leaves and arcs: each is the mean over the meterset of
//! fields that stand still, and an arc is verified only where the depth is stated all along it.

use counterfoil::dose::{BeamCalculation, DepthBasis, Method, ObstacleKind, Technique};
use counterfoil::plan::{
    ControlPoint, DoseReference, Plan, PointDepth, PointDepthPlace, ReferencedDose,
};
use counterfoil::quantity::{Given, Patient, Point};

use super::shaped_model::{LEAF_END_CM, MLCX, move_leaves, put_leaves, shaped_machine, tips};
use super::{assert_close, calculate_with, kinds, plain_plan, plan_with, verified_cgy_per_mu};

fn shaped(plan: &Plan) -> BeamCalculation {
    calculate_with(plan, &shaped_machine())
}

/// Makes the plan's control points anew from its first one: by cumulative weight, each with a change.
fn put_points<T>(plan: &mut Plan, points: &[(f64, T)], change: impl Fn(&mut ControlPoint, &T)) {
    let first = plan.beams[0].control_points[0].clone();
    let numbered = points.iter().zip(0..);
    plan.beams[0].control_points = numbered
        .map(|((weight, what), index)| {
            let mut point = first.clone();
            point.index = Given::stated(index);
            point.cumulative_weight = Given::stated(*weight);
            change(&mut point, what);
            point
        })
        .collect();
}

/// A quarter of the meterset 10 x 10, the rest 6 x 10. TG-71's tables by hand: equivalent squares 10 and
/// 2 * 6 * 10 / 16 = 7.5; Sc(7.5) = 0.977 + 0.75 * 0.013 = 0.98675, Sp(7.5) = 0.944 + 0.75 * 0.030 = 0.9665, TPR(10) = 1:
/// 0.8 * (0.25 + 0.75 * 0.98675 * 0.9665) = 0.77222. The equivalent square of a rectangle is itself good to some 0.3 %.
#[test]
fn verify_two_jaw_openings_by_hand() {
    let plan = plan_with(|plan| {
        let (wide, narrow) = ([-5.0, 5.0], [-3.0, 3.0]);
        let points = [(0.0, wide), (0.25, wide), (0.25, narrow), (1.0, narrow)];
        put_points(plan, &points, |point, jaws_cm| {
            point.jaws_x_cm = Given::stated(*jaws_cm);
        });
    });
    let result = shaped(&plan);
    assert_eq!(result.technique, Technique::Segmented);
    assert_eq!(result.method, Some(Method::ScatterIntegration));
    assert_close(verified_cgy_per_mu(&result), 0.77222, 0.003 * 0.77222);
}

/// Openings that differ, none of them with the point near an edge.
fn openings() -> [Vec<f64>; 3] {
    [
        tips(|_| [-4.5, 4.5]),
        tips(|y_cm| [-3.0 + 0.1 * y_cm, 2.2]),
        tips(|y_cm| [-1.6, 3.0 + 0.2 * y_cm]),
    ]
}

fn with_opening(leaves_cm: &[f64]) -> Plan {
    plan_with(|plan| put_leaves(plan, MLCX, leaves_cm))
}

/// Half, three tenths and a fifth of the meterset: the sum of three plans of one opening each.
#[test]
fn verify_segments_sum_up() {
    let openings = openings();
    let shares = [0.5, 0.3, 0.2];
    let segmented = {
        let mut plan = with_opening(&openings[0]);
        let mut points = Vec::new();
        let mut weight = 0.0;
        for (opening, share) in openings.iter().zip(shares) {
            points.push((weight, opening));
            weight += share;
            points.push((weight, opening));
        }
        put_points(&mut plan, &points, |point, opening| {
            move_leaves(point, opening)
        });
        shaped(&plan)
    };
    assert_eq!(segmented.technique, Technique::Segmented);
    let singles = openings.iter().zip(shares).map(|(opening, share)| {
        let single = shaped(&with_opening(opening));
        assert_eq!(single.technique, Technique::Mlc);
        share * verified_cgy_per_mu(&single)
    });
    assert_close(
        verified_cgy_per_mu(&segmented) / singles.sum::<f64>(),
        1.0,
        1e-9,
    );
    // Moves without dose leave three intervals, and their doses add up to the whole.
    let dose = segmented.trace.as_ref().unwrap().dose_per_mu_cgy;
    let intervals = &segmented.shaped.as_ref().unwrap().intervals;
    assert_eq!(intervals.len(), 3);
    let added: f64 = intervals.iter().map(|part| part.dose_per_mu_cgy).sum();
    assert_close(added, dose, 1e-9);
}

/// A gap that slides by 2 cm is the mean of the gaps on its way: 200 plans that stand still, each at the
/// middle of its part.
#[test]
fn verify_a_sliding_gap_is_the_mean_of_its_places() {
    let at = |shift_cm: f64| tips(move |_| [-4.0 + shift_cm, 2.0 + shift_cm]);
    let mut plan = with_opening(&at(0.0));
    put_points(&mut plan, &[(0.0, 0.0), (1.0, 2.0)], |point, shift_cm| {
        move_leaves(point, &at(*shift_cm));
    });
    let moving = shaped(&plan);
    assert_eq!(moving.technique, Technique::Dynamic);
    let places = (0..200).map(|part| 2.0 * (f64::from(part) + 0.5) / 200.0);
    let mean = places
        .map(|shift_cm| verified_cgy_per_mu(&shaped(&with_opening(&at(shift_cm)))))
        .sum::<f64>()
        / 200.0;
    assert_close(verified_cgy_per_mu(&moving) / mean, 1.0, 5e-4);
}

/// Two openings with 0.3 of the meterset each leave a strip from 0.3 to 0.8 cm beside the point to the third, with 0.4.
/// Blurred with 0.18 cm (F the normal distribution): at the point 0.4 + 0.3 F(0.3/0.18) = 0.686; 0.53 cm beside it
/// 0.4 + 0.3 F(-0.23/0.18) + 0.3 F(-0.27/0.18) = 0.450, 34.4 % less; 1 cm beside it 0.4 + 0.3 F(0.2/0.18) = 0.66 again.
/// With the strip only where y is above 0 and the point 0.25 cm below: F(0.25/0.18) = 0.918 of 1 and the rest of 0.686, so
/// 0.974; 0.53 cm to the side and 0.28 cm above the edge F(0.28/0.18) = 0.940 of 0.450 and the rest of 1: 0.483, 50.4 % less.
#[test]
fn verify_a_dip_of_the_fluence_beside_the_point() {
    let strip = |wanted: fn(f64) -> bool, z_cm: f64| {
        let beside =
            |side: [f64; 2]| move |y_cm: f64| if wanted(y_cm) { side } else { [-4.0, 4.0] };
        let openings = [
            tips(beside([-4.0, 0.3 - LEAF_END_CM])),
            tips(beside([0.8 + LEAF_END_CM, 4.0])),
            tips(|_| [-4.0, 4.0]),
        ];
        let [one, two, three] = &openings;
        let mut plan = with_opening(one);
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(1.0, -2.0, z_cm));
        let points = [
            (0.0, one),
            (0.3, one),
            (0.3, two),
            (0.6, two),
            (0.6, three),
            (1.0, three),
        ];
        put_points(&mut plan, &points, |point, opening| {
            move_leaves(point, opening)
        });
        shaped(&plan)
    };
    for (result, wanted_percent) in [
        (strip(|_| true, 30.0), 34.4),
        (strip(|y_cm| y_cm > 0.0, 29.75), 50.4),
    ] {
        assert_eq!(kinds(&result), [ObstacleKind::FieldEdge]);
        let change_percent = result.shaped.unwrap().fluence_change_percent;
        assert_close(change_percent, wanted_percent, 0.5);
    }
}

/// Control points of an arc: weight, gantry angle, SSD.
fn arc(direction: &str, points: &[(f64, (f64, f64))]) -> Plan {
    plan_with(|plan| {
        put_points(plan, points, |point, &(gantry_deg, ssd_cm)| {
            point.gantry_deg = Given::stated(gantry_deg.rem_euclid(360.0));
            point.gantry_direction = Given::stated(direction.to_owned());
            point.ssd_cm = Given::stated(ssd_cm);
        });
        if let Some(last) = plan.beams[0].control_points.last_mut() {
            last.gantry_direction = Given::stated("NONE".to_owned());
        }
    })
}

/// An SSD at three of four control points: not verified, and both counts are told.
#[test]
fn verify_an_arc_without_one_depth() {
    let points: Vec<(f64, (f64, f64))> = [0.0, 1.0 / 3.0, 2.0 / 3.0, 1.0]
        .into_iter()
        .map(|weight| (weight, (30.0 * weight, 90.0)))
        .collect();
    let mut plan = arc("CW", &points);
    let whole = shaped(&plan);
    assert_eq!(whole.technique, Technique::Arc);
    assert_eq!(whole.depths[0].basis, DepthBasis::Ssd);
    // 10 x 10, 10 cm deep all the way.
    assert_close(verified_cgy_per_mu(&whole), 0.8, 0.002 * 0.8);
    for missing in 0..4 {
        let kept = plan.clone();
        plan.beams[0].control_points[missing].ssd_cm = match missing {
            0 => Given::Absent,
            _ => Given::Inherited {
                value: 90.0,
                from_control_point: missing - 1,
            },
        };
        let result = shaped(&plan);
        assert_eq!(kinds(&result), [ObstacleKind::Depth]);
        assert_eq!((result.trace, result.depths.len()), (None, 0));
        let message = &result.obstacles[0].message;
        assert!(
            message.contains("point depths at 0 of 4") && message.contains("(300A,0130) at 3 of 4"),
            "{message}"
        );
        plan = kept;
    }
}

/// A control point's word on the depth of dose reference 1.
fn at_reference(depth_cm: f64) -> Vec<ReferencedDose> {
    vec![ReferencedDose {
        number: Given::stated(1),
        cumulative_coefficient: Given::Absent,
        point_depth: Some(PointDepth {
            place: PointDepthPlace::ControlPoint,
            cumulative_weight: Given::Absent,
            depth_cm: Given::stated(depth_cm),
            equivalent_depth_cm: Given::Absent,
            ssd_cm: Given::Absent,
            source_to_external_contour_cm: Given::Absent,
            averaged: Given::Absent,
        }),
    }]
}

/// Depths of 8, 10 and 12 cm at three control points (300C,0050 -> 300A,0088), half the meterset between each. TPR(10 x 10)
/// is 1.074, 1, 0.927 there and straight between: mean (1.074 + 2 * 1 + 0.927) / 4 = 1.00025, times 0.8 cGy/MU.
#[test]
fn verify_an_arc_with_point_depths() {
    let mut plan = arc(
        "CC",
        &[(0.0, (28.0, 80.0)), (0.5, (14.0, 80.0)), (1.0, (0.0, 80.0))],
    );
    plan.dose_references = vec![DoseReference {
        number: Given::stated(1),
        uid: Given::stated("2.25.1".to_owned()),
        reference_type: Given::stated("TARGET".to_owned()),
        point: Given::stated(Point::new(1.0, -2.0, 30.0)),
        ..DoseReference::default()
    }];
    for (point, depth_cm) in plan.beams[0]
        .control_points
        .iter_mut()
        .zip([8.0, 10.0, 12.0])
    {
        point.ssd_cm = Given::Absent;
        point.referenced_doses = at_reference(depth_cm);
    }
    let result = shaped(&plan);
    assert_eq!(result.technique, Technique::Arc);
    let bases: Vec<DepthBasis> = result.depths.iter().map(|depth| depth.basis).collect();
    assert_eq!(bases, [DepthBasis::Plan]);
    assert_close(result.depths[0].effective_cm, 10.0, 1e-9);
    assert_close(verified_cgy_per_mu(&result), 0.8 * 1.000_25, 0.002 * 0.8);
    // Missing at one of them: not verified.
    plan.beams[0].control_points[1].referenced_doses.clear();
    let result = shaped(&plan);
    assert_eq!(kinds(&result), [ObstacleKind::Depth]);
    let message = &result.obstacles[0].message;
    assert!(message.contains("point depths at 2 of 3"), "{message}");
}

/// One beam at rest at a gantry angle, with this SSD.
fn standing(gantry_deg: f64, ssd_cm: f64, leaves_cm: &[f64], point: Point<Patient>) -> Plan {
    let mut plan = plain_plan();
    put_leaves(&mut plan, MLCX, leaves_cm);
    plan.fraction_groups[0].beams[0].specification_point = Given::stated(point);
    for at in &mut plan.beams[0].control_points {
        at.gantry_deg = Given::stated(gantry_deg.rem_euclid(360.0));
        at.ssd_cm = Given::stated(ssd_cm);
    }
    plan
}

/// SSD of a water cylinder of 9 cm radius along the patient; the isocentre lies 3 cm to the patient's left of its
/// axis and 1.5 cm to the front. From the isocentre towards the source u = (sin g, cos g) the skin is at
/// t = -p.u + sqrt((p.u)^2 + R^2 - p.p).
fn cylinder_ssd_cm(gantry_deg: f64) -> f64 {
    let (sine, cosine) = gantry_deg.to_radians().sin_cos();
    let (left_cm, front_cm, radius_cm) = (3.0, 1.5, 9.0);
    let along = left_cm * sine + front_cm * cosine;
    let depth_cm = -along
        + (along * along + radius_cm * radius_cm - left_cm * left_cm - front_cm * front_cm).sqrt();
    100.0 - depth_cm
}

/// The mean of beams at rest at the angles of an arc, each weighted with half the meterset of both its neighbours.
fn mean_at_rest(angles_deg: &[f64], leaves_cm: &[f64], point: Point<Patient>) -> f64 {
    let last = angles_deg.len() - 1;
    let mut sum = 0.0;
    for (index, &gantry_deg) in angles_deg.iter().enumerate() {
        let weight = if index == 0 || index == last {
            0.5
        } else {
            1.0
        };
        let plan = standing(gantry_deg, cylinder_ssd_cm(gantry_deg), leaves_cm, point);
        sum += weight * verified_cgy_per_mu(&shaped(&plan));
    }
    sum / last as f64
}

fn round_the_cylinder(
    direction: &str,
    angles_deg: &[f64],
    leaves_cm: &[f64],
    point: Point<Patient>,
) -> BeamCalculation {
    let last = (angles_deg.len() - 1) as f64;
    let points: Vec<(f64, (f64, f64))> = angles_deg
        .iter()
        .enumerate()
        .map(|(index, &angle_deg)| (index as f64 / last, (angle_deg, cylinder_ssd_cm(angle_deg))))
        .collect();
    let mut plan = arc(direction, &points);
    put_leaves(&mut plan, MLCX, leaves_cm);
    plan.fraction_groups[0].beams[0].specification_point = Given::stated(point);
    shaped(&plan)
}

/// A whole turn in steps of 4 degrees around an eccentric cylinder, point on the axis and off it: the mean of 91 beams at rest.
#[test]
fn verify_a_whole_turn_is_the_mean_of_beams_at_rest() {
    let leaves_cm = tips(|y_cm| [-3.4 + 0.1 * y_cm, 3.8]);
    let angles_deg: Vec<f64> = (0..=90)
        .map(|step| -179.0 + 358.0 / 90.0 * f64::from(step))
        .collect();
    for point in [Point::new(1.0, -2.0, 30.0), Point::new(1.8, -3.1, 30.7)] {
        let moving = round_the_cylinder("CW", &angles_deg, &leaves_cm, point);
        assert_eq!(moving.technique, Technique::Arc);
        let mean = mean_at_rest(&angles_deg, &leaves_cm, point);
        let ratio = verified_cgy_per_mu(&moving) / mean;
        println!("whole turn over the mean of 91 beams at rest: {ratio:.6}");
        assert_close(ratio, 1.0, 1e-3);
    }
}

/// 350 to 10 degrees clockwise is 20 degrees through 0; 10 to 350 counter-clockwise the same way back; 10 to 350
/// clockwise is the other 340. The point lies 3 cm in front of the isocentre, so that the ways differ.
#[test]
fn verify_the_way_through_zero_and_the_way_round() {
    let leaves_cm = tips(|_| [-4.0, 4.0]);
    let point = Point::new(1.0, -5.0, 30.0);
    let angles = |from_deg: f64, to_deg: f64, steps: u32| -> Vec<f64> {
        (0..=steps)
            .map(|step| from_deg + (to_deg - from_deg) * f64::from(step) / f64::from(steps))
            .collect()
    };
    let through_zero = mean_at_rest(&angles(-10.0, 10.0, 20), &leaves_cm, point);
    let way_round = mean_at_rest(&angles(10.0, 350.0, 340), &leaves_cm, point);
    assert!((way_round / through_zero - 1.0).abs() > 0.05);
    for (direction, way_deg, mean) in [
        ("CW", angles(350.0, 370.0, 5), through_zero),
        ("CC", angles(10.0, -10.0, 5), through_zero),
        ("CW", angles(10.0, 350.0, 85), way_round),
        ("CC", angles(350.0, 10.0, 85), way_round),
    ] {
        let moving = round_the_cylinder(direction, &way_deg, &leaves_cm, point);
        assert_close(verified_cgy_per_mu(&moving) / mean, 1.0, 1e-3);
    }
}
