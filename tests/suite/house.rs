//! The order of the house, read from the sources: stages use only earlier
//! stages, and what DEVELOPERS.md says is absent really is.

use std::fs;
use std::path::{Path, PathBuf};

/// The stages in order; a file may use its own stage and those before it.
const STAGES: &[&str] = &[
    "quantity",
    "settings",
    "intake",
    "plan",
    "beam_model",
    "dose",
    "audit",
    "report",
    "batch",
    "cli",
];

struct Source {
    path: PathBuf,
    stage: Option<usize>,
    text: String,
}

fn sources() -> Vec<Source> {
    let src = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    walkdir::WalkDir::new(&src)
        .sort_by_file_name()
        .into_iter()
        .map(Result::unwrap)
        .filter(|entry| entry.path().extension().is_some_and(|end| end == "rs"))
        .map(|entry| {
            let inside = entry.path().strip_prefix(&src).unwrap();
            let first = inside.iter().next().unwrap().to_str().unwrap();
            Source {
                path: inside.to_path_buf(),
                stage: STAGES.iter().position(|stage| *stage == first),
                text: fs::read_to_string(entry.path()).unwrap(),
            }
        })
        .collect()
}

/// Every stage named by a `crate::` path of a text, also inside braces.
fn stages_used(text: &str) -> Vec<usize> {
    let mut used = Vec::new();
    for (at, _) in text.match_indices("crate::") {
        let rest = &text[at + "crate::".len()..];
        let names: Vec<&str> = if let Some(braces) = rest.strip_prefix('{') {
            let end = braces.find("};").unwrap_or(braces.len());
            braces[..end].split([',', '\n', ' ']).collect()
        } else {
            vec![rest]
        };
        for name in names {
            let end = name
                .find(|c: char| !c.is_alphanumeric() && c != '_')
                .unwrap_or(name.len());
            if let Some(stage) = STAGES.iter().position(|stage| *stage == &name[..end]) {
                used.push(stage);
            }
        }
    }
    used
}

#[test]
fn verify_no_stage_uses_a_later_one() {
    let mut seen = 0;
    for source in sources() {
        let Some(stage) = source.stage else {
            continue;
        };
        seen += 1;
        for used in stages_used(&source.text) {
            assert!(
                used <= stage,
                "{}: {} uses {}, a later stage",
                source.path.display(),
                STAGES[stage],
                STAGES[used]
            );
        }
    }
    assert!(seen > 50, "only {seen} files were looked at");
}

#[test]
fn verify_the_order_test_can_fail() {
    assert_eq!(stages_used("use crate::cli::run;"), [9]);
    assert_eq!(stages_used("use crate::{dose::Trace, plan::Plan};"), [5, 3]);
}

#[test]
fn verify_only_cli_prints_or_reads_the_environment_and_the_clock() {
    let forbidden = [
        "println!",
        "eprintln!",
        "print!(",
        "dbg!",
        "std::env",
        "env::var",
        "::now()",
        "process::exit",
        "stdout()",
        "stderr()",
    ];
    for source in sources() {
        let in_cli = source.path.starts_with("cli") || source.path == Path::new("main.rs");
        for word in forbidden.into_iter().filter(|_| !in_cli) {
            assert!(
                !source.text.contains(word),
                "{} holds {word}",
                source.path.display()
            );
        }
    }
}

#[test]
fn verify_only_plan_dicom_knows_dicom_crates() {
    for source in sources() {
        let in_reader = source.path.starts_with("plan/dicom");
        let names_one = ["dicom_core", "dicom_encoding", "dicom_dictionary_std"]
            .into_iter()
            .find(|name| source.text.contains(name));
        assert!(
            in_reader || names_one.is_none(),
            "{} names {}",
            source.path.display(),
            names_one.unwrap_or_default()
        );
    }
}

#[test]
fn verify_the_calculation_does_no_input_or_output() {
    let pure = ["dose", "audit", "quantity"];
    for source in sources() {
        let is_pure = pure.iter().any(|stage| source.path.starts_with(stage));
        for word in ["std::fs", "std::io", "std::net", "File::"] {
            assert!(
                !(is_pure && source.text.contains(word)),
                "{} holds {word}",
                source.path.display()
            );
        }
    }
}

#[test]
fn verify_every_file_opens_with_what_it_owns() {
    for source in sources() {
        assert!(
            source.text.starts_with("//!"),
            "{} does not open with //!",
            source.path.display()
        );
    }
}

#[test]
fn verify_main_is_short() {
    let main = sources()
        .into_iter()
        .find(|source| source.path == Path::new("main.rs"))
        .unwrap();
    assert!(main.text.lines().count() < 20);
}

#[test]
fn verify_the_readme_lists_every_plan_check_as_it_is() {
    let readme = include_str!("../../README.md");
    let mut rows: Vec<String> = counterfoil::audit::checks::CHECKS
        .iter()
        .map(|check| {
            let looks = check
                .text
                .lines()
                .find_map(|line| line.trim().strip_prefix("What it looks at: "))
                .unwrap()
                .trim_end_matches('.');
            format!("| `{}` | {} | {looks} |", check.name, check.severity.term())
        })
        .collect();
    let mut found: Vec<&str> = readme
        .lines()
        .skip_while(|line| *line != "## Plan checks")
        .filter(|line| line.starts_with("| `"))
        .collect();
    rows.sort_unstable();
    found.sort_unstable();
    assert_eq!(found, rows);
}
