//! Wedges: hand-worked factors, where the thin end lies, shares of the meterset,
//! and everything about a wedge that keeps a number from being a verification.

use counterfoil::beam_model::{
    DepthInterpolation, Grid, JawAxis, MachineModel, WedgeBody, WedgeModel, WedgeSweep, WedgeTables,
};
use counterfoil::dose::{
    BeamCalculation, FactorName, FieldModel, FieldWedge, Method, ObstacleKind, PlacedWedge,
    Technique, Typed, dose_per_mu,
};
use counterfoil::plan::{Block, ControlPoint, Plan, Wedge, WedgeKind, WedgePosition};
use counterfoil::quantity::{Given, Point};
use proptest::prelude::*;

use super::worked_examples::tg71_field;
use super::{
    assert_close, assert_says, calculate_with, kinds, plain_plan, tg71, verified_cgy_per_mu,
};

/// The wedge factor at 2 cm and 3 cm off the axis, 10 cm deep: along the ray 10 * sqrt(1 + 13/100^2) = 10.006498 cm, so
/// 0.42 + 0.04 * 0.006498/10.
const FACTOR: f64 = 0.420_025_992;

/// Factor 0.40 to 0.46, easy by hand: 0.42 at 10 cm and side 10. Profile 0.5, 1, 2 at -10, 0, 10 cm, straight between.
fn tables() -> WedgeTables {
    WedgeTables {
        factor: Grid::new(
            "6/wedge-T.csv",
            ("depth_cm", vec![5.0, 15.0]),
            ("side_cm", vec![10.0, 20.0]),
            vec![0.40, 0.42, 0.44, 0.46],
            DepthInterpolation::Linear,
        )
        .unwrap(),
        profile: Grid::new(
            "6/wedge-T-profile.csv",
            ("position_cm", vec![-10.0, 0.0, 10.0]),
            ("ratio", vec![0.0]),
            vec![0.5, 1.0, 2.0],
            DepthInterpolation::Linear,
        )
        .unwrap(),
    }
}

fn wedge_model(id: &str, angle_deg: f64, body: WedgeBody) -> WedgeModel {
    WedgeModel {
        id: id.to_owned(),
        further_ids: Vec::new(),
        angle_deg,
        body,
    }
}

/// The TG-71 TPR model with three invented wedges: F45 fixed, M60 motorised, D60 dynamic.
fn machine() -> MachineModel {
    let mut machine = tg71("tg71-tpr");
    let sweep = WedgeSweep {
        moves_along: JawAxis::Y,
        closing_gap_cm: 0.5,
        delivered: Grid::new(
            "6/wedge-D-segments.csv",
            ("position_cm", vec![-20.0, 10.0]),
            ("cumulative_meterset", vec![0.0]),
            vec![0.1, 1.0],
            DepthInterpolation::Linear,
        )
        .unwrap(),
        factor: None,
    };
    machine.beams[0].wedges = vec![
        wedge_model("F45", 45.0, WedgeBody::Fixed(tables())),
        wedge_model("M60", 60.0, WedgeBody::Motorised(tables())),
        wedge_model("D60", 60.0, WedgeBody::Dynamic(sweep)),
    ];
    machine
}

fn planned(id: &str, kind: WedgeKind, angle_deg: f64, orientation_deg: f64) -> Wedge {
    Wedge {
        number: Given::stated(1),
        kind: Given::stated(kind),
        id: Given::stated(id.to_owned()),
        angle_deg: Given::stated(angle_deg),
        orientation_deg: Given::stated(orientation_deg),
        // The planning system's own word, and a wrong one: it must never be used.
        factor: Given::stated(0.9),
        ..Wedge::default()
    }
}

fn f45(orientation_deg: f64) -> Wedge {
    planned("F45", WedgeKind::Standard, 45.0, orientation_deg)
}

fn m60(orientation_deg: f64) -> Wedge {
    planned("M60", WedgeKind::Motorized, 60.0, orientation_deg)
}

