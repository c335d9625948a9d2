//! A dynamic wedge that the plan does not spell out, its sweep an ideal exponential, against the published kernel
//! weighted with that fluence: both orientations of either axis, symmetric and asymmetric fields, on and off the axis,
//! and a smaller angle by the mixing rule. The model has neither head scatter nor horn, so the fluence is all.

use counterfoil::beam_model::{
    DepthInterpolation, Grid, JawAxis, MachineModel, ModelFinding, ModelSeverity, WedgeBody,
    WedgeModel, WedgeSweep, check_machine,
};
use counterfoil::dose::{StepLimits, Technique};
use counterfoil::plan::{Plan, Wedge, WedgeKind, WedgePosition};
use counterfoil::quantity::{Given, Point};

use super::field::{calculate, cgy_per_mu};
use super::kernel_model::{Spoilt, kernel, kernel_machine};
use super::quantiles;
use super::reference::{Rectangle, kernel_dose};
use crate::dose::plain_plan;

/// A field: orientation, angle, jaws and the point's place, collimator system, cm.
#[derive(Clone, Copy, Debug)]
struct Case {
    orientation_deg: f64,
    angle_deg: f64,
    x_cm: [f64; 2],
    y_cm: [f64; 2],
    point_cm: [f64; 2],
    depth_cm: f64,
}

const GAP_CM: f64 = 0.5;

/// The kernel's machine with a sweep of exp(m (p - 10)) for 60 degrees.
fn machine(per_cm: f64, moves_along: JawAxis) -> MachineModel {
    let mut machine = kernel_machine(Spoilt::No);
    let rows: Vec<f64> = (-40..=20).map(|half| f64::from(half) * 0.5).collect();
    let shares = rows.iter().map(|p_cm| (per_cm * (p_cm - 10.0)).exp());
    let delivered = Grid::new(
        "6/sweep.csv",
        ("position_cm", rows.clone()),
        ("cumulative_meterset", vec![0.0]),
        shares.collect(),
        DepthInterpolation::Linear,
    );
    machine.beams[0].wedges = vec![WedgeModel {
        id: "E60".to_owned(),
        further_ids: Vec::new(),
        angle_deg: 60.0,
        body: WedgeBody::Dynamic(WedgeSweep {
            moves_along,
            closing_gap_cm: GAP_CM,
            delivered: delivered.unwrap(),
            factor: None,
        }),
    }];
    machine
}

fn plan(case: Case) -> Plan {
    let mut plan = plain_plan();
    // Head first supine, gantry and collimator at 0: x to the left, y towards the head.
    plan.fraction_groups[0].beams[0].specification_point = Given::stated(Point::new(
        1.0 + case.point_cm[0],
        -2.0,
        30.0 + case.point_cm[1],
    ));
    let beam = &mut plan.beams[0];
    beam.machine = Given::stated("KERNEL".to_owned());
    beam.wedges = vec![Wedge {
        number: Given::stated(1),
        kind: Given::stated(WedgeKind::Dynamic),
        id: Given::stated("E60".to_owned()),
        angle_deg: Given::stated(case.angle_deg),
        orientation_deg: Given::stated(case.orientation_deg),
        ..Wedge::default()
    }];
    let slant = 100.0_f64.hypot(case.point_cm[0].hypot(case.point_cm[1])) / 100.0;
    for point in &mut beam.control_points {
        point.jaws_x_cm = Given::stated(case.x_cm);
        point.jaws_y_cm = Given::stated(case.y_cm);
        point.ssd_cm = Given::stated(100.0 - case.depth_cm / slant);
        point.wedges = vec![WedgePosition {
            wedge_number: Given::stated(1),
            in_beam: Given::stated(true),
        }];
    }
    plan
}

