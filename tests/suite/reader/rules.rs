//! Rules on single values: ranges, terms, angles, apertures, weights, counts,
//! repeats. Each deviation gives its note, with its place and its effect.

use counterfoil::plan::{Effect, NoteKind, NoteScope, Plan, read_plan};
use counterfoil::quantity::Given;
use dicom_core::{Tag, VR};
use dicom_dictionary_std::tags;

use super::plans::{block, wedge};
use super::raw::{long, plan_then};
use super::{blocked, effects, read};
use crate::builder::{BeamSpec, DeviceSpec, PlanSpec, PointSpec};

const BEAM: [(Tag, usize); 1] = [(tags::BEAM_SEQUENCE, 0)];
const FIRST_POINT: [(Tag, usize); 2] =
    [(tags::BEAM_SEQUENCE, 0), (tags::CONTROL_POINT_SEQUENCE, 0)];
const REFERENCE: [(Tag, usize); 2] = [
    (tags::FRACTION_GROUP_SEQUENCE, 0),
    (tags::REFERENCED_BEAM_SEQUENCE, 0),
];

/// The default plan with one attribute changed.
fn changed(path: &[(Tag, usize)], tag: Tag, vr: VR, text: &str) -> Plan {
    read_plan(&PlanSpec::default().with_text(path, tag, vr, text)).expect("readable")
}

fn with_beam(change: impl FnOnce(BeamSpec) -> BeamSpec) -> Plan {
    read(&PlanSpec::default().map_beam(change))
}

/// A SAD of 1000 mm written as 100, in cm; an SSD of 900 mm as 90; a dose of 2 Gy as 200, in cGy.
#[test]
fn verify_unit_slips_are_named_and_not_repaired() {
    for (path, tag, text, slip) in [
        (&BEAM[..], tags::SOURCE_AXIS_DISTANCE, "100", "cm"),
        (&FIRST_POINT, tags::SOURCE_TO_SURFACE_DISTANCE, "90", "cm"),
        (&REFERENCE, tags::BEAM_DOSE, "200", "cGy"),
        (&FIRST_POINT, tags::NOMINAL_BEAM_ENERGY, "6000", "kV"),
    ] {
        let plan = changed(path, tag, VR::DS, text);
        let note = plan
            .notes
            .iter()
            .find(|note| note.kind == NoteKind::IncredibleValue)
            .unwrap_or_else(|| panic!("{tag}: {:?}", plan.notes));
        assert!(note.message.contains(slip), "{}", note.message);
        assert_eq!(note.effect, Effect::BlocksScope);
        assert_eq!(note.scope, NoteScope::Beam(0));
        assert!(note.measured.is_some() && note.limit.is_some());
    }
    let plan = changed(&BEAM, tags::SOURCE_AXIS_DISTANCE, VR::DS, "100");
    assert_eq!(plan.beams[0].sad_cm, Given::Absent);
}

#[test]
fn verify_angles_are_normalised() {
    for (text, gantry_deg) in [
        ("-90", 270.0),
        ("360", 0.0),
        ("540", 180.0),
        ("0", 0.0),
        ("-1e-17", 0.0),
    ] {
        let plan = changed(&FIRST_POINT, tags::GANTRY_ANGLE, VR::DS, text);
        let read = plan.beams[0].control_points[0].gantry_deg.get();
        assert_eq!(read, Some(gantry_deg), "{text}");
    }
    // Couch angles stay as they are.
    let plan = changed(&FIRST_POINT, tags::PATIENT_SUPPORT_ANGLE, VR::DS, "-10");
    assert_eq!(
        plan.beams[0].control_points[0].couch_deg,
        Given::stated(-10.0)
    );
    let plan = changed(&FIRST_POINT, tags::GANTRY_ANGLE, VR::DS, "9000");
    assert!(blocked(&plan));
}

