//! Dynamic wedges whose plan does not spell out how the jaw moves: the sweep of
//! the beam model against arithmetic by hand, against the same wedge spelled out, the four
//! orientations, and everything that keeps such a wedge from being verified. The published kernel is in
//! `shaped::swept_kernel`.

use counterfoil::beam_model::{
    DepthInterpolation, Grid, JawAxis, MachineModel, WedgeBody, WedgeModel, WedgeSweep, WedgeTables,
};
use counterfoil::dose::{BeamCalculation, IntervalSource, Method, ObstacleKind, Technique};
use counterfoil::plan::{ControlPoint, Plan, Wedge, WedgeKind, WedgePosition};
use counterfoil::quantity::{Given, Point};

use super::{assert_close, assert_says, calculate_with, plain_plan, verified_cgy_per_mu};

/// The shipped model with a sweep of its own: S(p) = exp(0.1 (p - 10)) at every half centimetre from -20 to 10, straight
/// between; 60 degrees.
fn machine(moves_along: JawAxis) -> MachineModel {
    let root = std::path::PathBuf::from(env!("CARGO_MANIFEST_DIR"));
    let mut machine =
        counterfoil::beam_model::load_machine(&root.join("beam-models/rowan")).unwrap();
    // The X jaws of the shipped machine go 2 cm across the axis only.
    for jaw in &mut machine.collimation.jaws {
        jaw.travel.across_cm = Some(10.0);
    }
    let rows: Vec<f64> = (-40..=20).map(|half| f64::from(half) * 0.5).collect();
    let shares = rows.iter().map(|&p_cm| s(p_cm)).collect();
    machine.beams[0].wedges.push(WedgeModel {
        id: "E60".to_owned(),
        further_ids: vec!["E30".to_owned()],
        angle_deg: 60.0,
        body: WedgeBody::Dynamic(WedgeSweep {
            moves_along,
            closing_gap_cm: 0.5,
            delivered: Grid::new(
                "6/wedge-E60-segments.csv",
                ("position_cm", rows),
                ("cumulative_meterset", vec![0.0]),
                shares,
                DepthInterpolation::Linear,
            )
            .unwrap(),
            factor: None,
        }),
    });
    machine
}

fn s(p_cm: f64) -> f64 {
    (0.1 * (p_cm - 10.0)).exp()
}

fn sweep_of(machine: &mut MachineModel) -> &mut WedgeSweep {
    match &mut machine.beams[0].wedges.last_mut().unwrap().body {
        WedgeBody::Dynamic(sweep) => sweep,
        WedgeBody::Fixed(_) | WedgeBody::Motorised(_) => unreachable!("a dynamic wedge"),
    }
}

/// The plain plan, 12 x 12, with the wedge in; the point beside the isocentre, to the left and towards the head, which is x and y
/// of the collimator.
fn plan(angle_deg: f64, orientation_deg: f64, [left_cm, head_cm]: [f64; 2]) -> Plan {
    let mut plan = plain_plan();
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0 + left_cm, -2.0, 30.0 + head_cm));
    let beam = &mut plan.beams[0];
    beam.machine = Given::stated("ROWAN-1".to_owned());
    beam.wedges = vec![Wedge {
        number: Given::stated(1),
        kind: Given::stated(WedgeKind::Dynamic),
        id: Given::stated(if angle_deg == 60.0 { "E60" } else { "E30" }.to_owned()),
        angle_deg: Given::stated(angle_deg),
        orientation_deg: Given::stated(orientation_deg),
        // The planning system's own word, and a wrong one: it must never be used.
        factor: Given::stated(0.9),
        ..Wedge::default()
    }];
    for point in &mut beam.control_points {
        point.jaws_x_cm = Given::stated([-6.0, 6.0]);
        point.jaws_y_cm = Given::stated([-6.0, 6.0]);
        point.wedges = vec![WedgePosition {
            wedge_number: Given::stated(1),
            in_beam: Given::stated(true),
        }];
    }
    plan
}