/// The kernel over strips of 0.05 cm across the wedge, weighted with the ideal fluence. Written out for each orientation: the thin
/// end lies towards +y at 0, -x at 90, -y at 180, +x at 270, and the jaw stops 0.5 cm short of that end.
fn exact(case: Case, per_cm: f64) -> f64 {
    let kernel = kernel();
    let open_on_axis = (-per_cm * 10.0).exp();
    let weight = case.angle_deg.to_radians().tan() / 60.0_f64.to_radians().tan();
    let sixty = |p_cm: f64| (per_cm * (p_cm - 10.0)).exp();
    let mixed = |p_cm: f64| weight * sixty(p_cm) + (1.0 - weight) * open_on_axis;
    let ([from, to], position): ([f64; 2], fn(f64) -> f64) = match case.orientation_deg {
        0.0 => (case.y_cm, |y| y),
        180.0 => (case.y_cm, |y| -y),
        270.0 => (case.x_cm, |x| x),
        _ => (case.x_cm, |x| -x),
    };
    let along_y = case.orientation_deg == 0.0 || case.orientation_deg == 180.0;
    let end_cm = position(from).max(position(to)) - GAP_CM;
    let strips = ((to - from) / 0.05).round() as usize;
    let mut sum = 0.0;
    for strip in 0..strips {
        let low = from + 0.05 * strip as f64;
        let fluence = mixed(position(low + 0.025).min(end_cm)) / mixed(end_cm);
        let beside = |side: [f64; 2], at: f64| side.map(|edge| edge - at);
        let [x, y] = case.point_cm;
        let piece: Rectangle = if along_y {
            (beside(case.x_cm, x), beside([low, low + 0.05], y))
        } else {
            (beside([low, low + 0.05], x), beside(case.y_cm, y))
        };
        sum += fluence * kernel_dose(&kernel, &[piece], case.depth_cm);
    }
    0.8 * sum / kernel.square_dose(10.0, 10.0)
}

#[test]
fn validate_the_models_sweep_against_the_kernel_under_an_exponential_fluence() {
    let symmetric = [-6.0, 6.0];
    let square = |orientation_deg, point_cm, depth_cm| Case {
        orientation_deg,
        angle_deg: 60.0,
        x_cm: symmetric,
        y_cm: symmetric,
        point_cm,
        depth_cm,
    };
    let mut cases = vec![
        square(0.0, [0.0, 0.0], 10.0),
        square(0.0, [0.0, 3.0], 5.0),
        square(0.0, [2.0, -3.0], 15.0),
        square(180.0, [0.0, 3.0], 10.0),
        square(180.0, [1.0, -3.5], 10.0),
        square(90.0, [3.0, 0.0], 10.0),
        square(90.0, [-3.0, 1.0], 5.0),
        square(270.0, [3.0, 0.0], 10.0),
        square(270.0, [-2.0, 2.0], 20.0),
    ];
    for (orientation_deg, x_cm, y_cm, point_cm) in [
        (0.0, [-5.0, 5.0], [-8.0, 3.0], [0.0, -2.0]),
        (0.0, [-5.0, 5.0], [-2.0, 9.0], [1.0, 4.0]),
        (180.0, [-4.0, 7.0], [-2.0, 9.0], [1.0, 4.0]),
        (90.0, [-3.0, 8.0], [-5.0, 5.0], [3.0, 1.0]),
        (270.0, [-3.0, 8.0], [-5.0, 5.0], [3.0, -1.0]),
    ] {
        cases.push(Case {
            x_cm,
            y_cm,
            ..square(orientation_deg, point_cm, 10.0)
        });
    }
    let smaller = cases.clone();
    cases.extend(smaller.iter().map(|&case| Case {
        angle_deg: 30.0,
        ..case
    }));
    cases.extend(smaller.iter().map(|&case| Case {
        angle_deg: 15.0,
        ..case
    }));
    let mut deviations = Vec::new();
    for per_cm in [0.06, 0.1] {
        let machines = [machine(per_cm, JawAxis::Y), machine(per_cm, JawAxis::X)];
        for &case in &cases {
            let along_y = case.orientation_deg == 0.0 || case.orientation_deg == 180.0;
            let machine = &machines[usize::from(!along_y)];
            let found = calculate(&plan(case), machine, StepLimits::default());
            assert_eq!(found.technique, Technique::Wedge);
            assert!(found.obstacles.is_empty(), "{case:?} {:?}", found.obstacles);
            let percent = 100.0 * (cgy_per_mu(&found) / exact(case, per_cm) - 1.0);
            assert!(percent.abs() <= 0.3, "{per_cm} {case:?} {percent}");
            deviations.push(percent);
        }
    }
    let found = quantiles(&deviations);
    println!("swept wedges, per cent: {found:?}");
    assert!(found.median <= 0.1 && found.p99 <= 0.3 && found.maximum <= 0.3);
}

