//! The short summary on the terminal.

use std::io::{self, Write};
use std::path::Path;

use super::exit::{Completeness, Exit};
use super::fail_on::FailOn;
use crate::audit::{Count, Verdict};
use crate::batch::{Outcome, Tally};
use crate::settings::{Severity, SiteSource};

/// What the summary is about besides the outcome.
pub(super) struct About<'a> {
    /// Where the report is.
    pub(super) folder: &'a Path,
    /// Where the action levels came from.
    pub(super) site: &'a SiteSource,
    /// What the run was told to fail on.
    pub(super) fail_on: FailOn,
}

/// Writes the summary of an audit.
pub(super) fn write_summary(
    out: &mut dyn Write,
    outcome: &Outcome,
    exit: Exit,
    about: &About<'_>,
) -> io::Result<()> {
    let summary = &outcome.summary;
    let fail_on = about.fail_on;
    for (what, counts) in [
        ("plans", &summary.plans),
        ("beams", &summary.beams),
        ("findings", &summary.findings),
        ("files", &summary.files),
    ] {
        writeln!(out, "{what:<9} {}", counted(counts))?;
    }
    writeln!(out, "look at   {}", to_look_at(&outcome.tally))?;
    if !summary.invented_models.is_empty() {
        writeln!(
            out,
            "stamp     DEMONSTRATION DATA, NOT FOR CLINICAL USE: numbers rest on invented models ({})",
            summary.invented_models.join(", ")
        )?;
    }
    if !summary.unapproved_models.is_empty() {
        writeln!(
            out,
            "stamp     MODEL NOT APPROVED, or its approval is out of date: {}",
            summary.unapproved_models.join(", ")
        )?;
    }
    let levels = about.site.file.as_ref().map_or_else(
        || "built-in defaults, not this department's own (no site file)".to_owned(),
        |file| file.display().to_string(),
    );
    writeln!(out, "levels    {levels}")?;
    writeln!(
        out,
        "report    {} (opens with what needs a person, worst first)",
        about.folder.join("report.html").display()
    )?;
    writeln!(
        out,
        "exit      {}: {}",
        exit.status(),
        exit.of_level(fail_on)
    )?;
    let complete = Completeness::of_audit(&outcome.tally, &outcome.models);
    if exit == Exit::Beyond && complete == Completeness::Incomplete {
        writeln!(out, "          and 3: {}", Exit::Incomplete.meaning())?;
    }
    writeln!(
        out,
        "This supports and does not replace a qualified physicist's review, measurement, licensed practice and local rules."
    )
}

/// What a person has to look at, in counts.
fn to_look_at(tally: &Tally) -> String {
    let plans: u64 = [
        Verdict::BeyondAction,
        Verdict::NotVerifiable,
        Verdict::BeyondTolerance,
    ]
    .into_iter()
    .map(|verdict| tally.plans_with(verdict))
    .sum();
    let findings = tally.findings_of(Severity::Action) + tally.findings_of(Severity::Tolerance);
    let parts: Vec<String> = [
        (
            plans,
            "plan beyond a level or not verifiable",
            "plans beyond a level or not verifiable",
        ),
        (findings, "finding above a note", "findings above a note"),
        (
            tally.unreadable_plans(),
            "file that is or may be a plan and could not be read (files.csv)",
            "files that are or may be plans and could not be read (files.csv)",
        ),
    ]
    .into_iter()
    .filter(|(count, _, _)| *count > 0)
    .map(|(count, one, many)| format!("{count} {}", if count == 1 { one } else { many }))
    .collect();
    if parts.is_empty() {
        "nothing: no deviation beyond tolerance, nothing unverified, no finding above a note"
            .to_owned()
    } else {
        parts.join(", ")
    }
}

/// `40: 5 beyond-action, 35 within`.
fn counted(counts: &[Count]) -> String {
    if counts.is_empty() {
        return "none".to_owned();
    }
    let total: u64 = counts.iter().map(|count| count.count).sum();
    let words: Vec<String> = counts
        .iter()
        .map(|count| format!("{} {}", count.count, count.term))
        .collect();
    format!("{total}: {}", words.join(", "))
}