#[test]
fn verify_energy_compares_as_number() {
    for (text, label) in [("6.0", "6"), ("15.00", "15"), ("06", "6"), ("6.5", "6.5")] {
        let plan = changed(&FIRST_POINT, tags::NOMINAL_BEAM_ENERGY, VR::DS, text);
        assert_eq!(plan.beams[0].energy.label().as_deref(), Some(label));
    }
    let plan = with_beam(BeamSpec::without_fluence_mode);
    assert_eq!(
        effects(&plan, NoteKind::Remark, "PrimaryFluenceModeSequence"),
        [Effect::None]
    );
    let plan = with_beam(|mut beam| {
        beam.control_points[1].energy = Some(10.0);
        beam
    });
    assert!(plan.beams[0].energy.changes);
    assert!(blocked(&plan));
}

#[test]
fn verify_dosimeter_unit_must_be_mu() {
    let plan = changed(&BEAM, tags::PRIMARY_DOSIMETER_UNIT, VR::CS, "MINUTE");
    let place = "BeamSequence[0].PrimaryDosimeterUnit (300A,00B3)";
    assert_eq!(
        effects(&plan, NoteKind::Unsupported, place),
        [Effect::BlocksScope]
    );
}

#[test]
fn verify_metersets_keep_their_digits() {
    let plan = changed(&REFERENCE, tags::BEAM_METERSET, VR::DS, "20.000000000001");
    assert_eq!(
        plan.fraction_groups[0].beams[0].meterset_mu,
        Given::stated(20.000_000_000_001)
    );
    for text in ["", "1e5", "-5"] {
        let plan = changed(&REFERENCE, tags::BEAM_METERSET, VR::DS, text);
        assert_eq!(
            plan.fraction_groups[0].beams[0].meterset_mu,
            Given::Absent,
            "{text}"
        );
        assert_eq!(
            effects(&plan, NoteKind::MissingValue, "BeamMeterset (300A,0086)").len(),
            1
        );
    }
    let plan = read(&PlanSpec::default().with_setup_beam(2));
    assert_eq!(plan.notes, [], "a setup beam needs no meterset");
}

#[test]
fn verify_wrong_numbers_of_values() {
    for (path, tag, text) in [
        (&FIRST_POINT[..], tags::ISOCENTER_POSITION, "1\\2"),
        (&FIRST_POINT, tags::ISOCENTER_POSITION, "1\\2\\3\\4"),
        (&FIRST_POINT, tags::ISOCENTER_POSITION, "1\\\\3"),
        (&FIRST_POINT, tags::GANTRY_ANGLE, "0\\90"),
        (&BEAM, tags::SOURCE_AXIS_DISTANCE, "1000\\1000"),
    ] {
        let plan = changed(path, tag, VR::DS, text);
        let notes = effects(&plan, NoteKind::MalformedValue, "");
        assert_eq!(notes, [Effect::BlocksScope], "{text}");
    }
    // All empty is absent, not malformed.
    let plan = changed(&FIRST_POINT, tags::ISOCENTER_POSITION, VR::DS, "\\\\");
    assert_eq!(effects(&plan, NoteKind::MalformedValue, ""), []);
    assert!(plan.beams[0].control_points[0].isocentre.is_absent());
}

#[test]
fn verify_whole_numbers_must_be_whole() {
    let plan = changed(&BEAM, tags::BEAM_NUMBER, VR::IS, "1.5");
    assert!(plan.beams[0].number.is_absent());
    assert!(blocked(&plan));
    let plan = changed(&BEAM, tags::BEAM_NUMBER, VR::IS, " 01 ");
    assert_eq!(plan.beams[0].number, Given::stated(1));
    assert_eq!(plan.notes, []);
}

#[test]
fn verify_closed_and_inverted_jaws() {
    for (x_cm, word) in [([2.0, 2.0], "closed"), ([3.0, -3.0], "inverted")] {
        let plan = with_beam(|beam| beam.with_jaws(x_cm, [-5.0, 5.0]));
        let note = &plan.notes[0];
        assert_eq!(note.kind, NoteKind::Aperture);
        assert_eq!(note.effect, Effect::BlocksScope);
        assert!(note.message.contains(word), "{}", note.message);
    }
}

