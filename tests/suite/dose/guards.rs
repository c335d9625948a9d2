//! The edges of the method: shown as outside it, with a number where one can be multiplied out.

use counterfoil::dose::{BeamCalculation, FactorName, ObstacleKind};
use counterfoil::plan::{PointDepth, PointDepthPlace};
use counterfoil::quantity::{Given, Point};

use super::{assert_close, calculate, kinds, plan_with_points, tg71};

/// The point at the isocentre, this deep by the SSD.
fn at_depth(depth_cm: f64) -> BeamCalculation {
    calculate(&plan_with_points(|point| {
        point.ssd_cm = Given::stated(100.0 - depth_cm);
    }))
}

/// The point this far to the right of an observer who faces the gantry, in the isocentre plane, 20 x 10 field.
fn at_x(x_cm: f64) -> BeamCalculation {
    let mut plan = plan_with_points(|point| point.jaws_x_cm = Given::stated([-10.0, 10.0]));
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0 + x_cm, -2.0, 30.0));
    calculate(&plan)
}

/// The data set's d_max is 1.5 cm, where its table starts.
#[test]
fn verify_build_up() {
    assert_eq!(kinds(&at_depth(1.5)), []);
    let shallow = at_depth(1.4);
    // Below the table too, so no number.
    assert_eq!(
        kinds(&shallow),
        [ObstacleKind::BuildUp, ObstacleKind::TableRange]
    );
    assert_eq!(shallow.trace, None);
    // A deeper dose maximum: the number is there, and no verification.
    let mut machine = tg71("tg71-tpr");
    machine.beams[0].d_max_cm = 3.0;
    let plan = plan_with_points(|point| point.ssd_cm = Given::stated(98.0));
    let result = super::calculate_with(&plan, &machine);
    assert_eq!(kinds(&result), [ObstacleKind::BuildUp]);
    // TPR(2, 10 x 10) 1.286.
    assert_close(result.trace.unwrap().dose_per_mu_cgy, 0.8 * 1.286, 1e-12);
}

/// A radiological depth in the build-up is one, however deep the point lies: 10 cm of which 2 cm count.
#[test]
fn verify_build_up_by_the_effective_depth() {
    let mut machine = tg71("tg71-tpr");
    machine.beams[0].d_max_cm = 3.0;
    let mut plan = plan_with_points(|_| {});
    plan.fraction_groups[0].beams[0].point_depths = vec![PointDepth {
        place: PointDepthPlace::ReferencedBeam,
        cumulative_weight: Given::Absent,
        depth_cm: Given::stated(10.0),
        equivalent_depth_cm: Given::stated(2.0),
        ssd_cm: Given::Absent,
        source_to_external_contour_cm: Given::Absent,
        averaged: Given::Absent,
    }];
    let result = super::calculate_with(&plan, &machine);
    assert_eq!(kinds(&result), [ObstacleKind::BuildUp]);
}

/// In-air ratios: the depth is along the ray. 10 cm off axis at the isocentre's distance, 10 cm perpendicular:
/// 10 * sqrt(1 + 0.1^2) = 10.049876 along the ray; ratio 1.031 - 0.005 * 0.049876/2 = 1.030875;
/// TPR 1 - 0.049876/2 * (1 - 0.941), 0.941 being the table's value at 12 cm for a side of 24 cm.
#[test]
fn verify_in_air_depth_is_along_the_ray() {
    let mut plan = plan_with_points(|point| {
        point.jaws_x_cm = Given::stated([-12.0, 12.0]);
        point.jaws_y_cm = Given::stated([-12.0, 12.0]);
    });
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(11.0, -2.0, 30.0));
    let result = calculate(&plan);
    assert_eq!(kinds(&result), []);
    let trace = result.trace.unwrap();
    let factor = |name| trace.factor(name).unwrap().value;
    assert_close(factor(FactorName::OffAxisRatio), 1.030_875, 5e-7);
    let tpr = 1.0 - 0.049_876 / 2.0 * (1.0 - 0.941);
    assert_close(factor(FactorName::TissuePhantomRatio), tpr, 5e-7);
}

