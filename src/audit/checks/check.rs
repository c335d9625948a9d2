//! What a plan check is: a name in plain words, a severity, a text that is its
//! doc comment, and a function that looks. The list of checks is in `registry`.

use crate::audit::{BeamEntry, Rivals};
use crate::dose::ObstacleKind;
use crate::plan::{NoteKind, NoteScope, Plan, ReadingNote};
use crate::settings::{Severity, Site};

/// What a check may look at.
#[derive(Clone, Copy, Debug)]
pub struct CheckInput<'a> {
    /// The plan with its reading notes.
    pub plan: &'a Plan,
    /// Its beams as audited.
    pub beams: &'a [BeamEntry],
    /// Other files with the same SOP Instance UID and different content.
    pub rivals: &'a Rivals,
    /// The site's rules.
    pub site: &'a Site,
}

/// What a check saw; the registry adds name and severity.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Observation {
    /// Beam number, when it is about one beam.
    pub beam_number: Option<i32>,
    /// What is there and what to do.
    pub message: String,
    /// What was found.
    pub measured: Option<String>,
    /// What was expected.
    pub limit: Option<String>,
}

impl Observation {
    /// The obstacles of one kind over all beams.
    pub(super) fn from_obstacles(input: &CheckInput<'_>, kind: ObstacleKind) -> Vec<Self> {
        let of_entry = |entry: &BeamEntry| {
            let beam_number = entry.beam_number;
            let of_kind = entry.calculation.obstacles.clone();
            of_kind
                .into_iter()
                .filter(move |obstacle| obstacle.kind == kind)
                .map(move |obstacle| Self {
                    beam_number,
                    message: obstacle.message,
                    ..Self::default()
                })
        };
        input.beams.iter().flat_map(of_entry).collect()
    }
}

/// A plan check.
#[derive(Clone, Copy, Debug)]
pub struct Check {
    /// Name: plain words with hyphens.
    pub name: &'static str,
    /// Built-in severity.
    pub severity: Severity,
    /// The text shown to users: what it looks at, why it matters, when it stays silent, what to do, source.
    pub text: &'static str,
    /// Looks, and reports what it saw.
    pub look: fn(&CheckInput<'_>) -> Vec<Observation>,
    /// A plan on which it fires, and one close by on which it is silent.
    #[cfg(test)]
    pub(super) examples: [fn() -> super::example::Example; 2],
}

/// Defines `CHECK` of a module: the doc comment is the text that users read.
macro_rules! check {
    ($(#[doc = $line:literal])+ $name:literal, $severity:ident, $look:expr, fires on $fires:expr, silent on $silent:expr) => {
        $(#[doc = $line])+
        pub(super) const CHECK: crate::audit::checks::check::Check = crate::audit::checks::check::Check {
            name: $name,
            severity: crate::settings::Severity::$severity,
            text: concat!($($line, "\n"),+),
            look: $look,
            #[cfg(test)]
            examples: [$fires, $silent],
        };
    };
}
pub(super) use check;

/// The plan's reading notes of one kind, as observations.
pub(super) fn from_notes(input: &CheckInput<'_>, kind: NoteKind) -> Vec<Observation> {
    from_notes_where(input, kind, |_| true)
}

/// The plan's reading notes of one kind that meet a condition, as observations.
pub(super) fn from_notes_where(
    input: &CheckInput<'_>,
    kind: NoteKind,
    wanted: impl Fn(&ReadingNote) -> bool,
) -> Vec<Observation> {
    input
        .plan
        .notes
        .iter()
        .filter(|note| note.kind == kind && wanted(note))
        .map(|note| observation(input.plan, note))
        .collect()
}

fn observation(plan: &Plan, note: &ReadingNote) -> Observation {
    let beam_number = match note.scope {
        NoteScope::Beam(index) => plan.beams.get(index).and_then(|beam| beam.number.get()),
        NoteScope::Plan | NoteScope::FractionGroup(_) => None,
    };
    Observation {
        beam_number,
        message: format!("{}; at {}", note.message, note.place),
        measured: note.measured.clone(),
        limit: note.limit.clone(),
    }
}