#[test]
fn verify_one_axis_positioned_twice() {
    let twice = |x_cm: [f64; 2]| {
        with_beam(|beam| {
            beam.map_first(|point| point.positions_cm.push(("X".to_owned(), x_cm.to_vec())))
        })
    };
    let same = twice([-5.0, 5.0]);
    let place = "LeafJawPositions (300A,011C)";
    assert_eq!(
        effects(&same, NoteKind::RepeatedAttribute, place),
        [Effect::None]
    );
    assert_eq!(
        same.beams[0].control_points[0].jaws_x_cm,
        Given::stated([-5.0, 5.0])
    );
    let other = twice([-4.0, 5.0]);
    assert_eq!(
        effects(&other, NoteKind::RepeatedAttribute, place),
        [Effect::BlocksScope]
    );
    assert!(other.beams[0].control_points[0].jaws_x_cm.is_absent());
}

#[test]
fn verify_devices_that_are_never_positioned_do_not_count() {
    let plan = with_beam(|mut beam| {
        beam.devices.push(DeviceSpec::leaves("MLCX", 40, 1.0));
        beam.devices.push(DeviceSpec::jaw("X"));
        beam
    });
    assert_eq!(plan.notes, []);
    let beam = &plan.beams[0];
    assert_eq!(beam.devices.len(), 2);
    let unused: Vec<&str> = beam.unused_devices.iter().map(|d| d.kind.term()).collect();
    assert_eq!(unused, ["MLCX", "X"]);
    assert!(beam.control_points[0].leaves.is_empty());
}

#[test]
fn verify_undeclared_devices() {
    // Jaws are complete without their declaration; leaves are not.
    let plan = with_beam(|mut beam| {
        beam.devices.remove(0);
        beam
    });
    assert!(!blocked(&plan));
    assert_eq!(
        effects(&plan, NoteKind::DanglingReference, ""),
        [Effect::None]
    );
    let leaves = |kind: &str| {
        with_beam(|beam| {
            beam.map_first(|point| {
                point
                    .positions_cm
                    .push((kind.to_owned(), vec![-1.0, -1.0, 1.0, 1.0]));
            })
        })
    };
    for kind in ["MLCX", "MLCX2", "MLCY", "IRIS"] {
        let plan = leaves(kind);
        assert_eq!(
            effects(&plan, NoteKind::DanglingReference, ""),
            [Effect::BlocksScope],
            "{kind}"
        );
        assert_eq!(plan.beams[0].devices[2].kind.term(), kind);
    }
}

#[test]
fn verify_leaf_banks_must_be_consistent() {
    let open = vec![-1.0, -1.0, 1.0, 1.0];
    let bank = || DeviceSpec::leaves("MLCX", 2, 1.0);
    let plan = with_beam(|beam| beam.with_leaves(bank(), open.clone()));
    assert_eq!(plan.notes, []);
    let plan = with_beam(|beam| beam.with_leaves(bank(), vec![-1.0, 1.0]));
    assert_eq!(
        effects(&plan, NoteKind::MalformedValue, "LeafJawPositions"),
        [Effect::BlocksScope]
    );
    assert!(
        plan.beams[0].control_points[0].leaves[0]
            .positions_cm
            .is_absent()
    );
    let plan = with_beam(|beam| {
        let device = DeviceSpec { pairs: 3, ..bank() };
        beam.with_leaves(device, open.clone())
    });
    assert_eq!(
        effects(&plan, NoteKind::CountMismatch, "LeafPositionBoundaries"),
        [Effect::BlocksScope]
    );
    for boundaries_cm in [vec![1.0, 0.0, -1.0], vec![-1.0, -1.0, 1.0]] {
        let plan = with_beam(|beam| {
            let device = DeviceSpec {
                boundaries_cm,
                ..bank()
            };
            beam.with_leaves(device, open.clone())
        });
        assert_eq!(
            effects(&plan, NoteKind::Aperture, "LeafPositionBoundaries"),
            [Effect::BlocksScope]
        );
    }
    let plan = with_beam(|beam| {
        let device = DeviceSpec {
            boundaries_cm: Vec::new(),
            ..bank()
        };
        beam.with_leaves(device, open.clone())
    });
    assert!(blocked(&plan));
    let plan = with_beam(|beam| beam.with_leaves(bank(), vec![-1.0, 2.0, 1.0, 1.0]));
    assert_eq!(
        effects(&plan, NoteKind::Aperture, "LeafJawPositions"),
        [Effect::BlocksScope]
    );
}

