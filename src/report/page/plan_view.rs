//! One plan in full, in finished strings.

use std::cmp::Reverse;

use askama::Template;

use super::attention::plan_name;
use super::beam_view::{self, BeamRowView, BeamView};
use super::urgency::{self, Urgency};
use super::words::{Status, counted, status};
use crate::audit::{Finding, PlanEntry};
use crate::report::number::{MISSING, fixed, fixed_or_dash, signed, signed_or_dash, text_or_dash};
use crate::settings::Severity;

/// A plan shows the detail of at most so many beams, the most urgent first; the table has all.
pub(super) const BEAMS_IN_FULL: usize = 40;

/// A plan shows at most so many findings, the most severe.
const FINDINGS_SHOWN: usize = 100;

/// A plan in full.
#[derive(Debug, Template)]
#[template(path = "plan.html", config = "src/report/askama.toml")]
pub(super) struct PlanView {
    id: String,
    label: String,
    /// The label when it is too long for the heading.
    whole_label: Option<String>,
    patient_id: String,
    patient_name: Option<String>,
    file: String,
    sha256: String,
    sop_instance_uid: String,
    approval: String,
    machine: String,
    fractions: String,
    prescription: String,
    worst_beam: String,
    sum: Option<SumView>,
    no_sum_reason: Option<String>,
    status: Status,
    invented: bool,
    rows: Vec<BeamRowView>,
    several_groups: bool,
    brackets: bool,
    details: Vec<BeamView>,
    details_left_out: Option<String>,
    findings: Vec<FindingView>,
    findings_left_out: Option<String>,
}

#[derive(Debug)]
struct SumView {
    planned: String,
    independent: String,
    deviation: String,
}

#[derive(Debug)]
struct FindingView {
    severity: Status,
    beam: String,
    check: &'static str,
    message: String,
    measured: String,
    limit: String,
}

/// The anchor of a plan in full.
pub(super) fn plan_anchor(entry: u64) -> String {
    format!("plan-{entry}")
}

/// The anchor of a beam's detail.
pub(super) fn beam_anchor(entry: u64, position: usize) -> String {
    format!("plan-{entry}-beam-{}", position + 1)
}

/// The positions of the beams whose detail is shown, in the plan's order.
pub(super) fn positions_in_full(plan: &PlanEntry, entry: u64) -> Vec<usize> {
    let mut order: Vec<Urgency> = plan
        .beams
        .iter()
        .enumerate()
        .map(|(position, beam)| urgency::of_beam(beam, entry, position))
        .collect();
    order.sort();
    order.truncate(BEAMS_IN_FULL);
    let mut positions: Vec<usize> = order.iter().map(|urgency| urgency.position).collect();
    positions.sort_unstable();
    positions
}

