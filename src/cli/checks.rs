//! `counterfoil checks`.

use std::io::Write;

use super::exit::Exit;
use crate::audit::checks::CHECKS;

/// Lines are wrapped at this width.
const WIDTH: usize = 96;
const INDENT: &str = "    ";

const HEAD: &str = "\
Severity of a finding: action (act before treatment), tolerance (look into it),
note (to know). The site file can change a check's severity or switch it off.";

/// Lists the plan checks with their texts.
pub(super) fn run(out: &mut dyn Write) -> anyhow::Result<Exit> {
    writeln!(out, "{} plan checks\n{HEAD}\n", CHECKS.len())?;
    for check in CHECKS {
        writeln!(out, "{}  [{}]", check.name, check.severity.term())?;
        for line in check.text.lines().filter(|line| !line.trim().is_empty()) {
            for line in wrapped(line) {
                writeln!(out, "{line}")?;
            }
        }
        writeln!(out)?;
    }
    Ok(Exit::Within)
}

/// A paragraph in lines of the width, those after the first indented further.
fn wrapped(text: &str) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = INDENT.to_owned();
    let mut fresh = true;
    for word in text.split_whitespace() {
        if !fresh && line.chars().count() + 1 + word.chars().count() > WIDTH {
            lines.push(std::mem::replace(&mut line, format!("{INDENT}  ")));
            fresh = true;
        }
        if !fresh {
            line.push(' ');
        }
        line.push_str(word);
        fresh = false;
    }
    lines.push(line);
    lines
}

#[cfg(test)]
mod tests {
    use super::{WIDTH, wrapped};

    #[test]
    fn verify_paragraphs_are_wrapped_and_lose_no_word() {
        let text = "jaw and leaf positions ".repeat(20);
        let lines = wrapped(&text);
        assert!(lines.len() > 3);
        assert!(lines.iter().all(|line| line.chars().count() <= WIDTH));
        let again: Vec<&str> = lines
            .iter()
            .flat_map(|line| line.split_whitespace())
            .collect();
        assert_eq!(again, text.split_whitespace().collect::<Vec<_>>());
    }
}
