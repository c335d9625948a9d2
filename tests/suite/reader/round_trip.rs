//! What a specification says comes back from the bytes, in every encoding.
//! Expected values are those typed into the specification, in cm, Gy, MU.

use counterfoil::plan::{
    BlockType, DeviceKind, DoseMeaning, DoseType, NoteKind, PatientPosition, Plan, PointDepthPlace,
    RadiationType, WedgeKind, read_plan,
};
use counterfoil::quantity::{Given, Point};

use super::plans::{big_arcs, everything};
use super::{blocked, read};
use crate::builder::{Encoding, PlanSpec};

fn stated<T>(value: T) -> Given<T> {
    Given::stated(value)
}

#[test]
fn verify_default_plan_comes_back() {
    let plan = read(&PlanSpec::default());
    assert_eq!(plan.notes, [], "a plain plan needs no note");
    assert_eq!(plan.identity.plan_label, stated("STATIC".to_owned()));
    assert_eq!(plan.identity.patient_id, stated("INV-001".to_owned()));
    assert_eq!(
        plan.identity.sop_instance_uid,
        stated("2.25.20240105.1".to_owned())
    );
    assert_eq!(plan.identity.structure_set_uids, ["2.25.20240105.5"]);
    assert_eq!(plan.identity.approval.status, stated("APPROVED".to_owned()));
    assert_eq!(
        plan.patient_setups[0].position,
        stated(PatientPosition::HeadFirstSupine)
    );
    let dose = &plan.dose_references[0];
    assert_eq!(dose.target_prescription_dose_gy, stated(30.0));
    assert_eq!(dose.point, stated(Point::origin()));
    let group = &plan.fraction_groups[0];
    assert_eq!(group.fractions_planned, stated(30));
    assert_eq!(group.beams[0].meterset_mu, stated(100.0));
    assert_eq!(group.beams[0].beam_dose_gy, stated(1.0));
    assert_eq!(group.beams[0].specification_point, stated(Point::origin()));
    let beam = &plan.beams[0];
    assert_eq!(beam.radiation, stated(RadiationType::Photon));
    assert_eq!(beam.machine, stated("Alder".to_owned()));
    assert_eq!(beam.sad_cm, stated(100.0));
    assert_eq!(beam.energy.label().as_deref(), Some("6"));
    assert_eq!(beam.devices.len(), 2);
    assert_eq!(beam.devices[0].kind, DeviceKind::AsymX);
    assert_eq!(beam.devices[0].source_distance_cm, stated(40.0));
    let first = &beam.control_points[0];
    assert_eq!(first.jaws_x_cm, stated([-5.0, 5.0]));
    assert_eq!(first.ssd_cm, stated(90.0));
    assert_eq!(first.isocentre, stated(Point::origin()));
}

#[test]
fn verify_every_attribute_comes_back() {
    let plan = read(&everything());
    let beam = &plan.beams[0];
    assert_eq!(beam.number, stated(7));
    assert_eq!(beam.description, stated("All of it".to_owned()));
    let first = &beam.control_points[0];
    assert_eq!(first.jaws_x_cm, stated([-4.0, 6.25]));
    assert_eq!(first.jaws_y_cm, stated([-7.5, 5.0]));
    assert_eq!(first.gantry_deg, stated(271.5));
    assert_eq!(first.collimator_deg, stated(15.0));
    assert_eq!(first.couch_deg, stated(350.0));
    assert_eq!(first.couch_pitch_deg, stated(1.5));
    assert_eq!(first.couch_roll_deg, stated(-0.5));
    assert_eq!(first.couch_vertical_cm, stated(-12.5));
    assert_eq!(first.couch_longitudinal_cm, stated(100.0));
    assert_eq!(first.couch_lateral_cm, stated(2.0));
    assert_eq!(first.isocentre, stated(Point::new(1.25, -20.5, 33.1)));
    assert_eq!(first.surface_entry, stated(Point::new(1.25, -30.5, 33.1)));
    assert_eq!(first.source_to_external_contour_cm, stated(88.5));
    let depths = first.referenced_doses[0].point_depth.as_ref().unwrap();
    assert_eq!(depths.depth_cm, stated(9.75));
    assert_eq!(depths.place, PointDepthPlace::ControlPoint);

    let bank = &beam.devices[2];
    assert_eq!(bank.kind, DeviceKind::Mlcx { layer: 0 });
    assert_eq!(bank.pairs, stated(20));
    let boundaries = bank.boundaries_cm.value().unwrap();
    assert_eq!(boundaries.len(), 21);
    assert_eq!((boundaries[0], boundaries[20]), (-10.0, 10.0));
    let leaves = first.leaves[0].positions_cm.value().unwrap();
    assert_eq!(leaves.len(), 40);
    assert_eq!((leaves[19], leaves[20]), (-3.0, 3.5));

    let wedge = &beam.wedges[0];
    assert_eq!(wedge.number, stated(3));
    assert_eq!(wedge.kind, stated(WedgeKind::Standard));
    assert_eq!(wedge.angle_deg, stated(30.0));
    assert_eq!(wedge.factor, stated(0.5432));
    assert_eq!(wedge.orientation_deg, stated(90.0));
    assert_eq!(wedge.source_to_tray_cm, stated(58.5));
    assert_eq!(first.wedges[0].in_beam, stated(true));

    let block = &beam.blocks[0];
    assert_eq!(block.block_type, stated(BlockType::Shielding));
    assert_eq!(block.divergent, stated(true));
    assert_eq!(block.thickness_cm, stated(8.0));
    assert_eq!(block.transmission, stated(0.03));
    assert_eq!(block.source_to_tray_cm, stated(65.4));
    assert_eq!(
        block.outline_cm,
        stated([[2.0, 2.0], [4.0, 2.0], [4.0, 4.0], [2.0, 4.0]].into())
    );
    assert_eq!(beam.total_block_tray_factor, stated(0.97));
    assert_eq!(beam.boluses[0].roi_number, stated(12));
    assert_eq!(beam.accessories[0].id, stated("GRATICULE1".to_owned()));
    assert!(beam.compensators[0].has_transmission);
    assert!(beam.compensators[0].has_thickness);

    let electrons = &plan.beams[1];
    assert_eq!(electrons.radiation, stated(RadiationType::Electron));
    assert_eq!(electrons.applicators[0].id, stated("A10".to_owned()));
    let arc = &plan.beams[2];
    assert_eq!(arc.energy.label().as_deref(), Some("6-FFF"));
    // 35 points from 0 to 340 degrees: 10 degrees from each to the next.
    assert_eq!(arc.control_points[34].gantry_deg, stated(340.0));
    assert!(!plan.beams[3].is_treatment());
}