/// The last line of a table is inside, beyond it is not: TPR(25, 10 x 10) 0.547.
#[test]
fn verify_table_edge() {
    let last = at_depth(25.0);
    assert_eq!(kinds(&last), []);
    assert_close(last.trace.unwrap().dose_per_mu_cgy, 0.8 * 0.547, 1e-12);
    let beyond = at_depth(25.001);
    assert_eq!(kinds(&beyond), [ObstacleKind::TableRange]);
    assert_eq!(beyond.trace, None);
    let message = &beyond.obstacles[0].message;
    assert!(message.contains("1.5 to 25"), "{message}");
    // Sides: 40 is the last column, 40.01 beyond.
    let of_side = |side_cm: f64| {
        calculate(&plan_with_points(|point| {
            point.jaws_x_cm = Given::stated([-0.5 * side_cm, 0.5 * side_cm]);
            point.jaws_y_cm = Given::stated([-0.5 * side_cm, 0.5 * side_cm]);
        }))
    };
    assert_eq!(kinds(&of_side(40.0)), []);
    assert_eq!(kinds(&of_side(40.01)), [ObstacleKind::TableRange]);
    // 4 x 4 is the smallest; its axis is 2 cm from an edge.
    assert_eq!(kinds(&of_side(4.0)), []);
    assert_eq!(kinds(&of_side(3.99)), [ObstacleKind::TableRange]);
}

/// The edge is at 10 cm; the built-in margin is 1 cm in the point's plane, here the isocentre plane.
#[test]
fn verify_field_edge() {
    assert_eq!(kinds(&at_x(9.0)), []);
    let near = at_x(9.1);
    assert_eq!(kinds(&near), [ObstacleKind::FieldEdge]);
    assert!(near.is_calculated());
    let under = at_x(10.1);
    assert_eq!(kinds(&under), [ObstacleKind::UnderDevice]);
    assert!(under.is_calculated());
    // On the other side as well.
    assert_eq!(kinds(&at_x(-9.1)), [ObstacleKind::FieldEdge]);
}

/// X jaws limit x_b: a point 7 cm to the patient's left lies under X jaws at 5 cm and between them at 10 cm; a point
/// 7 cm toward the head the other way round. With the collimator at 90 the jaws change places.
#[test]
fn verify_x_and_y_are_not_exchanged() {
    let at = |point_cm: [f64; 3], collimator_deg: f64| {
        let mut plan = plan_with_points(|point| {
            point.jaws_x_cm = Given::stated([-10.0, 10.0]);
            point.jaws_y_cm = Given::stated([-5.0, 5.0]);
            point.collimator_deg = Given::stated(collimator_deg);
        });
        let [x_cm, y_cm, z_cm] = point_cm;
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(1.0 + x_cm, -2.0 + y_cm, 30.0 + z_cm));
        kinds(&calculate(&plan))
    };
    let (left, head) = ([7.0, 0.0, 0.0], [0.0, 0.0, 7.0]);
    assert_eq!(at(left, 0.0), []);
    assert_eq!(at(head, 0.0), [ObstacleKind::UnderDevice]);
    assert_eq!(at(left, 90.0), [ObstacleKind::UnderDevice]);
    assert_eq!(at(head, 90.0), []);
}

/// 5 cm nearer the source everything is 0.95 times as large: 1.02 cm in the isocentre plane is 0.969 cm there.
#[test]
fn verify_field_edge_is_judged_in_the_points_plane() {
    let at = |projected_cm: f64| {
        let mut plan = plan_with_points(|point| point.jaws_x_cm = Given::stated([-10.0, 10.0]));
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(1.0 + 0.95 * projected_cm, -7.0, 30.0));
        kinds(&calculate(&plan))
    };
    assert_eq!(at(8.98), [ObstacleKind::FieldEdge]);
    // 1.06 * 0.95 = 1.007.
    assert_eq!(at(8.94), []);
}

