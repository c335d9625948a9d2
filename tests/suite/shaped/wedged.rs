//! Wedges in fields that leaves shape: beside the factor formalism where both
//! hold, the weighted sum of a motorised wedge, and a wedge turned round.

use counterfoil::beam_model::{MachineModel, load_machine};
use counterfoil::dose::{FactorName, Method, StepLimits, Technique};
use counterfoil::plan::{ControlPoint, Plan, Wedge, WedgeKind, WedgePosition};
use counterfoil::quantity::{Given, Point};

use super::field::{calculate, cgy_per_mu};
use crate::dose::plain_plan;

fn rowan() -> MachineModel {
    let root = std::path::PathBuf::from(env!("CARGO_MANIFEST_DIR"));
    load_machine(&root.join("beam-models/rowan")).unwrap()
}

/// A 12 x 12 field of leaves (`inset_cm` inside the jaws) or of jaws alone, with a wedge.
fn plan(id: &str, kind: WedgeKind, orientation_deg: f64, leaves: Leaves) -> Plan {
    let machine = rowan();
    let mut plan = plain_plan();
    let beam = &mut plan.beams[0];
    beam.machine = Given::stated("ROWAN-1".to_owned());
    beam.wedges = vec![Wedge {
        number: Given::stated(1),
        kind: Given::stated(kind),
        id: Given::stated(id.to_owned()),
        angle_deg: Given::stated(if id == "W45" { 45.0 } else { 60.0 }),
        orientation_deg: Given::stated(orientation_deg),
        ..Wedge::default()
    }];
    let bank = &machine.collimation.leaf_banks[0];
    let pairs = bank.boundaries_cm.len() - 1;
    if leaves == Leaves::Inside {
        beam.devices.push(counterfoil::plan::LimitingDevice {
            kind: counterfoil::plan::DeviceKind::Mlcx { layer: 0 },
            pairs: Given::Absent,
            source_distance_cm: Given::Absent,
            boundaries_cm: Given::stated(bank.boundaries_cm.clone()),
        });
    }
    for point in &mut beam.control_points {
        point.jaws_x_cm = Given::stated([-6.0, 6.0]);
        point.jaws_y_cm = Given::stated([-6.0, 6.0]);
        put_wedge(point, true);
        if leaves == Leaves::Inside {
            // With the leaf-end offset the radiation edge is a hair inside the jaws.
            let half_cm = 5.998 - bank.leaf_end_offset_cm;
            let side = |sign: f64| std::iter::repeat_n(sign * half_cm, pairs);
            point.leaves = vec![counterfoil::plan::LeafPositions {
                kind: counterfoil::plan::DeviceKind::Mlcx { layer: 0 },
                positions_cm: Given::stated(side(-1.0).chain(side(1.0)).collect()),
            }];
        }
    }
    plan
}

#[derive(Clone, Copy, PartialEq)]
enum Leaves {
    None,
    Inside,
}

fn put_wedge(point: &mut ControlPoint, in_beam: bool) {
    point.wedges = vec![WedgePosition {
        wedge_number: Given::stated(1),
        in_beam: Given::stated(in_beam),
    }];
}

fn dose(plan: &Plan, method: Method) -> f64 {
    let calculation = calculate(plan, &rowan(), StepLimits::default());
    assert_eq!(calculation.technique, Technique::Wedge);
    assert_eq!(
        calculation.method,
        Some(method),
        "{:?}",
        calculation.obstacles
    );
    cgy_per_mu(&calculation)
}

/// On the axis a leaf-made square with a wedge is the jaw-made one, which is the factor formalism.
#[test]
fn validate_a_wedged_leaf_square_equals_the_factor_formalism() {
    for orientation_deg in [0.0, 90.0, 180.0, 270.0] {
        let leaves = dose(
            &plan("W45", WedgeKind::Standard, orientation_deg, Leaves::Inside),
            Method::ScatterIntegration,
        );
        let jaws = dose(
            &plan("W45", WedgeKind::Standard, orientation_deg, Leaves::None),
            Method::Factors,
        );
        let percent = 100.0 * (leaves / jaws - 1.0);
        assert!(percent.abs() < 0.2, "{orientation_deg} {percent}");
    }
}

/// A motorised wedge that is in for 30 % of the meterset: 0.3 of the wedged dose and 0.7 of the open one.
#[test]
fn verify_a_motorised_wedge_is_the_weighted_sum() {
    for leaves in [Leaves::None, Leaves::Inside] {
        let method = match leaves {
            Leaves::None => Method::Factors,
            Leaves::Inside => Method::ScatterIntegration,
        };
        let wedged = plan("M60", WedgeKind::Motorized, 90.0, leaves);
        let all = dose(&wedged, method);
        let calculation = calculate(&wedged, &rowan(), StepLimits::default());
        let trace = calculation.trace.unwrap();
        let wedge: f64 = trace
            .factors
            .iter()
            .filter(|factor| matches!(factor.name, FactorName::Wedge | FactorName::WedgeProfile))
            .map(|factor| factor.value)
            .product();
        let open = all / wedge;
        let mut part = wedged.clone();
        let points = &mut part.beams[0].control_points;
        let first = points[0].clone();
        let at = |weight: f64, in_beam: bool| {
            let mut point = first.clone();
            point.cumulative_weight = Given::stated(weight);
            put_wedge(&mut point, in_beam);
            point
        };
        *points = vec![at(0.0, true), at(0.3, true), at(0.3, false), at(1.0, false)];
        let found = dose(&part, method);
        let expected = 0.3 * all + 0.7 * open;
        assert!((found / expected - 1.0).abs() < 1e-9, "{found} {expected}");
    }
}

/// A point 3 cm towards the thin end gets more than the same point with the wedge turned round, by the profile's ratio and
/// a little less, since scatter follows the whole field.
#[test]
fn verify_a_wedge_turned_round_shows_off_the_axis() {
    let at = |orientation_deg: f64| {
        let mut plan = plan("W45", WedgeKind::Standard, orientation_deg, Leaves::Inside);
        // y_b = 3 cm at gantry 0, head first supine: 3 cm towards the head; the thin end at orientation 0.
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(1.0, -2.0, 33.0));
        dose(&plan, Method::ScatterIntegration)
    };
    let machine = rowan();
    let tables = machine.beams[0].wedge("W45").unwrap().tables().unwrap();
    let profile = |position_cm| tables.profile(position_cm).unwrap().value;
    let ratio = at(0.0) / at(180.0);
    let by_profile = profile(3.0) / profile(-3.0);
    assert!(
        ratio > 1.05 && ratio < by_profile && ratio > by_profile * 0.93,
        "{ratio} {by_profile}"
    );
}