#[test]
fn verify_referenced_beam_comes_back() {
    let plan = read(&everything());
    let reference = &plan.fraction_groups[0].beams[1];
    assert_eq!(reference.beam_number, stated(7));
    assert_eq!(reference.meterset_mu, stated(123.456_789));
    assert_eq!(reference.beam_dose_gy, stated(0.987_654));
    assert_eq!(reference.dose_meaning, stated(DoseMeaning::BeamLevel));
    assert_eq!(reference.dose_type, stated(DoseType::Physical));
    assert_eq!(
        reference.specification_point,
        stated(Point::new(1.0, -21.0, 33.0))
    );
    assert_eq!(
        reference.dose_reference_uid,
        stated("2.25.20240105.1.6.1".to_owned())
    );
    let [own, average, verification] = reference.point_depths.as_slice() else {
        panic!("three sets of depths: {:?}", reference.point_depths);
    };
    assert_eq!(own.place, PointDepthPlace::ReferencedBeam);
    assert_eq!(own.depth_cm, stated(9.75));
    assert_eq!(own.equivalent_depth_cm, stated(9.5));
    assert_eq!(own.ssd_cm, stated(90.25));
    assert_eq!(own.source_to_external_contour_cm, stated(89.5));
    assert_eq!(average.place, PointDepthPlace::RetiredAverage);
    assert_eq!(average.depth_cm, stated(9.625));
    assert_eq!(average.averaged.value(), Some(&true));
    assert_eq!(
        verification.place,
        PointDepthPlace::VerificationControlPoint(0)
    );
    assert_eq!(verification.depth_cm, stated(9.875));
    assert_eq!(verification.averaged, stated(false));
    assert_eq!(verification.cumulative_weight, stated(0.0));
}

/// The encodings differ in nothing but the remark on a missing file meta group.
#[test]
fn property_every_encoding_reads_the_same() {
    for spec in [PlanSpec::default(), everything(), big_arcs()] {
        let expected = read(&spec);
        assert!(!blocked(&expected), "{:?}", expected.notes);
        for encoding in Encoding::ALL {
            let mut plan: Plan = read_plan(&spec.encoded(encoding))
                .unwrap_or_else(|error| panic!("{encoding:?}: {error}"));
            let bare = matches!(encoding, Encoding::BareImplicit | Encoding::BareExplicit);
            plan.notes.retain(|note| {
                !(bare && note.kind == NoteKind::Remark && note.place.contains("(0002,0010)"))
            });
            assert_eq!(plan, expected, "{encoding:?}");
        }
    }
}

/// JSON that a script can compare field by field: each value with its standing, devices by their term.
#[test]
fn verify_json_is_plain() {
    let json = serde_json::to_value(read(&everything())).expect("serialisable");
    let beam = &json["beams"][0];
    assert_eq!(beam["radiation"]["value"], "PHOTON");
    assert_eq!(beam["devices"][2]["kind"], "MLCX");
    assert_eq!(beam["sad_cm"]["standing"], "stated");
    assert_eq!(beam["sad_cm"]["value"], 100.0);
    let second = &beam["control_points"][1];
    assert_eq!(second["gantry_deg"]["standing"], "inherited");
    assert_eq!(second["gantry_deg"]["from_control_point"], 0);
    assert_eq!(second["gantry_deg"]["value"], 271.5);
    assert_eq!(second["leaves"][0]["kind"], "MLCX");
    assert_eq!(json["beams"][1]["delivery"]["value"], "TREATMENT");
    assert_eq!(json["beams"][3]["delivery"]["value"], "SETUP");
}