fn with_jaws(mut plan: Plan, x_cm: [f64; 2], y_cm: [f64; 2]) -> Plan {
    for point in &mut plan.beams[0].control_points {
        point.jaws_x_cm = Given::stated(x_cm);
        point.jaws_y_cm = Given::stated(y_cm);
    }
    plan
}

fn calculate(plan: &Plan) -> BeamCalculation {
    let orientation_deg = plan.beams[0].wedges[0].orientation_deg.get();
    let along_x = orientation_deg.is_some_and(|deg| deg.rem_euclid(180.0) == 90.0);
    let axis = if along_x { JawAxis::X } else { JawAxis::Y };
    calculate_with(plan, &machine(axis))
}

fn input(result: &BeamCalculation, symbol: &str) -> f64 {
    result.trace.as_ref().unwrap().input(symbol).unwrap().value
}

/// w = tan 30 / tan 60 = (1/sqrt 3) / sqrt 3 = 1/3.
const THIRD: f64 = 1.0 / 3.0;

/// S' / S'(e) by hand, from S as above: the field ends at p2, the jaw stops 0.5 cm before it.
fn share(weight: f64, p_cm: f64, end_cm: f64) -> f64 {
    let mixed = |p_cm: f64| weight * s(p_cm) + (1.0 - weight) * s(0.0);
    mixed(p_cm.min(end_cm)) / mixed(end_cm)
}

/// 60 degrees, -6 to 6 cm: S(0) / S(5.5) = exp(-0.55) = 0.576950; S(2) / S(5.5) = exp(-0.35) = 0.704688.
/// 30 degrees: (S(2)/3 + 2 S(0)/3) / (S(5.5)/3 + 2 S(0)/3) = (exp(0.2) + 2) / (exp(0.55) + 2) = 3.221403 / 3.733253 = 0.862894.
/// The fluence at the point is that, but for a blur of 0.18 cm over a curve of 10 % per cm: (0.1 * 0.18)^2 / 2 = 0.016 %, and the table's straight
/// lines: (0.1 * 0.5)^2 / 8 = 0.03 % at most.
#[test]
fn verify_the_fluence_at_the_point_by_hand() {
    for (angle_deg, y_cm, fluence) in [
        (60.0, 0.0, 0.576_950),
        (60.0, 2.0, 0.704_688),
        (30.0, 2.0, 0.862_894),
        (30.0, 0.0, 3.0 / 3.733_253),
    ] {
        let result = calculate(&plan(angle_deg, 0.0, [0.0, y_cm]));
        assert_eq!(result.technique, Technique::Wedge);
        assert_eq!(result.method, Some(Method::ScatterIntegration));
        assert!(verified_cgy_per_mu(&result) > 0.0);
        assert_close(input(&result, "p"), y_cm, 1e-9);
        // All three places are rows of the table.
        assert_close(input(&result, "S'(p)/S'(e)"), fluence, 1e-6);
        assert_close(input(&result, "Phi_open") / fluence, 1.0, 5e-4);
    }
}

/// Asymmetric: from -7 to 4 cm along the wedge, e = 3.5; the point at p = 1: exp(-0.25) = 0.778801, and with 30 degrees
/// (exp(0.1) + 2) / (exp(0.35) + 2) = 3.105171 / 3.419068 = 0.908192. Thin end by `PlacedWedge::position_cm`: 0 towards +y, 90 towards
/// -x, 180 towards -y, 270 towards +x.
#[test]
fn verify_the_four_orientations_in_asymmetric_fields() {
    let across = [-6.0, 6.0];
    for (orientation_deg, x_cm, y_cm, point_cm) in [
        (0.0, across, [-7.0, 4.0], [0.0, 1.0]),
        (180.0, across, [-4.0, 7.0], [0.0, -1.0]),
        (90.0, [-4.0, 7.0], across, [-1.0, 0.0]),
        (270.0, [-7.0, 4.0], across, [1.0, 0.0]),
        (-90.0, [-7.0, 4.0], across, [1.0, 0.0]),
    ] {
        for (angle_deg, fluence) in [(60.0, 0.778_801), (30.0, 0.908_192)] {
            let plan = with_jaws(plan(angle_deg, orientation_deg, point_cm), x_cm, y_cm);
            let result = calculate(&plan);
            assert!(verified_cgy_per_mu(&result) > 0.0);
            assert_close(input(&result, "S'(p)/S'(e)"), fluence, 1e-6);
            assert_close(input(&result, "Phi_open") / fluence, 1.0, 5e-4);
        }
    }
}

