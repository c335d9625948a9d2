//! Joins between the parts of a plan: numbers that stand twice, references
//! that lead nowhere, several fraction groups, treatment beams that lack what
//! no calculation can do without.

use counterfoil::plan::{Effect, NoteKind, NoteScope, Plan, read_plan};
use counterfoil::quantity::Given;
use dicom_core::{Tag, VR};
use dicom_dictionary_std::tags;

use super::{effects, read};
use crate::builder::{BeamSpec, PlanSpec, ReferenceSpec};

const BEAM: [(Tag, usize); 1] = [(tags::BEAM_SEQUENCE, 0)];
const FIRST_POINT: [(Tag, usize); 2] =
    [(tags::BEAM_SEQUENCE, 0), (tags::CONTROL_POINT_SEQUENCE, 0)];

fn scopes(plan: &Plan, kind: NoteKind) -> Vec<(NoteScope, Effect)> {
    plan.notes
        .iter()
        .filter(|note| note.kind == kind)
        .map(|note| (note.scope, note.effect))
        .collect()
}

#[test]
fn verify_repeated_beam_number_stops_both_beams() {
    let plan = read(&PlanSpec::default().with_repeated_beam_number());
    assert_eq!(
        scopes(&plan, NoteKind::RepeatedNumber),
        [
            (NoteScope::Beam(0), Effect::BlocksScope),
            (NoteScope::Beam(1), Effect::BlocksScope)
        ]
    );
    assert_eq!(plan.beam_index_by_number(1), None);
}

/// Beams are joined by number: neither order nor name counts.
#[test]
fn verify_beams_are_joined_by_number() {
    let spec = PlanSpec::default().with_beam(
        BeamSpec::new(12, "Anterior"),
        ReferenceSpec::new(12, 50.0, 0.5),
    );
    let mut turned = spec.clone();
    turned.beams.reverse();
    let plan = read(&turned);
    assert_eq!(plan.notes, []);
    assert_eq!(plan.beam_index_by_number(1), Some(1));
    assert_eq!(plan.beam_index_by_number(12), Some(0));
}

#[test]
fn verify_dangling_reference_is_noted() {
    let plan = read(&PlanSpec::default().with_dangling_reference(42));
    assert_eq!(
        scopes(&plan, NoteKind::DanglingReference),
        [(NoteScope::FractionGroup(0), Effect::None)]
    );
    let place =
        "FractionGroupSequence[0].ReferencedBeamSequence[1].ReferencedBeamNumber (300C,0006)";
    assert_eq!(effects(&plan, NoteKind::DanglingReference, place).len(), 1);
}

#[test]
fn verify_beam_referenced_twice_in_one_group() {
    let plan = read(&PlanSpec::default().with_dangling_reference(1));
    assert_eq!(
        scopes(&plan, NoteKind::RepeatedNumber),
        [(NoteScope::Beam(0), Effect::BlocksScope); 2]
    );
}

#[test]
fn verify_two_groups_keep_their_own_metersets() {
    let plan = read(&PlanSpec::default().with_second_group(5, 80.0, 0.8));
    assert_eq!(plan.notes, []);
    let [one, two] = plan.fraction_groups.as_slice() else {
        panic!("two groups");
    };
    assert_eq!(one.beams[0].meterset_mu, Given::stated(100.0));
    assert_eq!(two.beams[0].meterset_mu, Given::stated(80.0));
    assert_eq!(two.fractions_planned, Given::stated(5));
    let mut spec = PlanSpec::default().with_second_group(5, 80.0, 0.8);
    spec.groups[1].number = 1;
    assert_eq!(
        scopes(&read(&spec), NoteKind::RepeatedNumber),
        [
            (NoteScope::FractionGroup(0), Effect::BlocksScope),
            (NoteScope::FractionGroup(1), Effect::BlocksScope)
        ]
    );
}