/// On the axis within the tolerance of a position no off-axis table is looked at.
#[test]
fn verify_on_the_axis_is_one_by_definition() {
    let mut machine = tg71("tg71-tpr");
    // The data set's off-axis table ends 15 cm deep, so a point 20 cm deep is only covered on the axis.
    let mut plan = plan_with_points(|point| {
        point.ssd_cm = Given::stated(80.0);
        point.jaws_x_cm = Given::stated([-10.0, 10.0]);
    });
    let on_axis = super::calculate_with(&plan, &machine);
    assert_eq!(
        on_axis
            .trace
            .unwrap()
            .factor(FactorName::OffAxisRatio)
            .unwrap()
            .value,
        1.0
    );
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(3.0, -2.0, 30.0));
    let off_axis = super::calculate_with(&plan, &machine);
    assert_eq!(kinds(&off_axis), [ObstacleKind::TableRange]);
    // In-water and in-air ratios: with the first the depth of TPR and ratio is perpendicular. 2 cm off axis at
    // the isocentre's distance, SSD 92: 8 cm perpendicular, TPR(8) exactly on the table's row.
    machine.beams[0].off_axis.kind = counterfoil::beam_model::OffAxisKind::InWater;
    for point in &mut plan.beams[0].control_points {
        point.ssd_cm = Given::stated(92.0);
        point.jaws_x_cm = Given::stated([-5.0, 5.0]);
    }
    let result = super::calculate_with(&plan, &machine);
    assert_eq!(kinds(&result), []);
    let trace = result.trace.unwrap();
    assert_close(
        trace.factor(FactorName::TissuePhantomRatio).unwrap().value,
        1.074,
        1e-12,
    );
    // Row 2 cm, depth 8 cm of the data set's off-axis table.
    assert_close(
        trace.factor(FactorName::OffAxisRatio).unwrap().value,
        1.011,
        1e-12,
    );
}

/// Fixed SSD: the surface is set up, so the depth's uncertainty moves the point. SSD 100, 10 x 10 there: the dose goes
/// with PDD alone, by the table's rows 110.9, 100, 89.8 at 8, 10, 12 cm: ln(100.545/99.49)/0.2 per cm times 0.3 cm.
#[test]
fn verify_depth_spread_in_the_ssd_form() {
    let mut plan = plan_with_points(|point| point.ssd_cm = Given::stated(100.0));
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0, 8.0, 30.0));
    let spread = super::calculate_with(&plan, &tg71("tg71-pdd"))
        .spread
        .unwrap();
    let depth = spread
        .terms
        .iter()
        .find(|term| term.name == "depth")
        .unwrap();
    assert_close(
        depth.percent,
        100.0 * (100.545_f64 / 99.49).ln() / 0.2 * 0.3,
        1e-6,
    );
}

/// A long field and a point off its centre widen the expected spread.
#[test]
fn verify_spread_grows_where_the_method_approximates() {
    let names = |calculation: &BeamCalculation| -> Vec<&'static str> {
        let spread = calculation.spread.as_ref().unwrap();
        spread.terms.iter().map(|term| term.name).collect()
    };
    let elongated = "elongated field";
    let off_centre = "point off the field's centre";
    let square = calculate(&plan_with_points(|_| {}));
    assert!(!names(&square).contains(&elongated) && !names(&square).contains(&off_centre));
    let long = calculate(&plan_with_points(|point| {
        point.jaws_y_cm = Given::stated([-15.0, 15.0])
    }));
    assert!(names(&long).contains(&elongated));
    let asymmetric = calculate(&plan_with_points(|point| {
        point.jaws_y_cm = Given::stated([-2.0, 8.0])
    }));
    assert!(names(&asymmetric).contains(&off_centre));
    assert!(!names(&asymmetric).contains(&elongated));
    // 10 x 10 with the point 3 cm off its centre, by hand from Sp (TPR is 1 at d0): quadrants 10 x 4 and 10 x 16,
    // sides 80/14 = 5.714 and 320/26 = 12.308: Sp 0.925 + 0.019 * 0.714 = 0.93857 and 1.020 + 0.017 * 0.308/2 = 1.02262;
    // their mean 0.98059 against Sp(10) = 1: 1.96 %.
    let term = asymmetric
        .spread
        .unwrap()
        .terms
        .into_iter()
        .find(|term| term.name == off_centre)
        .unwrap();
    assert_close(term.percent, 1.96, 0.005);
}