fn positions(plan: &Plan, in_beam: bool) -> Vec<WedgePosition> {
    let wedges = plan.beams[0].wedges.iter();
    wedges
        .map(|wedge| WedgePosition {
            wedge_number: wedge.number.clone(),
            in_beam: Given::stated(in_beam),
        })
        .collect()
}

/// The plain plan with a wedge in all the time, the dose point this far from the isocentre: to the patient's left and
/// towards the head, both in the isocentre plane.
fn wedged(wedge: Wedge, [left_cm, head_cm]: [f64; 2]) -> Plan {
    let mut plan = plain_plan();
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0 + left_cm, -2.0, 30.0 + head_cm));
    plan.beams[0].wedges.push(wedge);
    let positions = positions(&plan, true);
    for point in &mut plan.beams[0].control_points {
        point.wedges.clone_from(&positions);
    }
    plan
}

/// The same plan with the wedge out all the time.
fn open(mut plan: Plan) -> Plan {
    let positions = positions(&plan, false);
    for point in &mut plan.beams[0].control_points {
        point.wedges.clone_from(&positions);
    }
    plan
}

/// The wedge in for the first share of the meterset, moved out without dose.
fn in_for_share(mut plan: Plan, share: f64) -> Plan {
    let (inside, outside) = (positions(&plan, true), positions(&plan, false));
    let point = plan.beams[0].control_points[0].clone();
    plan.beams[0].control_points = [(0.0, true), (share, true), (share, false), (1.0, false)]
        .map(|(weight, is_in)| ControlPoint {
            cumulative_weight: Given::stated(weight),
            wedges: if is_in { &inside } else { &outside }.clone(),
            ..point.clone()
        })
        .into();
    plan
}

fn calculate(plan: &Plan) -> BeamCalculation {
    calculate_with(plan, &machine())
}

/// Dose with the wedge over dose without it.
fn ratio(plan: &Plan) -> f64 {
    let result = calculate(plan);
    assert_eq!(result.technique, Technique::Wedge);
    assert_eq!(result.method, Some(Method::Factors));
    verified_cgy_per_mu(&result) / verified_cgy_per_mu(&calculate(&open(plan.clone())))
}

/// The TG-71 data set as in the worked example with a typed wedge factor: isocentric 15 x 15, 12 cm deep, 200 cGy, tray 0.97.
/// Here the factor comes from a model: 0.40 + 0.04 * 7/10 at side 10, 0.42 + 0.04 * 7/10 at 20: 0.428 and 0.448, so 0.438 at 15.
/// Sc 1.016, Sp 1.044, TPR 0.936 as there: 200 / (0.8 * 1.016 * 1.044 * 0.936 * 0.438 * 0.97) = 592.685. With 0.70 it is 370.852.
#[test]
fn verify_tg71_tables_isocentric_with_a_wedge_of_the_model() {
    let machine = machine();
    let model = FieldModel {
        beam: &machine.beams[0],
        upper_jaws: machine.upper_jaws,
    };
    let mut field = tg71_field(
        model,
        [15.0, 15.0],
        100.0,
        12.0,
        counterfoil::dose::Form::Isocentric,
    );
    field.typed = vec![(FactorName::Tray, Typed::new(0.97))];
    field.wedge = PlacedWedge::new(&machine.beams[0].wedges[0], 0.0).map(|placed| FieldWedge {
        placed,
        share_in: 1.0,
        index: 0,
    });
    let trace = dose_per_mu(&field).unwrap();
    assert_close(trace.factor(FactorName::Wedge).unwrap().value, 0.438, 1e-12);
    assert_close(
        trace.factor(FactorName::WedgeProfile).unwrap().value,
        1.0,
        0.0,
    );
    assert_close(200.0 / trace.dose_per_mu_cgy, 592.685, 5e-4);
    // A factor typed by hand takes the place of the model's, profile and all.
    field.typed.push((FactorName::Wedge, Typed::new(0.70)));
    let typed = dose_per_mu(&field).unwrap();
    assert_close(200.0 / typed.dose_per_mu_cgy, 370.852, 5e-4);
    assert!(typed.factor(FactorName::WedgeProfile).is_none());
}