/// The view of a plan.
pub(super) fn view(plan: &PlanEntry, entry: u64) -> PlanView {
    let in_full = positions_in_full(plan, entry);
    let rows: Vec<BeamRowView> = plan
        .beams
        .iter()
        .enumerate()
        .map(|(position, beam)| {
            let has_detail = in_full.binary_search(&position).is_ok();
            beam_view::row(beam, beam_anchor(entry, position), has_detail)
        })
        .collect();
    let details = in_full
        .iter()
        .filter_map(|position| {
            let beam = plan.beams.get(*position)?;
            Some(beam_view::view(beam, &beam_anchor(entry, *position)))
        })
        .collect();
    let left_out = plan.beams.len() - in_full.len();
    let first_group = plan.beams.first().and_then(|beam| beam.fraction_group);
    PlanView {
        id: plan_anchor(entry),
        label: plan_name(plan),
        whole_label: plan
            .plan_label
            .clone()
            .filter(|label| !label.is_empty() && *label != plan_name(plan)),
        patient_id: text_or_dash(plan.patient_id.as_ref()),
        patient_name: plan.patient_name.clone(),
        file: plan.file.clone(),
        sha256: plan.sha256.clone(),
        sop_instance_uid: text_or_dash(plan.sop_instance_uid.as_ref()),
        approval: text_or_dash(plan.approval.as_ref()),
        machine: text_or_dash(plan.machine.as_ref()),
        fractions: plan
            .fractions
            .map_or_else(|| MISSING.to_owned(), |fractions| fractions.to_string()),
        prescription: plan.prescription_gy.map_or_else(
            || MISSING.to_owned(),
            |dose| format!("{} Gy", fixed(dose, 2)),
        ),
        worst_beam: plan.worst_beam_percent.map_or_else(
            || MISSING.to_owned(),
            |percent| format!("{} %", signed(percent, 1)),
        ),
        sum: plan.sum.as_ref().map(|sum| SumView {
            planned: fixed(sum.planned_dose_gy, 3),
            independent: fixed(sum.independent_dose_gy, 3),
            deviation: signed(sum.deviation_percent, 1),
        }),
        no_sum_reason: plan.no_sum_reason.clone(),
        status: status(plan.verdict),
        invented: plan.uses_invented_model,
        several_groups: plan
            .beams
            .iter()
            .any(|beam| beam.fraction_group != first_group),
        brackets: rows.iter().any(|row| row.no_verification),
        rows,
        details,
        details_left_out: (left_out > 0).then(|| {
            format!(
                "The detail of {} is left out here, the least urgent; audit.json has it.",
                counted(left_out as u64, "further beam", "further beams")
            )
        }),
        findings: findings(plan),
        findings_left_out: (plan.findings.len() > FINDINGS_SHOWN).then(|| {
            format!(
                "{} are left out here, the least severe; findings.csv has every one.",
                counted(
                    (plan.findings.len() - FINDINGS_SHOWN) as u64,
                    "further finding",
                    "further findings"
                )
            )
        }),
    }
}

/// The findings shown: all, or the most severe, in the plan's order.
fn findings(plan: &PlanEntry) -> Vec<FindingView> {
    let mut order: Vec<usize> = (0..plan.findings.len()).collect();
    order.sort_by_key(|place| {
        let severity = plan.findings.get(*place).map(|finding| finding.severity);
        (Reverse(severity), *place)
    });
    order.truncate(FINDINGS_SHOWN);
    order.sort_unstable();
    order
        .iter()
        .filter_map(|place| plan.findings.get(*place).map(finding_view))
        .collect()
}

fn finding_view(finding: &Finding) -> FindingView {
    let (class, words) = match finding.severity {
        Severity::Action => ("s-action", "action"),
        Severity::Tolerance => ("s-tolerance", "tolerance"),
        Severity::Note => ("s-none", "note"),
    };
    FindingView {
        severity: Status { class, words },
        beam: finding
            .beam_number
            .map_or_else(|| "plan".to_owned(), |number| format!("beam {number}")),
        check: finding.check,
        message: finding.message.clone(),
        measured: text_or_dash(finding.measured.as_ref()),
        limit: text_or_dash(finding.limit.as_ref()),
    }
}

/// What the one-line list says of a plan.
#[derive(Clone, Debug, serde::Serialize, serde::Deserialize)]
pub(super) struct PlanLine {
    pub(super) entry: u64,
    pub(super) label: String,
    pub(super) patient: String,
    pub(super) file: String,
    pub(super) machine: String,
    pub(super) beams: usize,
    pub(super) prescription: String,
    pub(super) worst_beam: String,
    pub(super) sum: String,
    pub(super) findings: usize,
    pub(super) verdict: String,
}

/// The line of a plan.
pub(super) fn line(plan: &PlanEntry, entry: u64) -> PlanLine {
    let clip = |text: &str| super::words::clipped(text, 60);
    PlanLine {
        entry,
        label: plan_name(plan),
        patient: clip(&text_or_dash(plan.patient_id.as_ref())),
        file: super::words::clipped(&plan.file, 120),
        machine: clip(&text_or_dash(plan.machine.as_ref())),
        beams: plan.beams.len(),
        prescription: fixed_or_dash(plan.prescription_gy, 2),
        worst_beam: signed_or_dash(plan.worst_beam_percent, 1),
        sum: signed_or_dash(plan.sum.as_ref().map(|sum| sum.deviation_percent), 1),
        findings: plan.findings.len(),
        verdict: plan.verdict.term().to_owned(),
    }
}
