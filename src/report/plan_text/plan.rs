//! What belongs to the plan as a whole: identification, approval, setup,
//! prescription, fraction groups, reading notes.

use super::lines::{Lines, as_is, in_unit, yes_no};
use super::units::meterset_unit;
use crate::plan::{
    Approval, DoseMeaning, DoseReference, DoseType, Effect, FractionGroup, Identity, NoteScope,
    PatientPosition, Plan, PointDepth, PointDepthPlace, ReadingNote, ReferencedBeam,
};
use crate::quantity::{Frame, Point};

/// A point with its coordinates.
pub(super) fn point<F: Frame>(point: &Point<F>) -> String {
    let show = in_unit("");
    format!(
        "({}, {}, {}) cm",
        show(&point.x_cm),
        show(&point.y_cm),
        show(&point.z_cm)
    )
}

pub(super) fn identity(lines: &mut Lines, identity: &Identity) {
    lines.heading("Plan");
    lines.given("patient's name", &identity.patient_name, as_is);
    lines.given("patient ID", &identity.patient_id, as_is);
    lines.given("plan label", &identity.plan_label, as_is);
    lines.optional("plan name", &identity.plan_name, as_is);
    lines.given("plan date", &identity.plan_date, as_is);
    lines.optional("plan time", &identity.plan_time, as_is);
    lines.optional("plan intent", &identity.plan_intent, as_is);
    lines.optional("treatment sites", &identity.treatment_sites, as_is);
    lines.optional("plan geometry", &identity.plan_geometry, as_is);
    lines.given(
        "planning system, manufacturer",
        &identity.manufacturer,
        as_is,
    );
    lines.given("planning system, model", &identity.model_name, as_is);
    lines.optional("software versions", &identity.software_versions, as_is);
    lines.given("SOP class UID", &identity.sop_class_uid, as_is);
    lines.given("SOP instance UID", &identity.sop_instance_uid, as_is);
    lines.optional("study instance UID", &identity.study_instance_uid, as_is);
    lines.optional("series instance UID", &identity.series_instance_uid, as_is);
    lines.optional(
        "frame of reference UID",
        &identity.frame_of_reference_uid,
        as_is,
    );
    lines.absent_names();
    let references = [
        ("structure set", &identity.structure_set_uids),
        ("referenced plan", &identity.referenced_plan_uids),
        ("referenced dose", &identity.referenced_dose_uids),
    ];
    for (name, uids) in references {
        for uid in uids {
            lines.plain(&format!("{name}: {uid}"));
        }
    }
}

pub(super) fn approval(lines: &mut Lines, approval: &Approval) {
    lines.heading("Approval");
    lines.given("status", &approval.status, as_is);
    lines.optional("review date", &approval.review_date, as_is);
    lines.optional("review time", &approval.review_time, as_is);
    lines.optional("reviewer", &approval.reviewer, as_is);
}

pub(super) fn setups(lines: &mut Lines, plan: &Plan) {
    lines.heading("Patient setup");
    if plan.patient_setups.is_empty() {
        lines.plain("none");
    }
    for setup in &plan.patient_setups {
        lines.given("setup number", &setup.number, as_is);
        lines.given(
            "patient position",
            &setup.position,
            |position: &PatientPosition| position.code().to_owned(),
        );
        lines.optional("additional position", &setup.additional_position, as_is);
        lines.optional("setup technique", &setup.technique, as_is);
        lines.absent_names();
    }
    for table in &plan.tolerance_tables {
        lines.given("tolerance table number", &table.number, as_is);
        lines.optional("tolerance table label", &table.label, as_is);
    }
}

pub(super) fn prescription(lines: &mut Lines, references: &[DoseReference]) {
    lines.heading("Prescription");
    if references.is_empty() {
        lines.plain("no dose reference");
    }
    for reference in references {
        lines.given("dose reference number", &reference.number, as_is);
        lines.given(
            "target prescription dose",
            &reference.target_prescription_dose_gy,
            in_unit("Gy"),
        );
        lines.given("type", &reference.reference_type, as_is);
        lines.given("structure type", &reference.structure_type, as_is);
        lines.optional("description", &reference.description, as_is);
        lines.optional("point", &reference.point, point);
        lines.optional("ROI number", &reference.roi_number, as_is);
        lines.optional("UID", &reference.uid, as_is);
        lines.absent_names();
    }
}