/// A plan, the point on the axis: 0.8 cGy/MU under reference conditions times 0.42; the plan's own 0.9 is not looked at.
#[test]
fn verify_a_fixed_wedge_on_the_axis_and_that_it_cannot_be_seen_reversed_there() {
    let plan = wedged(f45(0.0), [0.0, 0.0]);
    let result = calculate(&plan);
    assert_close(verified_cgy_per_mu(&result), 0.8 * 0.42, 1e-12);
    let reversed = calculate(&wedged(f45(180.0), [0.0, 0.0]));
    assert_close(verified_cgy_per_mu(&reversed), 0.8 * 0.42, 1e-12);
    assert!(
        result
            .remarks
            .iter()
            .any(|remark| remark.contains("turned round") && remark.contains("does not show it")),
        "{:?}",
        result.remarks
    );
    // What the wedge adds: 0.3 % (transmissions of the test model); the profile falls by 0.05 and rises by 0.1 for each cm around
    // the axis: (ln 1.05 - ln 0.975)/1 cm = 7.411 % per cm * 0.1 cm; nothing for the profile where it is 1.
    let spread = result.spread.unwrap();
    let term = |name: &str| spread.terms.iter().find(|term| term.name == name);
    let transmission_percent = machine().beams[0].uncertainty.transmission_percent;
    assert_close(
        term("wedge factor").unwrap().percent,
        transmission_percent,
        1e-12,
    );
    let per_cm = 100.0 * (1.05_f64 / 0.975).ln();
    assert_close(term("wedge position").unwrap().percent, 0.1 * per_cm, 1e-9);
    assert!(term("wedge profile").is_none());
}

/// The point 2 cm to the patient's left and 3 cm towards the head of a supine patient, gantry and collimator at 0: x = 2 and
/// y = 3 in the collimator. Thin end towards the head (orientation 0): 3 cm towards it, 1 + 0.1 * 3 = 1.3. Towards
/// the patient's right, -x (90): 2 cm towards the thick end, 1 - 0.05 * 2 = 0.9. Towards the feet (180): 3 cm towards the thick
/// end, 0.85. Towards the left (270): 1.2. `FACTOR` each time.
#[test]
fn verify_where_the_thin_end_lies_for_the_four_orientations() {
    for (orientation_deg, profile) in [
        (0.0, 1.3),
        (90.0, 0.9),
        (180.0, 0.85),
        (270.0, 1.2),
        (-90.0, 1.2),
        (450.0, 0.9),
    ] {
        let plan = wedged(f45(orientation_deg), [2.0, 3.0]);
        assert_close(ratio(&plan), FACTOR * profile, 1e-9);
    }
    // 30 degrees, counter-clockwise seen from the source: towards (-sin 30, cos 30): 3 * 0.866025 - 2 * 0.5 = 1.598076 cm.
    assert_close(
        ratio(&wedged(f45(30.0), [2.0, 3.0])),
        FACTOR * 1.159_807_6,
        1e-8,
    );
}

/// The wedge turns with the collimator. Collimator at 90, wedge at 0: the thin end, towards the head at collimator 0, is turned
/// counter-clockwise seen from the source above the supine patient, to the patient's right. The point 2 cm to the left
/// therefore lies 2 cm towards the thick end: 0.9. At 270 it is the other way: 1.2. Wedge at 90 with the collimator at 270
/// comes back to the head: 1.3.
#[test]
fn verify_the_wedge_turns_with_the_collimator() {
    for (collimator_deg, orientation_deg, profile) in [
        (90.0, 0.0, 0.9),
        (270.0, 0.0, 1.2),
        (180.0, 0.0, 0.85),
        (270.0, 90.0, 1.3),
    ] {
        let mut plan = wedged(f45(orientation_deg), [2.0, 3.0]);
        for point in &mut plan.beams[0].control_points {
            point.collimator_deg = Given::stated(collimator_deg);
        }
        assert_close(ratio(&plan), FACTOR * profile, 1e-9);
    }
}