#[test]
fn verify_stacked_leaf_banks() {
    let plan = with_beam(|beam| {
        beam.with_leaves(
            DeviceSpec::leaves("MLCX1", 2, 1.0),
            vec![-1.0, -1.0, 1.0, 1.0],
        )
        .with_leaves(DeviceSpec::leaves("MLCX2", 1, 2.0), vec![-2.0, 2.0])
    });
    assert_eq!(plan.notes, []);
    let leaves = &plan.beams[0].control_points[0].leaves;
    assert_eq!(leaves[0].kind.term(), "MLCX1");
    assert_eq!(
        leaves[1].positions_cm.value().unwrap().as_ref(),
        [-2.0, 2.0]
    );
}

#[test]
fn verify_meterset_weights() {
    let weights = |end: Option<f64>, all: &[f64]| {
        with_beam(|mut beam| {
            beam.final_weight = end;
            beam.control_points.truncate(1);
            beam.control_points[0].weight = all.first().copied();
            for &weight in all.iter().skip(1) {
                beam.control_points.push(PointSpec::at_weight(weight));
            }
            beam
        })
    };
    for (end, all) in [
        (100.0, &[0.0, 100.0][..]),
        (123.4, &[0.0, 50.0, 50.0, 123.4]),
        (1.0, &[0.0, 0.333_333, 1.000_001]),
    ] {
        assert_eq!(weights(Some(end), all).notes, [], "{all:?}");
    }
    for (end, all, tag) in [
        (Some(0.0), &[0.0, 0.0][..], "(300A,010E)"),
        (None, &[0.0, 1.0], "(300A,010E)"),
        (Some(-1.0), &[0.0, -1.0], "(300A,010E)"),
        (Some(1.0), &[0.0, 0.5], "(300A,0134)"),
        (Some(1.0), &[0.5, 1.0], "(300A,0134)"),
        (Some(1.0), &[0.0, 0.7, 0.5, 1.0], "(300A,0134)"),
        (Some(1.0), &[0.0], "(300A,0134)"),
    ] {
        let plan = weights(end, all);
        assert_eq!(
            effects(&plan, NoteKind::MetersetWeights, tag),
            [Effect::BlocksScope],
            "{all:?}"
        );
    }
    let plan = with_beam(|mut beam| {
        beam.control_points[1].weight = None;
        beam
    });
    assert_eq!(effects(&plan, NoteKind::MetersetWeights, "").len(), 1);
}

#[test]
fn verify_counts_are_of_the_items() {
    let plan = with_beam(|mut beam| {
        beam.stated_control_points = Some(5);
        beam
    });
    assert_eq!(
        effects(&plan, NoteKind::CountMismatch, "NumberOfControlPoints"),
        [Effect::None]
    );
    // A stated wedge that is not there may still stand in the beam.
    let plan = changed(&BEAM, tags::NUMBER_OF_WEDGES, VR::IS, "1");
    assert_eq!(
        effects(&plan, NoteKind::CountMismatch, "NumberOfWedges"),
        [Effect::BlocksScope]
    );
    let spec = PlanSpec::default().map_beam(|beam| beam.with_wedge(wedge(1)));
    let bytes = spec.with_text(&BEAM, tags::NUMBER_OF_WEDGES, VR::IS, "0");
    let plan = read_plan(&bytes).expect("readable");
    assert_eq!(plan.beams[0].wedges.len(), 1);
    assert_eq!(
        effects(&plan, NoteKind::CountMismatch, "NumberOfWedges"),
        [Effect::None]
    );
}

#[test]
fn verify_wedge_positions() {
    let plan = with_beam(|beam| {
        beam.with_wedge(wedge(1))
            .map_first(|point| point.wedges.push((2, true)))
    });
    assert_eq!(
        effects(&plan, NoteKind::DanglingReference, "ReferencedWedgeNumber"),
        [Effect::BlocksScope]
    );
    let plan = with_beam(|beam| {
        beam.with_wedge(wedge(1))
            .map_first(|point| point.wedges.push((1, false)))
    });
    assert!(
        plan.beams[0].control_points[0].wedges[0]
            .in_beam
            .is_absent()
    );
    assert!(blocked(&plan));
    let plan = with_beam(|beam| {
        beam.with_wedge(wedge(1))
            .map_first(|point| point.wedges[0].1 = false)
    });
    assert_eq!(
        plan.beams[0].control_points[0].wedges[0].in_beam,
        Given::stated(false)
    );
    assert_eq!(plan.notes, []);
}