pub(super) fn fraction_group(lines: &mut Lines, plan: &Plan, group: &FractionGroup, index: usize) {
    lines.heading(&format!("Fraction group, item {}", index + 1));
    lines.given("fraction group number", &group.number, as_is);
    lines.given("fractions planned", &group.fractions_planned, as_is);
    lines.optional("description", &group.description, as_is);
    lines.optional("brachytherapy setups", &group.brachy_setups, as_is);
    lines.absent_names();
    for reference in &group.dose_references {
        lines.given("referenced dose reference", &reference.number, as_is);
        lines.optional(
            "target prescription dose here",
            &reference.target_prescription_dose_gy,
            in_unit("Gy"),
        );
    }
    for beam in &group.beams {
        referenced_beam(lines, beam, &meterset_unit(plan, beam));
    }
}

fn referenced_beam(lines: &mut Lines, beam: &ReferencedBeam, unit: &str) {
    let number = beam
        .beam_number
        .value()
        .map_or_else(|| "of unknown number".to_owned(), ToString::to_string);
    lines.subheading(&format!("Beam {number} in this group"));
    lines.given("referenced beam number", &beam.beam_number, as_is);
    lines.given("meterset", &beam.meterset_mu, |meterset| {
        format!("{} {unit}", in_unit("")(meterset))
    });
    lines.given(
        "beam dose in one fraction",
        &beam.beam_dose_gy,
        in_unit("Gy"),
    );
    lines.given("dose specification point", &beam.specification_point, point);
    lines.optional("dose meaning", &beam.dose_meaning, |meaning| {
        match meaning {
            DoseMeaning::BeamLevel => "BEAM_LEVEL",
            DoseMeaning::FractionLevel => "FRACTION_LEVEL",
        }
        .to_owned()
    });
    lines.optional("dose type", &beam.dose_type, |kind| {
        match kind {
            DoseType::Physical => "PHYSICAL",
            DoseType::Effective => "EFFECTIVE",
        }
        .to_owned()
    });
    lines.optional("dose reference UID", &beam.dose_reference_uid, as_is);
    lines.absent_names();
    for depth in &beam.point_depths {
        point_depth(lines, depth);
    }
}

/// A set of point depths that belong together.
pub(super) fn point_depth(lines: &mut Lines, depth: &PointDepth) {
    let place = match depth.place {
        PointDepthPlace::ReferencedBeam => "at the referenced beam".to_owned(),
        PointDepthPlace::RetiredAverage => {
            "at the referenced beam, retired average attributes".to_owned()
        }
        PointDepthPlace::VerificationControlPoint(index) => {
            format!("at verification control point {index}")
        }
        PointDepthPlace::ControlPoint => "at the control point".to_owned(),
    };
    lines.plain(&format!("point depths {place}:"));
    lines.given("point depth", &depth.depth_cm, in_unit("cm"));
    lines.given(
        "point equivalent depth",
        &depth.equivalent_depth_cm,
        in_unit("cm"),
    );
    lines.given("point SSD", &depth.ssd_cm, in_unit("cm"));
    lines.optional(
        "source to external contour",
        &depth.source_to_external_contour_cm,
        in_unit("cm"),
    );
    lines.optional("cumulative weight", &depth.cumulative_weight, in_unit(""));
    lines.optional("averaged over the beam", &depth.averaged, yes_no);
    lines.absent_names();
}

pub(super) fn notes(lines: &mut Lines, notes: &[ReadingNote]) {
    lines.heading("Reading notes");
    if notes.is_empty() {
        lines.plain("none");
    }
    for note in notes {
        let scope = match note.scope {
            NoteScope::Plan => "plan".to_owned(),
            NoteScope::FractionGroup(index) => format!("fraction group item {}", index + 1),
            NoteScope::Beam(index) => format!("beam item {}", index + 1),
        };
        let effect = match note.effect {
            Effect::None => "stops nothing",
            Effect::BlocksScope => "stops its verification",
            Effect::BlocksPlan => "stops the verification of every beam",
        };
        lines.plain(&format!("{scope}, {effect}: {}", note.message));
        lines.plain(&format!("    at {}", note.place));
        if let Some(measured) = &note.measured {
            lines.plain(&format!("    found {measured}"));
        }
        if let Some(limit) = &note.limit {
            lines.plain(&format!("    expected {limit}"));
        }
    }
}