/// Thin end on the wrong side: 1.3 where 0.85 is right, as the profile says.
#[test]
fn verify_a_reversed_wedge_is_visible_off_the_axis() {
    let right = wedged(f45(180.0), [2.0, 3.0]);
    let turned = wedged(f45(0.0), [2.0, 3.0]);
    assert_close(ratio(&turned) / ratio(&right), 1.3 / 0.85, 1e-9);
    let says = |plan: &Plan| {
        let remarks = calculate(plan).remarks;
        remarks.iter().any(|remark| remark.contains("turned round"))
    };
    assert!(!says(&turned));
    // 0.2 cm off: 1.02 against 0.99, which is 2.9 % less and may pass.
    assert!(says(&wedged(f45(0.0), [0.0, 0.2])));
    // 3 cm off across the wedge is on its axis.
    assert!(says(&wedged(f45(90.0), [0.0, 3.0])));
}

/// In for a quarter of the meterset, thin end towards the head, the point 3 cm that way:
/// 0.25 * `FACTOR` * 1.3 + 0.75 = 0.886508.
#[test]
fn verify_a_motorised_wedge_by_hand() {
    let plan = in_for_share(wedged(m60(0.0), [2.0, 3.0]), 0.25);
    assert_close(ratio(&plan), 0.25 * FACTOR * 1.3 + 0.75, 1e-9);
    let trace = calculate(&plan).trace.unwrap();
    let factor = trace.factor(FactorName::Wedge).unwrap();
    // All that is needed to do it again by hand.
    for part in [
        "0.25 * 0.42 * 1.3 + 0.75",
        "wedge-T.csv",
        "wedge-T-profile.csv",
        "orientation 0 degrees",
    ] {
        assert!(
            factor.source.contains(part),
            "`{part}` is not in {}",
            factor.source
        );
    }
    assert!(trace.factor(FactorName::WedgeProfile).is_none());
    // In for all of it is the wedge as such.
    assert_close(ratio(&wedged(m60(0.0), [2.0, 3.0])), FACTOR * 1.3, 1e-9);
    // A smaller angle stated for the whole beam is told and changes nothing.
    let mut stated = plan;
    stated.beams[0].wedges[0].angle_deg = Given::stated(20.0);
    assert_close(ratio(&stated), 0.25 * FACTOR * 1.3 + 0.75, 1e-9);
    assert!(
        calculate(&stated)
            .remarks
            .iter()
            .any(|remark| remark.contains("20 degrees"))
    );
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 64, failure_persistence: None, ..ProptestConfig::default() })]

    /// In for a share: the weighted sum of the doses with the wedge and without.
    #[test]
    fn property_a_motorised_wedge_is_the_weighted_sum(
        share in 0.02_f64..0.98,
        left_cm in -3.0_f64..3.0,
        head_cm in -3.0_f64..3.0,
        orientation_deg in 0.0_f64..360.0,
    ) {
        let plan = wedged(m60(orientation_deg), [left_cm, head_cm]);
        let dose = |plan: &Plan| calculate(plan).trace.unwrap().dose_per_mu_cgy;
        let (inside, outside) = (dose(&plan), dose(&open(plan.clone())));
        let found = dose(&in_for_share(plan, share));
        let wanted = share * inside + (1.0 - share) * outside;
        prop_assert!((found / wanted - 1.0).abs() < 1e-9, "{found} {wanted}");
    }

    /// Collimator and wedge turned against each other leave the wedge where it was; a square field does not matter.
    #[test]
    fn property_quarter_turns_against_each_other_change_nothing(
        left_cm in -3.0_f64..3.0,
        head_cm in -3.0_f64..3.0,
        quarter in 0_i32..4,
        orientation_deg in 0.0_f64..360.0,
    ) {
        let turn_deg = 90.0 * f64::from(quarter);
        let mut turned = wedged(f45(orientation_deg - turn_deg), [left_cm, head_cm]);
        for point in &mut turned.beams[0].control_points {
            point.collimator_deg = Given::stated(turn_deg);
        }
        let dose = |plan: &Plan| calculate(plan).trace.unwrap().dose_per_mu_cgy;
        let plain = dose(&wedged(f45(orientation_deg), [left_cm, head_cm]));
        prop_assert!((dose(&turned) / plain - 1.0).abs() < 1e-9);
    }
}