#[test]
fn verify_wedge_numbers_are_unique() {
    let plan = with_beam(|beam| beam.with_wedge(wedge(1)).with_wedge(wedge(1)));
    assert_eq!(
        effects(&plan, NoteKind::RepeatedNumber, "WedgeSequence"),
        [Effect::BlocksScope]
    );
}

#[test]
fn verify_control_point_indices_follow_the_items() {
    let index = |text: &str| changed(&FIRST_POINT, tags::CONTROL_POINT_INDEX, VR::IS, text);
    let place = "ControlPointSequence (300A,0111)";
    assert_eq!(
        effects(&index("5"), NoteKind::CountMismatch, place),
        [Effect::BlocksScope]
    );
    assert_eq!(index("").notes, []);
}

#[test]
fn verify_source_distances_may_be_missing() {
    let plan = with_beam(|mut beam| {
        beam.devices[0].source_distance_cm = None;
        beam
    });
    let note = &plan.notes[0];
    assert_eq!((note.kind, note.effect), (NoteKind::Remark, Effect::None));
    assert!(note.message.ends_with("for ASYMX"), "{}", note.message);
}

#[test]
fn verify_block_outlines() {
    let spec = PlanSpec::default().map_beam(|beam| beam.with_block(block()));
    assert_eq!(read(&spec).notes, []);
    let path = [BEAM[0], (tags::BLOCK_SEQUENCE, 0)];
    let bytes = spec.with_text(&path, tags::BLOCK_DATA, VR::DS, "10\\10\\20");
    let plan = read_plan(&bytes).expect("readable");
    assert!(plan.beams[0].blocks[0].outline_cm.is_absent());
    assert!(blocked(&plan));
    let bytes = spec.with_text(&path, tags::BLOCK_NUMBER_OF_POINTS, VR::IS, "3");
    let plan = read_plan(&bytes).expect("readable");
    assert_eq!(effects(&plan, NoteKind::CountMismatch, "").len(), 1);
    let bytes = spec.with_text(&path, tags::BLOCK_TRANSMISSION, VR::DS, "5");
    let plan = read_plan(&bytes).expect("readable");
    assert!(
        plan.notes[0].message.contains("per cent"),
        "{:?}",
        plan.notes
    );
}

/// A second beam sequence: the first is shown, nothing of the plan can be verified.
#[test]
fn verify_repeated_sequence_blocks_the_plan() {
    let plan = read_plan(&plan_then(&long(0x300A, 0x00B0, "SQ", 0, &[]))).expect("readable");
    assert_eq!(plan.beams.len(), 1);
    assert!(
        effects(
            &plan,
            NoteKind::RepeatedAttribute,
            "BeamSequence (300A,00B0)"
        )
        .contains(&Effect::BlocksPlan)
    );
}

#[test]
fn verify_unknown_terms() {
    let plan = changed(&BEAM, tags::TREATMENT_DELIVERY_TYPE, VR::CS, "SPECIAL");
    assert!(plan.beams[0].is_treatment());
    assert_eq!(
        effects(&plan, NoteKind::Remark, "(300A,00CE)"),
        [Effect::None]
    );
    let plan = changed(&REFERENCE, tags::BEAM_DOSE_MEANING, VR::CS, "OTHER");
    assert!(blocked(&plan));
    let setup = [(tags::PATIENT_SETUP_SEQUENCE, 0)];
    let plan = changed(&setup, tags::PATIENT_POSITION, VR::CS, "SITTING");
    assert!(plan.patient_setups[0].position.is_absent());
    assert_eq!(
        effects(&plan, NoteKind::Unsupported, "PatientPosition (0018,5100)"),
        [Effect::None]
    );
}
