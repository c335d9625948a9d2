//! Control points take over what they do not state, attribute by attribute,
//! device by device and wedge by wedge; nothing unusable is bridged.

use counterfoil::plan::{Effect, NoteKind};
use counterfoil::quantity::Given;
use dicom_core::{DataElement, PrimitiveValue, Tag, VR};
use dicom_dictionary_std::tags;

use super::plans::wedge;
use super::{effects, read};
use crate::builder::{BeamSpec, DeviceSpec, PlanSpec, PointSpec};

const THIRD_POINT: [(Tag, usize); 2] =
    [(tags::BEAM_SEQUENCE, 0), (tags::CONTROL_POINT_SEQUENCE, 2)];

/// A value that control point `from` stated.
fn inherited<T>(value: T, from: usize) -> Given<T> {
    Given::Inherited {
        value,
        from_control_point: from,
    }
}

/// Four control points; each later one changes one thing.
fn stepping() -> PlanSpec {
    let mut beam = BeamSpec::default()
        .with_leaves(
            DeviceSpec::leaves("MLCX", 2, 1.0),
            vec![-1.0, -2.0, 3.0, 4.0],
        )
        .with_wedge(wedge(1))
        .with_wedge(wedge(2));
    beam.control_points.truncate(1);
    beam.control_points.push(PointSpec {
        weight: Some(0.25),
        gantry_deg: Some(90.0),
        positions_cm: vec![("ASYMX".to_owned(), vec![-1.0, 2.0])],
        wedges: vec![(2, false)],
        ..PointSpec::default()
    });
    beam.control_points.push(PointSpec {
        weight: Some(0.5),
        positions_cm: vec![("MLCX".to_owned(), vec![-0.5, -0.5, 0.5, 0.5])],
        ..PointSpec::default()
    });
    beam.control_points.push(PointSpec::at_weight(1.0));
    PlanSpec::default().map_beam(|_| beam)
}

#[test]
fn verify_each_attribute_and_device_inherits_by_itself() {
    let plan = read(&stepping());
    assert_eq!(plan.notes, []);
    let points = &plan.beams[0].control_points;
    assert_eq!(points[1].gantry_deg, Given::stated(90.0));
    assert_eq!(points[3].gantry_deg, inherited(90.0, 1));
    assert_eq!(points[3].collimator_deg, inherited(0.0, 0));
    assert_eq!(points[1].jaws_y_cm, inherited([-5.0, 5.0], 0));
    assert_eq!(points[2].jaws_x_cm, inherited([-1.0, 2.0], 1));
    assert_eq!(points[3].jaws_y_cm, inherited([-5.0, 5.0], 0));
    let leaves = |index: usize| points[index].leaves[0].positions_cm.clone();
    assert_eq!(leaves(1).value().unwrap().as_ref(), [-1.0, -2.0, 3.0, 4.0]);
    assert_eq!(leaves(2).standing(), "stated");
    assert_eq!(leaves(3).value().unwrap().as_ref(), [-0.5, -0.5, 0.5, 0.5]);
    assert!(matches!(
        leaves(3),
        Given::Inherited {
            from_control_point: 2,
            ..
        }
    ));
    assert_eq!(points[3].wedges[0].in_beam, inherited(true, 0));
    assert_eq!(points[3].wedges[1].in_beam, inherited(false, 1));
    // Weights are never taken over.
    assert_eq!(points[3].cumulative_weight, Given::stated(1.0));
}

#[test]
fn verify_an_unusable_value_is_not_bridged() {
    let bytes = stepping().with_text(&THIRD_POINT, tags::GANTRY_ANGLE, VR::DS, "9O");
    let plan = counterfoil::plan::read_plan(&bytes).expect("readable");
    let points = &plan.beams[0].control_points;
    assert_eq!(points[1].gantry_deg, Given::stated(90.0));
    assert_eq!(points[2].gantry_deg, Given::Absent);
    assert_eq!(points[3].gantry_deg, Given::Absent);
    let place = "BeamSequence[0].ControlPointSequence[2].GantryAngle (300A,011E)";
    assert_eq!(
        effects(&plan, NoteKind::MalformedValue, place),
        [Effect::BlocksScope]
    );
}

#[test]
fn verify_an_empty_value_is_no_value() {
    let bytes = stepping().edited(&THIRD_POINT, &|point| {
        point.put(DataElement::new(
            tags::ISOCENTER_POSITION,
            VR::DS,
            PrimitiveValue::Empty,
        ));
        point.put(DataElement::new(
            tags::GANTRY_ANGLE,
            VR::DS,
            PrimitiveValue::from("  "),
        ));
    });
    let plan = counterfoil::plan::read_plan(&bytes).expect("readable");
    let point = &plan.beams[0].control_points[2];
    assert_eq!(point.gantry_deg, inherited(90.0, 1));
    assert_eq!(point.isocentre.standing(), "inherited");
}