/// The obstacle that a change calls up; there must be no number with it.
fn refused(change: impl FnOnce(&mut Plan)) -> (ObstacleKind, String) {
    let mut plan = wedged(f45(0.0), [0.0, 0.0]);
    change(&mut plan);
    let result = calculate(&plan);
    assert_eq!(result.technique, Technique::Wedge);
    assert!(result.trace.is_none(), "{:?}", result.obstacles);
    assert_eq!(result.obstacles.len(), 1, "{:?}", result.obstacles);
    (
        result.obstacles[0].kind,
        result.obstacles[0].message.clone(),
    )
}

fn first_wedge(plan: &mut Plan) -> &mut Wedge {
    &mut plan.beams[0].wedges[0]
}

#[test]
fn verify_what_is_not_known_of_a_wedge_is_named_and_gives_no_number() {
    type Case = (fn(&mut Plan), ObstacleKind, &'static [&'static str]);
    let cases: [Case; 12] = [
        (
            |plan| first_wedge(plan).id = Given::stated("W99".to_owned()),
            ObstacleKind::Model,
            &["\"W99\"", "known wedges: F45, M60, D60"],
        ),
        (
            |plan| first_wedge(plan).id = Given::Absent,
            ObstacleKind::Reading,
            &["Wedge ID (300A,00D4)"],
        ),
        (
            |plan| first_wedge(plan).orientation_deg = Given::Absent,
            ObstacleKind::Reading,
            &["Wedge Orientation (300A,00D8)", "thin end"],
        ),
        (
            |plan| first_wedge(plan).kind = Given::Absent,
            ObstacleKind::Reading,
            &["Wedge Type (300A,00D3)"],
        ),
        (
            |plan| first_wedge(plan).kind = Given::stated(WedgeKind::Motorized),
            ObstacleKind::Model,
            &["as a motorised one", "the beam model as a fixed one"],
        ),
        (
            |plan| first_wedge(plan).kind = Given::stated(WedgeKind::PartialStandard),
            ObstacleKind::Technique,
            &["partial"],
        ),
        (
            |plan| first_wedge(plan).angle_deg = Given::stated(30.0),
            ObstacleKind::Model,
            &["30 degrees", "the beam model 45"],
        ),
        (
            |plan| {
                for point in &mut plan.beams[0].control_points {
                    point.wedges[0].in_beam = Given::Absent;
                }
            },
            ObstacleKind::Reading,
            &["Wedge Position (300A,0118)", "not given"],
        ),
        (
            |plan| plan.beams[0].control_points[1].wedges[0].in_beam = Given::stated(false),
            ObstacleKind::Reading,
            &["in at control point 0 and out at 1", "for how much of it"],
        ),
        (
            |plan| {
                plan.beams[0].wedges.push(Wedge {
                    number: Given::stated(2),
                    ..m60(90.0)
                });
                let both = positions(plan, true);
                for point in &mut plan.beams[0].control_points {
                    point.wedges.clone_from(&both);
                }
            },
            ObstacleKind::Technique,
            &["\"F45\"", "\"M60\"", "more than one wedge"],
        ),
        (
            |plan| *plan = in_for_share(plan.clone(), 0.5),
            ObstacleKind::Technique,
            &["STANDARD", "for 50 % of the meterset only"],
        ),
        (
            |plan| plan.beams[0].blocks.push(Block::default()),
            ObstacleKind::Reading,
            &["Block Data (300A,0106)"],
        ),
    ];
    for (change, kind, parts) in cases {
        assert_says(refused(change), kind, parts);
    }
}

