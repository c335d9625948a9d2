//! The README shows what the program really prints.

use std::path::Path;

use super::{program, status, stdout};

const README: &str = include_str!("../../../README.md");

/// What is printed, as the README shows it: four spaces before each line.
fn shown(text: &str) -> String {
    let lines: Vec<String> = text
        .trim_end()
        .lines()
        .map(|line| format!("    {line}").trim_end().to_owned())
        .collect();
    lines.join("\n")
}

fn assert_shown(text: &str) {
    let readme: Vec<&str> = README.lines().map(str::trim_end).collect();
    assert!(
        readme.join("\n").contains(&shown(text)),
        "README.md does not show what is printed now:\n{}",
        shown(text)
    );
}

#[test]
fn verify_the_summary_of_the_sample_plans() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let folder = tempfile::tempdir().unwrap();
    let report = folder.path().join("report");
    let output = program()
        .current_dir(root)
        .args(["audit", "sample-plans", "--out"])
        .arg(&report)
        .output()
        .unwrap();
    assert_eq!(status(&output), 1, "because of the faulty plans");
    let usual = "counterfoil-report";
    assert_shown(&stdout(&output).replace(report.to_str().unwrap(), usual));
}

#[test]
fn verify_the_field_by_hand() {
    let line = README
        .lines()
        .find_map(|line| line.trim().strip_prefix("$ counterfoil field "))
        .unwrap();
    let output = program()
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .arg("field")
        .args(line.split_whitespace())
        .output()
        .unwrap();
    assert_eq!(status(&output), 0);
    assert_shown(&stdout(&output));
}
