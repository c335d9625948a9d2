//! A model check as plain text. The findings come from `beam_model`; printing
//! and the exit status are the work of `cli`.

use std::fmt::Write;

use crate::beam_model::{MachineModel, ModelFinding, ModelSeverity};

/// What the check of one model found: the model first, then errors, warnings and notes, each in table order, and their count.
#[must_use]
pub fn model_check_text(machine: &MachineModel, findings: &[ModelFinding]) -> String {
    let mut text = String::new();
    let _ = writeln!(
        text,
        "model {}: serves {}",
        machine.name,
        machine.serves.join(", ")
    );
    let _ = writeln!(text, "  fingerprint {}", machine.fingerprint);
    let mut counts = Vec::new();
    for (severity, plural) in [
        (ModelSeverity::Error, "errors"),
        (ModelSeverity::Warning, "warnings"),
        (ModelSeverity::Note, "notes"),
    ] {
        let of_severity = findings
            .iter()
            .filter(|finding| finding.severity == severity);
        let mut count = 0;
        for finding in of_severity {
            count += 1;
            let _ = writeln!(text, "  {finding}");
        }
        counts.push(format!("{plural} {count}"));
    }
    let _ = writeln!(text, "  {}", counts.join(", "));
    text
}