#[test]
fn verify_a_second_wedge_that_stays_out_does_not_matter() {
    let mut plan = wedged(f45(0.0), [2.0, 3.0]);
    plan.beams[0].wedges.push(Wedge {
        number: Given::stated(2),
        ..m60(90.0)
    });
    for point in &mut plan.beams[0].control_points {
        point.wedges.push(WedgePosition {
            wedge_number: Given::stated(2),
            in_beam: Given::stated(false),
        });
    }
    assert_close(ratio(&plan), FACTOR * 1.3, 1e-9);
}

#[test]
fn verify_a_model_without_wedges_and_no_model_never_give_an_open_field() {
    let plan = wedged(f45(0.0), [0.0, 0.0]);
    let result = calculate_with(&plan, &tg71("tg71-tpr"));
    assert!(result.trace.is_none());
    assert_eq!(kinds(&result), [ObstacleKind::Model]);
    assert!(result.obstacles[0].message.contains("known wedges: none"));
}

#[test]
fn verify_nothing_is_looked_up_beyond_the_wedge_tables() {
    // Side 8 and depth 10: the factor table begins at side 10.
    let mut plan = wedged(f45(0.0), [0.0, 0.0]);
    for point in &mut plan.beams[0].control_points {
        point.jaws_x_cm = Given::stated([-4.0, 4.0]);
        point.jaws_y_cm = Given::stated([-4.0, 4.0]);
    }
    let result = calculate(&plan);
    assert!(result.trace.is_none());
    assert_eq!(kinds(&result), [ObstacleKind::TableRange]);
    assert!(
        result.obstacles[0]
            .message
            .contains("wedge factor: side_cm 8.00"),
        "{:?}",
        result.obstacles
    );
}

/// 10 cm towards the thin end of a field of 26 x 26 the fluence is twice that on the axis. 6 MV, 10 cm deep: about a fifth of the dose
/// is scatter, which follows the fluence less: 0.3 * 0.25 * ln 2 = 5 %, beyond the limit of 3 %. The number is shown.
#[test]
fn verify_far_along_a_steep_wedge_is_outside_the_method() {
    let mut plan = wedged(f45(0.0), [0.0, 10.0]);
    for point in &mut plan.beams[0].control_points {
        point.jaws_x_cm = Given::stated([-10.0, 10.0]);
        point.jaws_y_cm = Given::stated([-13.0, 13.0]);
    }
    // The factor table ends at side 20; 2 * 20 * 26 / 46 = 22.6.
    let mut machine = machine();
    let grid = Grid::new(
        "6/wedge-T.csv",
        ("depth_cm", vec![5.0, 15.0]),
        ("factor", vec![0.0]),
        vec![0.40, 0.44],
        DepthInterpolation::Linear,
    );
    machine.beams[0].wedges[0].body = WedgeBody::Fixed(WedgeTables {
        factor: grid.unwrap(),
        ..tables()
    });
    let result = calculate_with(&plan, &machine);
    assert!(result.trace.is_some());
    assert_eq!(
        kinds(&result),
        [ObstacleKind::TableRange],
        "{:?}",
        result.obstacles
    );
    assert!(result.obstacles[0].message.contains("fluence profile"));
}

/// A depth-dose table, once by its own form and once by way of TPR: the wedge is the same in both.
#[test]
fn property_both_forms_have_the_same_wedge() {
    let mut machine = tg71("tg71-pdd");
    machine.beams[0].wedges = self::machine().beams[0].wedges.clone();
    let mut plan = wedged(f45(0.0), [2.0, 3.0]);
    let isocentric = calculate_with(&plan, &machine).trace.unwrap();
    assert!(isocentric.factor(FactorName::TissuePhantomRatio).is_some());
    plan.patient_setups[0].technique = Given::stated("FIXED_SSD".to_owned());
    let fixed = calculate_with(&plan, &machine).trace.unwrap();
    assert!(fixed.factor(FactorName::PercentDepthDose).is_some());
    for name in [FactorName::Wedge, FactorName::WedgeProfile] {
        let of = |trace: &counterfoil::dose::Trace| trace.factor(name).unwrap().value;
        assert_close(of(&fixed), of(&isocentric), 1e-12);
    }
    assert_close(fixed.dose_per_mu_cgy, isocentric.dose_per_mu_cgy, 1e-9);
}
