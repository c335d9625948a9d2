//! The calculation of a beam: published worked examples, geometry by an
//! independent composition of rotations, invariants, and plans with one thing wrong.

mod geometry;
mod guards;
mod moving_plans;
mod plans;
mod properties;
mod shaped_model;
mod shaped_plans;
mod swept_wedges;
mod wedges;
mod worked_examples;

use std::path::PathBuf;

use counterfoil::beam_model::{MachineModel, load_machine};
use counterfoil::dose::{
    BeamCalculation, BeamRequest, ModelAnswer, ObstacleKind, StepLimits, calculate_beam,
};
use counterfoil::plan::{
    Beam, ControlPoint, DeliveryType, DeviceKind, FractionGroup, LimitingDevice, PatientPosition,
    PatientSetup, Plan, RadiationType, ReferencedBeam,
};
use counterfoil::quantity::{Given, Point};
use counterfoil::settings::Site;

/// The TG-71 6 MV data set as a model: `tg71-tpr` or `tg71-pdd`.
fn tg71(name: &str) -> MachineModel {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR"))
        .join("tests/data/models")
        .join(name);
    load_machine(&folder).unwrap()
}

/// A plan of one static 6 MV beam, 10 cm x 10 cm, SAD 100, gantry 0, 100 MU, head first supine,
/// SSD 90, the dose point at the isocentre: 10 cm deep.
pub(crate) fn plain_plan() -> Plan {
    let start = ControlPoint {
        index: Given::stated(0),
        cumulative_weight: Given::stated(0.0),
        energy: Given::stated(6.0),
        gantry_deg: Given::stated(0.0),
        collimator_deg: Given::stated(0.0),
        couch_deg: Given::stated(0.0),
        isocentre: Given::stated(Point::new(1.0, -2.0, 30.0)),
        ssd_cm: Given::stated(90.0),
        jaws_x_cm: Given::stated([-5.0, 5.0]),
        jaws_y_cm: Given::stated([-5.0, 5.0]),
        ..ControlPoint::default()
    };
    let end = ControlPoint {
        index: Given::stated(1),
        cumulative_weight: Given::stated(1.0),
        ..start.clone()
    };
    let mut beam = Beam {
        number: Given::stated(1),
        name: Given::stated("AP".to_owned()),
        radiation: Given::stated(RadiationType::Photon),
        machine: Given::stated("TG71-TPR".to_owned()),
        dosimeter_unit: Given::stated("MU".to_owned()),
        sad_cm: Given::stated(100.0),
        delivery: Given::stated(DeliveryType::Treatment),
        final_cumulative_weight: Given::stated(1.0),
        patient_setup_number: Given::stated(1),
        devices: [DeviceKind::AsymX, DeviceKind::AsymY]
            .map(|kind| LimitingDevice {
                kind,
                pairs: Given::stated(1),
                source_distance_cm: Given::Absent,
                boundaries_cm: Given::Absent,
            })
            .into(),
        control_points: vec![start, end],
        ..Beam::default()
    };
    beam.energy.nominal = Given::stated(6.0);
    beam.energy.fluence_mode = Given::stated("STANDARD".to_owned());
    Plan {
        patient_setups: vec![PatientSetup {
            number: Given::stated(1),
            position: Given::stated(PatientPosition::HeadFirstSupine),
            technique: Given::stated("ISOCENTRIC".to_owned()),
            ..PatientSetup::default()
        }],
        fraction_groups: vec![FractionGroup {
            number: Given::stated(1),
            fractions_planned: Given::stated(20),
            beams: vec![ReferencedBeam {
                beam_number: Given::stated(1),
                meterset_mu: Given::stated(100.0),
                beam_dose_gy: Given::stated(0.8),
                specification_point: Given::stated(Point::new(1.0, -2.0, 30.0)),
                ..ReferencedBeam::default()
            }],
            ..FractionGroup::default()
        }],
        beams: vec![beam],
        ..Plan::default()
    }
}

/// The plain plan with one change.
fn plan_with(change: impl FnOnce(&mut Plan)) -> Plan {
    let mut plan = plain_plan();
    change(&mut plan);
    plan
}

/// The plain plan with one change at every control point.
fn plan_with_points(change: impl Fn(&mut ControlPoint)) -> Plan {
    plan_with(|plan| plan.beams[0].control_points.iter_mut().for_each(change))
}

/// The plan's first beam in its first group, with a model.
fn calculate_with(plan: &Plan, machine: &MachineModel) -> BeamCalculation {
    calculate_beam(&BeamRequest {
        plan,
        beam_index: 0,
        group: Some((0, 0)),
        model: ModelAnswer::Found(machine),
        site: &Site::default(),
        depth_row: None,
        steps: StepLimits::default(),
    })
}

/// The plan's first beam in its first group, with the TG-71 TPR model.
fn calculate(plan: &Plan) -> BeamCalculation {
    calculate_with(plan, &tg71("tg71-tpr"))
}

fn kinds(calculation: &BeamCalculation) -> Vec<ObstacleKind> {
    calculation
        .obstacles
        .iter()
        .map(|obstacle| obstacle.kind)
        .collect()
}

/// Dose per MU of a result that no obstacle stands against.
fn verified_cgy_per_mu(calculation: &BeamCalculation) -> f64 {
    assert_eq!(calculation.obstacles, [], "{:?}", calculation.obstacles);
    calculation.trace.as_ref().unwrap().dose_per_mu_cgy
}

/// An obstacle's kind and message, and what the message must name.
fn assert_says((found, message): (ObstacleKind, String), kind: ObstacleKind, parts: &[&str]) {
    assert_eq!(found, kind, "{message}");
    for part in parts {
        assert!(message.contains(part), "`{part}` is not in: {message}");
    }
}

fn assert_close(found: f64, wanted: f64, within: f64) {
    assert!(
        (found - wanted).abs() <= within,
        "found {found}, wanted {wanted} within {within}"
    );
}