#[test]
fn verify_unreferenced_treatment_beam() {
    let mut spec = PlanSpec::default();
    spec.beams.push(BeamSpec::new(2, "Nowhere"));
    let plan = read(&spec);
    assert_eq!(
        scopes(&plan, NoteKind::MissingValue),
        [(NoteScope::Beam(1), Effect::None)]
    );
}

#[test]
fn verify_patient_setup_references() {
    let mut spec = PlanSpec::default();
    spec.beams[0].setup_number = Some(3);
    assert_eq!(
        scopes(&read(&spec), NoteKind::DanglingReference),
        [(NoteScope::Beam(0), Effect::BlocksScope)]
    );
    let mut spec = PlanSpec::default();
    spec.setups.push(spec.setups[0].clone());
    assert_eq!(
        scopes(&read(&spec), NoteKind::RepeatedNumber),
        [(NoteScope::Beam(0), Effect::BlocksScope)]
    );
}

#[test]
fn verify_prescription_references() {
    let mut spec = PlanSpec::default();
    spec.dose_references.push(spec.dose_references[0].clone());
    spec.groups[0].dose_references.push(7);
    let plan = read(&spec);
    assert_eq!(
        scopes(&plan, NoteKind::RepeatedNumber),
        [(NoteScope::Plan, Effect::None); 2]
    );
    assert_eq!(
        scopes(&plan, NoteKind::DanglingReference),
        [(NoteScope::FractionGroup(0), Effect::None)]
    );
}

/// What a treatment beam cannot be calculated without; a setup beam needs none of it.
#[test]
fn verify_missing_values_stop_a_treatment_beam() {
    for (path, tag) in [
        (&BEAM[..], tags::TREATMENT_MACHINE_NAME),
        (&BEAM, tags::RADIATION_TYPE),
        (&BEAM, tags::SOURCE_AXIS_DISTANCE),
        (&BEAM, tags::BEAM_NUMBER),
        (&BEAM, tags::CONTROL_POINT_SEQUENCE),
        (&FIRST_POINT, tags::GANTRY_ANGLE),
        (&FIRST_POINT, tags::BEAM_LIMITING_DEVICE_ANGLE),
        (&FIRST_POINT, tags::PATIENT_SUPPORT_ANGLE),
        (&FIRST_POINT, tags::NOMINAL_BEAM_ENERGY),
        (&FIRST_POINT, tags::BEAM_LIMITING_DEVICE_POSITION_SEQUENCE),
    ] {
        let spec = PlanSpec::default();
        let plan = read_plan(&spec.without(path, tag)).expect("readable");
        let missing = scopes(&plan, NoteKind::MissingValue);
        assert!(
            missing.contains(&(NoteScope::Beam(0), Effect::BlocksScope)),
            "{tag}: {:?}",
            plan.notes
        );
        let setup = spec.map_beam(|mut beam| {
            beam.delivery = Some("SETUP".to_owned());
            beam
        });
        let plan = read_plan(&setup.without(path, tag)).expect("readable");
        assert_eq!(scopes(&plan, NoteKind::MissingValue), [], "{tag}");
    }
}

/// Identification may be junk or missing; the calculation does not care.
#[test]
fn verify_identification_never_stops_anything() {
    for tag in [
        tags::PATIENT_ID,
        tags::PATIENT_NAME,
        tags::RT_PLAN_LABEL,
        tags::RT_PLAN_DATE,
        tags::STUDY_INSTANCE_UID,
        tags::FRAME_OF_REFERENCE_UID,
        tags::SOP_INSTANCE_UID,
    ] {
        let plan = read_plan(&PlanSpec::default().without(&[], tag)).expect("readable");
        assert_eq!(plan.notes, [], "{tag}");
        assert_eq!(plan.beams.len(), 1);
    }
    let bytes = PlanSpec::default().with_text(&[], tags::RT_PLAN_DATE, VR::DA, "ANONYMISED");
    let plan = read_plan(&bytes).expect("readable");
    assert_eq!(
        plan.identity.plan_date,
        Given::stated("ANONYMISED".to_owned())
    );
}
