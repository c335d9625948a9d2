//! The columns of `plans.csv`.

use super::{Cell, Column};
use crate::audit::PlanEntry;

/// What a row is made of.
#[derive(Clone, Copy, Debug)]
pub(in crate::report) struct PlanRow<'a> {
    pub(in crate::report) run_id: &'a str,
    pub(in crate::report) plan: &'a PlanEntry,
}

type Getter = for<'a, 'b> fn(&'b PlanRow<'a>) -> Cell;

const fn column(name: &'static str, meaning: &'static str, cell: Getter) -> Column<Getter> {
    Column {
        name,
        meaning,
        cell,
    }
}

/// The columns, in order.
pub(in crate::report) const PLAN_COLUMNS: &[Column<Getter>] = &[
    column("file", "the plan's file as it was given or found", |r| {
        Cell::word(&r.plan.file)
    }),
    column("sop_instance_uid", "SOP Instance UID of the plan", |r| {
        Cell::text(r.plan.sop_instance_uid.as_ref())
    }),
    column(
        "patient_id",
        "Patient ID, or its pseudonym when so ordered",
        |r| Cell::text(r.plan.patient_id.as_ref()),
    ),
    column("plan_label", "RT Plan Label", |r| {
        Cell::text(r.plan.plan_label.as_ref())
    }),
    column("approval", "Approval Status as the file says", |r| {
        Cell::text(r.plan.approval.as_ref())
    }),
    column(
        "machine",
        "treatment machine names, joined with + when several",
        |r| Cell::text(r.plan.machine.as_ref()),
    ),
    column(
        "beams",
        "number of rows that the plan has in beams.csv",
        |r| Cell::count(r.plan.beams.len()),
    ),
    column(
        "fractions",
        "fractions planned; empty when groups differ or none is stated",
        |r| Cell::whole(r.plan.fractions),
    ),
    column(
        "prescription_gy",
        "prescribed dose of the course, Gy; empty when none or several are stated",
        |r| Cell::number(r.plan.prescription_gy),
    ),
    column(
        "planned_point_dose_gy",
        "the plan's dose of one fraction where all treatment beams share a point, Gy",
        |r| Cell::number(r.plan.sum.as_ref().map(|sum| sum.planned_dose_gy)),
    ),
    column(
        "independent_point_dose_gy",
        "independent dose of one fraction where all treatment beams share a point, Gy",
        |r| Cell::number(r.plan.sum.as_ref().map(|sum| sum.independent_dose_gy)),
    ),
    column(
        "deviation_percent",
        "100 * (independent - planned) / planned of the two doses before",
        |r| Cell::number(r.plan.sum.as_ref().map(|sum| sum.deviation_percent)),
    ),
    column(
        "worst_beam_percent",
        "the deviation that is largest in size over the beams that were judged, per cent",
        |r| Cell::number(r.plan.worst_beam_percent),
    ),
    column(
        "verdict",
        "the worst of its beams: within, beyond-tolerance, not-verifiable, beyond-action; not-applicable without a treatment beam",
        |r| Cell::word(r.plan.verdict.term()),
    ),
    column(
        "findings",
        "number of rows that the plan has in findings.csv",
        |r| Cell::count(r.plan.findings.len()),
    ),
    column(
        "first_seen",
        "when the plan was first audited; empty when not recorded",
        |_| Cell::Missing,
    ),
    column(
        "changed_since",
        "what changed since the last audit; empty when not recorded",
        |_| Cell::Missing,
    ),
    column(
        "run_id",
        "identifier of the run, the same in every file of the report",
        |r| Cell::word(r.run_id),
    ),
];
