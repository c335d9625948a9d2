//! Words of the page: statuses with their label style, clipped one-liners,
//! the sentence on how a beam was judged.

use crate::audit::{BeamEntry, Judgement, Verdict};
use crate::report::number::{short, signed};

/// A status: words, and the style of its label (a class of the style sheet).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Status {
    pub(super) class: &'static str,
    pub(super) words: &'static str,
}

/// A verdict as the page names it.
pub(super) const fn status(verdict: Verdict) -> Status {
    let (class, words) = match verdict {
        Verdict::BeyondAction => ("s-action", "beyond action level"),
        Verdict::NotVerifiable => ("s-open", "not verifiable"),
        Verdict::BeyondTolerance => ("s-tolerance", "beyond tolerance"),
        Verdict::Within => ("s-within", "within tolerance"),
        Verdict::NotTreated => ("s-none", "not treated"),
        Verdict::NotApplicable => ("s-none", "no treatment beam"),
    };
    Status { class, words }
}

/// The class of a verdict's words in the summary, by the word used in outputs.
pub(super) fn status_of_term(term: &str) -> Option<Status> {
    [
        Verdict::BeyondAction,
        Verdict::NotVerifiable,
        Verdict::BeyondTolerance,
        Verdict::Within,
        Verdict::NotTreated,
        Verdict::NotApplicable,
    ]
    .into_iter()
    .find(|verdict| verdict.term() == term)
    .map(status)
}

/// Whether the beam's number is a result that was judged.
pub(super) const fn is_result(verdict: Verdict) -> bool {
    matches!(
        verdict,
        Verdict::Within | Verdict::BeyondTolerance | Verdict::BeyondAction
    )
}

/// A text for one line: at most so many characters.
pub(super) fn clipped(text: &str, most: usize) -> String {
    if text.chars().count() <= most {
        return text.to_owned();
    }
    let kept: String = text.chars().take(most.saturating_sub(1)).collect();
    format!("{}\u{2026}", kept.trim_end())
}

/// How a beam was judged, in a sentence.
pub(super) fn judgement(beam: &BeamEntry) -> String {
    let levels = match (beam.tolerance_percent, beam.action_percent) {
        (Some(tolerance), Some(action)) => format!(
            "tolerance {} %, action level {} %",
            short(tolerance, 2),
            short(action, 2)
        ),
        _ => "no levels".to_owned(),
    };
    match &beam.judgement {
        None => "Not judged.".to_owned(),
        Some(Judgement::Alone) => format!("Judged on its own: {levels}."),
        Some(Judgement::ShareOfTotal {
            share_percent,
            percent_of_total,
        }) => format!(
            "The beam adds {} % of the planned dose at the shared point; its difference is {} % of the total, and this was judged: {levels}.",
            short(*share_percent, 2),
            signed(*percent_of_total, 2)
        ),
        Some(Judgement::FractionSum {
            sum_deviation_percent,
        }) => format!(
            "The plan states doses for the fraction as a whole; the sum over its beams deviates by {} %, and this was judged: {levels}.",
            signed(*sum_deviation_percent, 2)
        ),
    }
}

/// `1 thing`, `2 things`.
pub(super) fn counted(count: u64, one: &str, many: &str) -> String {
    let name = if count == 1 { one } else { many };
    format!("{count} {name}")
}