/// Half the step of jaw and moment.
#[test]
fn validate_halved_steps_change_nothing() {
    let whole = StepLimits::default();
    let half = StepLimits {
        leaf_cm: whole.leaf_cm / 2.0,
        ..whole
    };
    for (orientation_deg, point_cm) in [(0.0, [0.0, 0.1]), (180.0, [2.0, 3.3]), (0.0, [0.0, -3.9])]
    {
        let case = Case {
            orientation_deg,
            angle_deg: 60.0,
            x_cm: [-6.0, 6.0],
            y_cm: [-6.3, 5.1],
            point_cm,
            depth_cm: 10.0,
        };
        let machine = machine(0.1, JawAxis::Y);
        let dose = |steps| cgy_per_mu(&calculate(&plan(case), &machine, steps));
        let percent = 100.0 * (dose(half) / dose(whole) - 1.0);
        println!("{case:?}: {percent:+.4} %");
        assert!(percent.abs() <= 0.05, "{percent}");
    }
}

/// A guard on the comparison: the same with the mixing taken as a share of MU, or the wedge turned round, must fail it.
#[test]
fn verify_the_comparison_sees_a_wrong_mix_and_a_turned_wedge() {
    let case = Case {
        orientation_deg: 0.0,
        angle_deg: 30.0,
        x_cm: [-6.0, 6.0],
        y_cm: [-6.0, 6.0],
        point_cm: [0.0, 3.0],
        depth_cm: 10.0,
    };
    let found = cgy_per_mu(&calculate(
        &plan(case),
        &machine(0.1, JawAxis::Y),
        StepLimits::default(),
    ));
    let turned = Case {
        orientation_deg: 180.0,
        ..case
    };
    assert!((found / exact(turned, 0.1) - 1.0).abs() > 0.05);
    // A third of the MU with 60 degrees, two thirds open: the dose of the open field and that of 60 degrees, weighted.
    let sixty = exact(
        Case {
            angle_deg: 60.0,
            ..case
        },
        0.1,
    );
    let kernel = kernel();
    let open = 0.8 * kernel_dose(&kernel, &[([-6.0, 6.0], [-9.0, 3.0])], 10.0)
        / kernel.square_dose(10.0, 10.0);
    let by_mu = sixty / 3.0 + 2.0 * open / 3.0;
    assert!((found / by_mu - 1.0).abs() > 0.01, "{found} {by_mu}");
}

/// Sides and depths of a measured table, cm.
const TABLE_SIDES_CM: [f64; 3] = [6.0, 10.0, 16.0];
const TABLE_DEPTHS_CM: [f64; 3] = [5.0, 10.0, 20.0];

/// What `model check` says of a measured factor: here the kernel's own, times `spoilt`.
fn beside_the_sweep(spoilt: f64) -> ModelFinding {
    let kernel = kernel();
    let mut machine = machine(0.1, JawAxis::Y);
    let mut values = Vec::new();
    for depth_cm in TABLE_DEPTHS_CM {
        for side_cm in TABLE_SIDES_CM {
            let jaws_cm = [-side_cm / 2.0, side_cm / 2.0];
            let swept = exact(
                Case {
                    orientation_deg: 0.0,
                    angle_deg: 60.0,
                    x_cm: jaws_cm,
                    y_cm: jaws_cm,
                    point_cm: [0.0, 0.0],
                    depth_cm,
                },
                0.1,
            );
            let open = 0.8 * kernel.square_dose(side_cm, depth_cm) / kernel.square_dose(10.0, 10.0);
            values.push(spoilt * swept / open);
        }
    }
    let factor = Grid::new(
        "6/factor.csv",
        ("depth_cm", TABLE_DEPTHS_CM.to_vec()),
        ("side_cm", TABLE_SIDES_CM.to_vec()),
        values,
        DepthInterpolation::Linear,
    );
    if let WedgeBody::Dynamic(sweep) = &mut machine.beams[0].wedges[0].body {
        sweep.factor = Some(factor.unwrap());
    }
    check_machine(&machine, jiff::civil::date(2026, 12, 1))
        .into_iter()
        .find(|finding| finding.message.contains("comes to"))
        .unwrap()
}

/// The check integrates the sweep by itself; the measured factors here are the kernel under the ideal fluence.
#[test]
fn verify_model_check_holds_a_measured_factor_against_the_sweep() {
    let right = beside_the_sweep(1.0);
    println!("{right}");
    assert_eq!(right.severity, ModelSeverity::Note);
    assert!(right.measured.unwrap().abs() <= 0.3, "{right}");
    // Three per cent too much: 1 / 1.03 - 1 = -2.9 %.
    let wrong = beside_the_sweep(1.03);
    assert_eq!(wrong.severity, ModelSeverity::Warning);
    assert!((wrong.measured.unwrap() + 2.9).abs() <= 0.3, "{wrong}");
    assert_eq!(wrong.table.as_deref(), Some("6/factor.csv"));
    assert!(wrong.message.contains("6/sweep.csv"), "{wrong}");
}
