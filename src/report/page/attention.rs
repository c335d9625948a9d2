//! One line for each thing that needs a person.

use super::urgency::{self, Class, Urgency, Worst};
use super::words::{Status, clipped, is_result, status};
use crate::audit::{BeamEntry, FileEntry, FileOutcome, PlanEntry};
use crate::report::number::{MISSING, signed, text_or_dash};
use crate::report::table::judged_percent;
use crate::settings::Severity;

/// A line, in finished strings.
#[derive(Clone, Debug)]
pub(super) struct AttentionLine {
    pub(super) status: Status,
    pub(super) plan: String,
    pub(super) patient: String,
    pub(super) beam: String,
    pub(super) machine: String,
    pub(super) deviation: String,
    /// The deviation is a number that verifies nothing.
    pub(super) no_verification: bool,
    pub(super) why: String,
    /// Running number of the plan; `None` for a file without one.
    pub(super) entry: Option<u64>,
    /// Position of the beam in the plan.
    pub(super) beam_position: Option<usize>,
}

const REASON_LENGTH: usize = 260;
const NAME_LENGTH: usize = 48;

/// Offers the lines of a plan.
pub(super) fn offer_plan(lines: &mut Worst<AttentionLine>, plan: &PlanEntry, entry: u64) {
    let mut worst_beam = Class::Calm;
    for (position, beam) in plan.beams.iter().enumerate() {
        let urgency = urgency::of_beam(beam, entry, position);
        worst_beam = worst_beam.min(urgency.class);
        if urgency.class != Class::Calm {
            lines.offer(urgency, || beam_line(plan, beam, entry, position));
        }
    }
    let by_verdict = urgency::of_verdict(plan.verdict);
    if by_verdict < worst_beam {
        // The plan as a whole is worse than each of its beams: two files of one UID, no beam read.
        let urgency = Urgency::new(by_verdict, entry, plan.beams.len());
        lines.offer(urgency, || plan_line(plan, entry));
    }
    let by_findings = urgency::of_findings(plan);
    if by_findings != Class::Calm {
        let urgency = Urgency::new(by_findings, entry, plan.beams.len() + 1);
        lines.offer(urgency, || finding_line(plan, entry));
    }
}

/// Whether a file is a plan, or may be one, that could not be read.
pub(super) fn is_unreadable_plan(file: &FileEntry) -> bool {
    file.outcome == FileOutcome::Unreadable && matches!(file.kind, None | Some("plan"))
}

/// The line of a plan file that could not be read.
pub(super) fn file_line(file: &FileEntry) -> AttentionLine {
    AttentionLine {
        status: Status {
            class: "s-open",
            words: "unreadable",
        },
        plan: clipped(&file.file, 2 * NAME_LENGTH),
        patient: MISSING.to_owned(),
        beam: MISSING.to_owned(),
        machine: MISSING.to_owned(),
        deviation: MISSING.to_owned(),
        no_verification: false,
        why: clipped(&file.message, REASON_LENGTH),
        entry: None,
        beam_position: None,
    }
}

fn plan_line(plan: &PlanEntry, entry: u64) -> AttentionLine {
    AttentionLine {
        status: status(plan.verdict),
        plan: plan_name(plan),
        patient: clipped(&text_or_dash(plan.patient_id.as_ref()), NAME_LENGTH),
        beam: "plan".to_owned(),
        machine: clipped(&text_or_dash(plan.machine.as_ref()), NAME_LENGTH),
        deviation: MISSING.to_owned(),
        no_verification: false,
        why: plan
            .findings
            .iter()
            .max_by_key(|finding| finding.severity)
            .map_or_else(
                || "The plan as a whole; see its detail.".to_owned(),
                |finding| clipped(&finding.message, REASON_LENGTH),
            ),
        entry: Some(entry),
        beam_position: None,
    }
}

fn finding_line(plan: &PlanEntry, entry: u64) -> AttentionLine {
    let worst = plan
        .findings
        .iter()
        .map(|finding| finding.severity)
        .max()
        .unwrap_or(Severity::Note);
    let of_that = || {
        plan.findings
            .iter()
            .filter(move |finding| finding.severity == worst)
    };
    let why = of_that().next().map_or_else(String::new, |finding| {
        let more = of_that().count().saturating_sub(1);
        let first = clipped(&finding.message, REASON_LENGTH);
        if more == 0 {
            format!("{}: {first}", finding.check)
        } else {
            format!("{}: {first} (and {more} more)", finding.check)
        }
    });
    let status = if worst == Severity::Action {
        Status {
            class: "s-action",
            words: "finding: action",
        }
    } else {
        Status {
            class: "s-tolerance",
            words: "finding: tolerance",
        }
    };
    AttentionLine {
        status,
        why,
        ..plan_line(plan, entry)
    }
}

fn beam_line(plan: &PlanEntry, beam: &BeamEntry, entry: u64, position: usize) -> AttentionLine {
    let deviation = match (judged_percent(beam), beam.deviation_percent) {
        (Some(percent), _) if is_result(beam.verdict) => format!("{} %", signed(percent, 1)),
        (_, Some(percent)) => format!("[{} %]", signed(percent, 1)),
        _ => MISSING.to_owned(),
    };
    let why = match beam.reasons.as_slice() {
        [] => String::new(),
        [only] => clipped(only, REASON_LENGTH),
        [first, rest @ ..] => format!(
            "{} (and {} more)",
            clipped(first, REASON_LENGTH),
            rest.len()
        ),
    };
    AttentionLine {
        status: status(beam.verdict),
        beam: beam_name(beam),
        machine: clipped(&text_or_dash(beam.machine.as_ref()), NAME_LENGTH),
        no_verification: !is_result(beam.verdict) && beam.deviation_percent.is_some(),
        deviation,
        why,
        beam_position: Some(position),
        ..plan_line(plan, entry)
    }
}

/// A plan's label, or its file when it has none.
pub(super) fn plan_name(plan: &PlanEntry) -> String {
    let label = plan.plan_label.as_ref().filter(|label| !label.is_empty());
    clipped(label.unwrap_or(&plan.file), NAME_LENGTH)
}

/// `2 LAO`, with the fraction group when it is not the first.
pub(super) fn beam_name(beam: &BeamEntry) -> String {
    let number = beam
        .beam_number
        .map_or_else(|| "no number".to_owned(), |number| number.to_string());
    let name = beam.beam_name.as_deref().unwrap_or_default();
    clipped(format!("{number} {name}").trim_end(), NAME_LENGTH)
}