/// Turned round, the point 2 cm from the axis: S(-2) in place of S(2), exp(-0.4) = 0.670 of the fluence, and the dose follows.
#[test]
fn verify_a_reversed_wedge_is_visible_off_the_axis_and_named_where_it_is_not() {
    let dose = |plan: &Plan| verified_cgy_per_mu(&calculate(plan));
    let right = dose(&plan(60.0, 0.0, [0.0, 2.0]));
    let turned = dose(&plan(60.0, 180.0, [0.0, 2.0]));
    assert_close(turned / right, 0.67, 0.03);
    let weak = |plan: &Plan| {
        let remarks = calculate(plan).remarks;
        remarks.iter().any(|remark| remark.contains("turned round"))
    };
    assert!(!weak(&plan(60.0, 0.0, [0.0, 2.0])));
    assert!(weak(&plan(60.0, 0.0, [0.0, 0.0])));
    assert!(weak(&plan(60.0, 0.0, [2.0, 0.0])));
}

/// The same motion written into the control points: one for each of the table's rows inside the field.
fn spelled_out(mut plan: Plan, weight: f64) -> Plan {
    let beam = &mut plan.beams[0];
    let orientation_deg = beam.wedges[0].orientation_deg.get().unwrap();
    let first = beam.control_points[0].clone();
    let jaws = if orientation_deg == 0.0 {
        first.jaws_y_cm.get().unwrap()
    } else {
        first.jaws_x_cm.get().unwrap()
    };
    // Only 0 and 90 degrees: Y1 moves up, or X2 moves down.
    let (from_cm, end_cm) = if orientation_deg == 0.0 {
        (jaws[0], jaws[1] - 0.5)
    } else {
        (-jaws[1], -jaws[0] - 0.5)
    };
    let at = |p_cm: f64, share: f64| {
        let mut point = ControlPoint {
            cumulative_weight: Given::stated(share),
            ..first.clone()
        };
        if orientation_deg == 0.0 {
            point.jaws_y_cm = Given::stated([p_cm, jaws[1]]);
        } else {
            point.jaws_x_cm = Given::stated([jaws[0], -p_cm]);
        }
        point
    };
    beam.control_points = vec![at(from_cm, 0.0)];
    let mut p_cm = from_cm;
    while p_cm < end_cm + 1e-9 {
        beam.control_points
            .push(at(p_cm, share(weight, p_cm, end_cm)));
        p_cm += 0.5;
    }
    beam.final_cumulative_weight = Given::stated(1.0);
    plan
}

#[test]
fn verify_spelled_out_and_from_the_model_are_one() {
    for (angle_deg, weight) in [(60.0, 1.0), (30.0, THIRD)] {
        for (orientation_deg, x_cm, y_cm, point_cm) in [
            (0.0, [-6.0, 6.0], [-6.0, 6.0], [0.0, 0.0]),
            (0.0, [-6.0, 6.0], [-6.0, 6.0], [1.5, -3.0]),
            (0.0, [-4.0, 7.0], [-9.0, 3.0], [1.0, 1.0]),
            (90.0, [-6.0, 6.0], [-5.0, 5.0], [-2.0, 1.0]),
            (90.0, [-3.0, 8.0], [-5.0, 5.0], [4.0, 0.0]),
        ] {
            let plan = with_jaws(plan(angle_deg, orientation_deg, point_cm), x_cm, y_cm);
            let swept = calculate(&plan);
            let stated = calculate(&spelled_out(plan, weight));
            assert_eq!(swept.technique, Technique::Wedge);
            assert_eq!(stated.technique, Technique::Dynamic);
            let percent =
                100.0 * (verified_cgy_per_mu(&swept) / verified_cgy_per_mu(&stated) - 1.0);
            println!("{angle_deg} degrees, {orientation_deg}, {point_cm:?}: {percent:+.4} %");
            assert!(percent.abs() <= 0.05, "{percent}");
            let shaped = |result: &BeamCalculation| result.shaped.clone().unwrap();
            assert_eq!(shaped(&swept).intervals_from, IntervalSource::ModelSweep);
            assert_eq!(
                shaped(&stated).intervals_from,
                IntervalSource::ControlPoints
            );
        }
    }
}

