//! The parts of a plan around its beams: identification, approval, patient
//! setups, tolerance tables and the prescription.

use dicom_dictionary_std::tags;

use super::node::{Node, quantity};
use super::notes::Notes;
use super::retired;
use crate::plan::{
    Approval, DoseReference, Effect, Identity, NoteKind, PatientPosition, PatientSetup,
    ToleranceTable,
};
use crate::quantity::{Given, Quantity};

/// Identification and approval.
pub(super) fn read_identity(root: &Node<'_, '_>, notes: &mut Notes) -> Identity {
    let mut text = |tag| root.text(tag, Effect::None, notes);
    Identity {
        sop_class_uid: text(tags::SOP_CLASS_UID),
        sop_instance_uid: text(tags::SOP_INSTANCE_UID),
        study_instance_uid: text(tags::STUDY_INSTANCE_UID),
        series_instance_uid: text(tags::SERIES_INSTANCE_UID),
        frame_of_reference_uid: text(tags::FRAME_OF_REFERENCE_UID),
        patient_name: text(tags::PATIENT_NAME),
        patient_id: text(tags::PATIENT_ID),
        plan_label: text(tags::RT_PLAN_LABEL),
        plan_name: text(tags::RT_PLAN_NAME),
        plan_date: text(tags::RT_PLAN_DATE),
        plan_time: text(tags::RT_PLAN_TIME),
        plan_intent: text(tags::PLAN_INTENT),
        treatment_sites: text(retired::TREATMENT_SITES),
        plan_geometry: text(tags::RT_PLAN_GEOMETRY),
        manufacturer: text(tags::MANUFACTURER),
        model_name: text(tags::MANUFACTURER_MODEL_NAME),
        software_versions: text(tags::SOFTWARE_VERSIONS),
        approval: Approval {
            status: text(tags::APPROVAL_STATUS),
            review_date: text(tags::REVIEW_DATE),
            review_time: text(tags::REVIEW_TIME),
            reviewer: text(tags::REVIEWER_NAME),
        },
        structure_set_uids: referenced_uids(root, tags::REFERENCED_STRUCTURE_SET_SEQUENCE, notes),
        referenced_plan_uids: referenced_uids(root, tags::REFERENCED_RT_PLAN_SEQUENCE, notes),
        referenced_dose_uids: referenced_uids(root, tags::REFERENCED_DOSE_SEQUENCE, notes),
    }
}

fn referenced_uids(
    root: &Node<'_, '_>,
    sequence: dicom_core::Tag,
    notes: &mut Notes,
) -> Vec<String> {
    root.items(sequence, Effect::None, notes)
        .filter_map(|item| {
            item.text(tags::REFERENCED_SOP_INSTANCE_UID, Effect::None, notes)
                .get()
        })
        .collect()
}

/// Patient setups. What is wrong with one stops the beams that use it, which
/// is for the check of references to say.
pub(super) fn read_patient_setups(root: &Node<'_, '_>, notes: &mut Notes) -> Vec<PatientSetup> {
    root.items(tags::PATIENT_SETUP_SEQUENCE, Effect::BlocksPlan, notes)
        .map(|item| PatientSetup {
            number: item.integer(tags::PATIENT_SETUP_NUMBER, Effect::None, notes),
            position: read_position(&item, notes),
            additional_position: item.text(tags::PATIENT_ADDITIONAL_POSITION, Effect::None, notes),
            technique: item.text(tags::SETUP_TECHNIQUE, Effect::None, notes),
        })
        .collect()
}

fn read_position(setup: &Node<'_, '_>, notes: &mut Notes) -> Given<PatientPosition> {
    let tag = tags::PATIENT_POSITION;
    let Some(code) = setup.text(tag, Effect::BlocksPlan, notes).get() else {
        return Given::Absent;
    };
    if let Some(position) = PatientPosition::from_code(&code) {
        return Given::stated(position);
    }
    setup.note_values(
        notes,
        tag,
        NoteKind::Unsupported,
        Effect::None,
        format!("patient position '{code}' is none of the eight that are calculated; it counts as absent"),
        (Some(code.clone()), Some("HFS, HFP, HFDL, HFDR, FFS, FFP, FFDL, FFDR".to_owned())),
    );
    Given::Absent
}

/// Tolerance tables.
pub(super) fn read_tolerance_tables(root: &Node<'_, '_>, notes: &mut Notes) -> Vec<ToleranceTable> {
    root.items(tags::TOLERANCE_TABLE_SEQUENCE, Effect::None, notes)
        .map(|item| ToleranceTable {
            number: item.integer(tags::TOLERANCE_TABLE_NUMBER, Effect::None, notes),
            label: item.text(tags::TOLERANCE_TABLE_LABEL, Effect::None, notes),
        })
        .collect()
}

/// Prescription items. A doubtful point or dose here must not be computed
/// with, but it stops no beam: it is absent then.
pub(super) fn read_dose_references(root: &Node<'_, '_>, notes: &mut Notes) -> Vec<DoseReference> {
    let dose = quantity(Quantity::PrescribedDose, Effect::None);
    root.items(tags::DOSE_REFERENCE_SEQUENCE, Effect::None, notes)
        .map(|item| DoseReference {
            number: item.integer(tags::DOSE_REFERENCE_NUMBER, Effect::None, notes),
            uid: item.text(tags::DOSE_REFERENCE_UID, Effect::None, notes),
            structure_type: item.text(tags::DOSE_REFERENCE_STRUCTURE_TYPE, Effect::None, notes),
            description: item.text(tags::DOSE_REFERENCE_DESCRIPTION, Effect::None, notes),
            reference_type: item.text(tags::DOSE_REFERENCE_TYPE, Effect::None, notes),
            point: item
                .point_reading(tags::DOSE_REFERENCE_POINT_COORDINATES, Effect::None, notes)
                .given(),
            roi_number: item.integer(tags::REFERENCED_ROI_NUMBER, Effect::None, notes),
            target_prescription_dose_gy: item.number(tags::TARGET_PRESCRIPTION_DOSE, dose, notes),
        })
        .collect()
}
