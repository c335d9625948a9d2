//! The short summary on the terminal.

use std::io::{self, Write};
use std::path::Path;

use super::exit::Exit;
use crate::audit::Count;
use crate::batch::Outcome;

/// Writes the summary of an audit.
pub(super) fn write_summary(
    out: &mut dyn Write,
    outcome: &Outcome,
    folder: &Path,
    exit: Exit,
) -> io::Result<()> {
    let summary = &outcome.summary;
    for (what, counts) in [
        ("files", &summary.files),
        ("plans", &summary.plans),
        ("beams", &summary.beams),
        ("findings", &summary.findings),
    ] {
        writeln!(out, "{what:<9} {}", counted(counts))?;
    }
    if summary.unreadable_plans > 0 {
        writeln!(
            out,
            "{} file(s) that are or may be plans could not be read: see files.csv",
            summary.unreadable_plans
        )?;
    }
    if !summary.invented_models.is_empty() {
        writeln!(
            out,
            "demonstration data, not for clinical use: invented model(s) {}",
            summary.invented_models.join(", ")
        )?;
    }
    if !summary.unapproved_models.is_empty() {
        writeln!(
            out,
            "not approved, or approval out of date: model(s) {}",
            summary.unapproved_models.join(", ")
        )?;
    }
    writeln!(out, "report    {}", folder.join("report.html").display())?;
    writeln!(out, "exit      {}: {}", exit.status(), exit.meaning())?;
    if exit == Exit::Beyond && !summary.complete {
        writeln!(out, "          and 3: {}", Exit::Incomplete.meaning())?;
    }
    writeln!(
        out,
        "This supports and does not replace a qualified physicist's review, measurement and local rules."
    )
}

fn counted(counts: &[Count]) -> String {
    if counts.is_empty() {
        return "none".to_owned();
    }
    let words: Vec<String> = counts
        .iter()
        .map(|count| format!("{} {}", count.count, count.term))
        .collect();
    words.join(", ")
}