/// What a person needs: wedge, angle, direction, weight, file, where the jaw goes, and the dose over that of the open field.
#[test]
fn verify_the_result_names_what_it_took_from_the_model() {
    let result = calculate(&with_jaws(
        plan(30.0, 180.0, [0.0, 0.0]),
        [-6.0, 6.0],
        [-5.0, 6.0],
    ));
    let remark = result
        .remarks
        .iter()
        .find(|remark| remark.contains("does not spell out"))
        .unwrap();
    for part in [
        "\"E30\"",
        "30 degrees at orientation 180",
        "sweep of E60 (6/wedge-E60-segments.csv, 60 degrees)",
        // The thin end towards -y: Y2 moves, from 6 to -4.5.
        "Jaw Y2 goes from 6 to -4.5 cm, 0.5 cm before Y1",
        "p is -y",
        "w = tan 30 / tan 60 = 0.3333",
        // exp(-1).
        "S(0) = 0.3679",
    ] {
        assert!(remark.contains(part), "`{part}` is not in: {remark}");
    }
    // The picture shows the field of the plan and where the jaw stops.
    assert_eq!(result.view.jaws_y_cm, Some([-5.0, 6.0]));
    let last = result.view.last.as_ref().unwrap();
    assert_eq!(last.jaws_y_cm, Some([-5.0, -4.5]));
    // In the open field of the same jaws, with the same engine: the beam without its wedge, beside a leaf-less engine the factor
    // formalism, which differs by what an equivalent square is worth.
    let mut open = with_jaws(plan(30.0, 180.0, [0.0, 0.0]), [-6.0, 6.0], [-5.0, 6.0]);
    open.beams[0].wedges.clear();
    for point in &mut open.beams[0].control_points {
        point.wedges.clear();
    }
    let open = calculate_with(&open, &machine(JawAxis::Y));
    assert_eq!(open.technique, Technique::Static);
    let ratio = verified_cgy_per_mu(&result) / verified_cgy_per_mu(&open);
    assert_close(input(&result, "WF_eff") / ratio, 1.0, 2e-3);
    let names: Vec<&str> = result
        .spread
        .as_ref()
        .unwrap()
        .terms
        .iter()
        .map(|term| term.name)
        .collect();
    for name in [
        "wedge sweep",
        "wedge position",
        "transmission of the moving jaw",
    ] {
        assert!(names.contains(&name), "{names:?}");
    }
}

/// Leaves around the wedged field: the engine takes both. Where they stand just outside the jaws nothing changes but the head
/// scatter of an aperture, which jaws alone leave at the table's.
#[test]
fn verify_leaves_outside_the_jaws_change_nothing() {
    let plain = plan(60.0, 0.0, [0.0, 1.0]);
    let machine = machine(JawAxis::Y);
    let bank = machine.collimation.leaf_banks[0].clone();
    let pairs = bank.boundaries_cm.len() - 1;
    let mut leaved = plain.clone();
    let beam = &mut leaved.beams[0];
    beam.devices.push(counterfoil::plan::LimitingDevice {
        kind: counterfoil::plan::DeviceKind::Mlcx { layer: 0 },
        pairs: Given::Absent,
        source_distance_cm: Given::Absent,
        boundaries_cm: Given::stated(bank.boundaries_cm),
    });
    for point in &mut beam.control_points {
        let side = |cm: f64| std::iter::repeat_n(cm, pairs);
        point.leaves = vec![counterfoil::plan::LeafPositions {
            kind: counterfoil::plan::DeviceKind::Mlcx { layer: 0 },
            positions_cm: Given::stated(side(-6.5).chain(side(6.5)).collect()),
        }];
    }
    let percent = |one: &Plan, other: &Plan| {
        let dose = |plan: &Plan| verified_cgy_per_mu(&calculate_with(plan, &machine));
        100.0 * (dose(one) / dose(other) - 1.0)
    };
    assert!(percent(&leaved, &plain).abs() < 0.05);
    // Closed to half the width on one side they take scatter away.
    for point in &mut leaved.beams[0].control_points {
        let side = |cm: f64| std::iter::repeat_n(cm, pairs);
        point.leaves[0].positions_cm = Given::stated(side(-3.0).chain(side(6.5)).collect());
    }
    assert!(percent(&leaved, &plain) < -0.5);
}

