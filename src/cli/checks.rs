//! `counterfoil checks`.

use std::io::Write;

use super::exit::Exit;
use crate::audit::checks::CHECKS;

/// Lists the plan checks with their texts.
pub(super) fn run(out: &mut dyn Write) -> anyhow::Result<Exit> {
    for check in CHECKS {
        writeln!(out, "{} ({})", check.name, check.severity.term())?;
        for line in check.text.lines().filter(|line| !line.trim().is_empty()) {
            writeln!(out, "   {line}")?;
        }
        writeln!(out)?;
    }
    Ok(Exit::Within)
}
