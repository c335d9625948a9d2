//! The columns of `findings.csv`.

use super::{Cell, Column};
use crate::audit::{Finding, PlanEntry};

/// What a row is made of.
#[derive(Clone, Copy, Debug)]
pub(in crate::report) struct FindingRow<'a> {
    pub(in crate::report) run_id: &'a str,
    pub(in crate::report) plan: &'a PlanEntry,
    pub(in crate::report) finding: &'a Finding,
}

type Getter = for<'a, 'b> fn(&'b FindingRow<'a>) -> Cell;

const fn column(name: &'static str, meaning: &'static str, cell: Getter) -> Column<Getter> {
    Column {
        name,
        meaning,
        cell,
    }
}

/// The columns, in order.
pub(in crate::report) const FINDING_COLUMNS: &[Column<Getter>] = &[
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
    column(
        "beam_number",
        "beam number; empty when the finding is about the plan",
        |r| Cell::whole(r.finding.beam_number),
    ),
    column("check", "name of the check", |r| {
        Cell::word(r.finding.check)
    }),
    column("severity", "note, tolerance or action", |r| {
        Cell::word(r.finding.severity.term())
    }),
    column("message", "what is there and what to do", |r| {
        Cell::word(&r.finding.message)
    }),
    column("measured", "what was found", |r| {
        value(r.finding.measured.as_ref())
    }),
    column("limit", "what was expected", |r| {
        value(r.finding.limit.as_ref())
    }),
    column(
        "run_id",
        "identifier of the run, the same in every file of the report",
        |r| Cell::word(r.run_id),
    ),
];

fn value(text: Option<&String>) -> Cell {
    text.map_or(Cell::Missing, |text| Cell::Value(text.clone()))
}