/// From a hair of an angle, which is the open field, to the sweep's own: less and less on the axis.
#[test]
fn property_steeper_angles_let_less_through() {
    let mut before = 1.0;
    for angle_deg in [0.1, 15.0, 30.0, 45.0, 59.9, 60.0] {
        let factor = input(&calculate(&plan(angle_deg, 0.0, [0.0, 0.0])), "WF_eff");
        assert!(factor < before, "{angle_deg} {factor} {before}");
        if angle_deg < 1.0 {
            // w = 0.001: exp(0.55) - 1 = 0.73 times that is what the meterset grows by.
            assert_close(factor, 1.0, 1e-3);
        }
        before = factor;
    }
}

/// 1 MU of the sweep is not 1 MU of the open field: out of the beam, the wedge changes nothing.
#[test]
fn verify_a_wedge_that_stays_out_is_an_open_field() {
    let mut out = plan(60.0, 0.0, [0.0, 0.0]);
    for point in &mut out.beams[0].control_points {
        point.wedges[0].in_beam = Given::stated(false);
    }
    let result = calculate(&out);
    assert_eq!(result.technique, Technique::Static);
    assert_eq!(result.method, Some(Method::Factors));
    assert!(
        result
            .remarks
            .iter()
            .any(|remark| remark.contains("never in"))
    );
    assert!(verified_cgy_per_mu(&result) > 0.0);
}

/// The obstacle that a change of plan or model calls up; there must be no number with it.
fn refused(change: impl FnOnce(&mut Plan, &mut MachineModel)) -> (ObstacleKind, String) {
    let mut plan = plan(60.0, 0.0, [0.0, 0.0]);
    let mut machine = machine(JawAxis::Y);
    change(&mut plan, &mut machine);
    let result = calculate_with(&plan, &machine);
    assert!(result.trace.is_none(), "{:?}", result.obstacles);
    assert_eq!(result.obstacles.len(), 1, "{:?}", result.obstacles);
    let obstacle = &result.obstacles[0];
    (obstacle.kind, obstacle.message.clone())
}

fn first_wedge(plan: &mut Plan) -> &mut Wedge {
    &mut plan.beams[0].wedges[0]
}

#[test]
fn verify_what_a_sweep_cannot_make_is_named_and_gives_no_number() {
    type Case = (
        fn(&mut Plan, &mut MachineModel),
        ObstacleKind,
        &'static [&'static str],
    );
    let cases: [Case; 15] = [
        (
            |plan, _| first_wedge(plan).angle_deg = Given::stated(70.0),
            ObstacleKind::Model,
            &["70 degrees", "up to 60 degrees"],
        ),
        (
            |plan, _| first_wedge(plan).angle_deg = Given::stated(0.0),
            ObstacleKind::Model,
            &["0 degrees", "above 0"],
        ),
        (
            |plan, _| first_wedge(plan).angle_deg = Given::stated(-30.0),
            ObstacleKind::Model,
            &["-30 degrees"],
        ),
        (
            |plan, _| first_wedge(plan).angle_deg = Given::stated(f64::NAN),
            ObstacleKind::Model,
            &["NaN"],
        ),
        (
            |plan, _| first_wedge(plan).angle_deg = Given::Absent,
            ObstacleKind::Reading,
            &["Wedge Angle (300A,00D5)", "how much of the sweep"],
        ),
        (
            |plan, _| first_wedge(plan).orientation_deg = Given::stated(45.0),
            ObstacleKind::Model,
            &["is 45 degrees", "the Y jaws", "0 and 180 degrees only"],
        ),
        (
            |plan, _| first_wedge(plan).orientation_deg = Given::stated(90.0),
            ObstacleKind::Model,
            &["is 90 degrees", "the Y jaws"],
        ),
        (
            |plan, machine| {
                *machine = self::machine(JawAxis::X);
                first_wedge(plan).orientation_deg = Given::stated(180.0);
            },
            ObstacleKind::Model,
            &["the X jaws", "270 and 90 degrees only"],
        ),
        // The table ends at 10, the jaw stops at 10.5 - 0.5: past it by 0.1.
        (
            |plan, _| *plan = with_jaws(plan.clone(), [-6.0, 6.0], [-6.0, 10.6]),
            ObstacleKind::Model,
            &["Y1", "10.1 cm across the axis", "lets it go 10 cm"],
        ),
        (
            |plan, machine| {
                machine.collimation.jaws.clear();
                *plan = with_jaws(plan.clone(), [-6.0, 6.0], [-6.0, 10.6]);
            },
            ObstacleKind::TableRange,
            &["sweep of the wedge E60", "position_cm 10.10", "-20 to 10"],
        ),
        // At the thick end the table begins at -20.
        (
            |plan, machine| {
                machine.collimation.jaws.clear();
                *plan = with_jaws(plan.clone(), [-6.0, 6.0], [-20.5, 6.0]);
            },
            ObstacleKind::TableRange,
            &["sweep of the wedge E60", "position_cm -20.50"],
        ),
        (
            |plan, machine| {
                for jaw in &mut machine.collimation.jaws {
                    jaw.travel.outward_cm = Some(5.0);
                }
                *plan = with_jaws(plan.clone(), [-5.0, 5.0], [-6.0, 5.0]);
            },
            ObstacleKind::Model,
            &["Y1", "6 cm outward", "lets it go 5 cm"],
        ),
        (
            |plan, _| *plan = with_jaws(plan.clone(), [-6.0, 6.0], [-0.2, 0.3]),
            ObstacleKind::Technique,
            &["0.5 cm wide", "nothing is left to sweep"],
        ),
        (
            |plan, _| {
                plan.beams[0].wedges.push(Wedge {
                    number: Given::stated(2),
                    kind: Given::stated(WedgeKind::Standard),
                    id: Given::stated("W45".to_owned()),
                    angle_deg: Given::stated(45.0),
                    orientation_deg: Given::stated(90.0),
                    ..Wedge::default()
                });
                for point in &mut plan.beams[0].control_points {
                    point.wedges.push(WedgePosition {
                        wedge_number: Given::stated(2),
                        in_beam: Given::stated(true),
                    });
                }
            },
            ObstacleKind::Technique,
            &["\"E60\" and the wedge \"W45\"", "more than one wedge"],
        ),
        (
            |_, machine| {
                let sweep = sweep_of(machine);
                sweep.delivered = Grid::new(
                    "6/late.csv",
                    ("position_cm", vec![-20.0, 0.0, 10.0]),
                    ("cumulative_meterset", vec![0.0]),
                    vec![0.0, 0.0, 1.0],
                    DepthInterpolation::Linear,
                )
                .unwrap();
            },
            ObstacleKind::Model,
            &["6/late.csv", "delivers nothing before"],
        ),
    ];
    for (change, kind, parts) in cases {
        assert_says(refused(change), kind, parts);
    }
}

/// In for a half of the meterset only, and in a beam of two openings.
#[test]
fn verify_a_sweep_is_not_put_into_a_beam_that_moves_otherwise() {
    let (kind, message) = refused(|plan, _| {
        let beam = &mut plan.beams[0];
        let first = beam.control_points[0].clone();
        beam.control_points = [(0.0, true), (0.5, true), (0.5, false), (1.0, false)]
            .map(|(weight, is_in)| {
                let mut point = first.clone();
                point.cumulative_weight = Given::stated(weight);
                point.wedges[0].in_beam = Given::stated(is_in);
                point
            })
            .into();
    });
    assert_eq!(kind, ObstacleKind::Technique, "{message}");
    assert!(message.contains("50 % of the meterset only"), "{message}");

    let (kind, message) = refused(|plan, _| {
        let beam = &mut plan.beams[0];
        let first = beam.control_points[0].clone();
        beam.control_points = [(0.0, 6.0), (0.5, 6.0), (0.5, 5.0), (1.0, 5.0)]
            .map(|(weight, x_cm)| ControlPoint {
                cumulative_weight: Given::stated(weight),
                jaws_x_cm: Given::stated([-6.0, x_cm]),
                ..first.clone()
            })
            .into();
    });
    assert_eq!(kind, ObstacleKind::Technique, "{message}");
    assert!(message.contains("opening or gantry moves"), "{message}");

    // X jaws that move are no wedge of the Y jaws.
    let (kind, message) = refused(|plan, _| {
        plan.beams[0].control_points[1].jaws_x_cm = Given::stated([-6.0, 5.0]);
    });
    assert_eq!(kind, ObstacleKind::Technique, "{message}");
    assert!(message.contains("opening or gantry moves"), "{message}");
}

/// Near the edges and beyond where the jaw stops the fluence changes too much: a number, and no verdict.
#[test]
fn verify_near_the_edges_there_is_no_verdict() {
    for point_cm in [[0.0, 5.6], [0.0, -5.6], [5.6, 0.0]] {
        let result = calculate(&plan(60.0, 0.0, point_cm));
        assert!(result.trace.is_some());
        assert!(
            result
                .obstacles
                .iter()
                .any(|obstacle| obstacle.kind == ObstacleKind::FieldEdge),
            "{:?}",
            result.obstacles
        );
    }
}

/// A measured factor beside the sweep: told when both agree, an obstacle when the model contradicts itself, and never a
/// correction.
#[test]
fn verify_a_measured_factor_never_corrects_the_sweep() {
    let plan = plan(60.0, 0.0, [0.0, 0.0]);
    let plain = calculate(&plan);
    let ours = input(&plain, "WF_eff");
    let with_factor = |factor: f64| {
        let mut machine = machine(JawAxis::Y);
        sweep_of(&mut machine).factor = Some(
            Grid::new(
                "6/wedge-E60.csv",
                ("depth_cm", vec![5.0, 20.0]),
                ("factor", vec![0.0]),
                vec![factor; 2],
                DepthInterpolation::Linear,
            )
            .unwrap(),
        );
        calculate_with(&plan, &machine)
    };
    let agreeing = with_factor(ours * 1.01);
    assert_close(
        verified_cgy_per_mu(&agreeing),
        verified_cgy_per_mu(&plain),
        0.0,
    );
    assert!(
        agreeing
            .remarks
            .iter()
            .any(|remark| remark.contains("wedge-E60.csv") && remark.contains("-1.0 %"))
    );
    let contrary = with_factor(ours * 1.05);
    assert_eq!(super::kinds(&contrary), [ObstacleKind::Model]);
    assert!(contrary.obstacles[0].message.contains("contradicts itself"));
    assert_close(
        contrary.trace.unwrap().dose_per_mu_cgy,
        verified_cgy_per_mu(&plain),
        0.0,
    );
}

/// A wedge of metal under the ID, and a model without a penumbra.
#[test]
fn verify_a_model_that_has_no_sweep_or_no_penumbra() {
    let (kind, message) = refused(|_, machine| {
        let wedges = &mut machine.beams[0].wedges;
        let tables: WedgeTables = wedges
            .iter()
            .find_map(|wedge| wedge.tables().cloned())
            .unwrap();
        wedges.last_mut().unwrap().body = WedgeBody::Fixed(tables);
    });
    assert_eq!(kind, ObstacleKind::Model, "{message}");
    assert!(
        message.contains("as a dynamic one (300A,00D3), the beam model as a fixed one"),
        "{message}"
    );
    let (kind, message) = refused(|_, machine| machine.beams[0].penumbra = None);
    assert_eq!(kind, ObstacleKind::Model, "{message}");
    assert!(message.contains("penumbra_sigma_cm"), "{message}");
}
