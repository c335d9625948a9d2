//! What the builder writes conforms to the standard, where a conformance
//! checker is installed.

use std::process::Command;

use super::plans::{big_arcs, everything};
use crate::builder::PlanSpec;

/// `dciodvfy` prints `Error` lines for violations of the IOD.
fn errors(spec: &PlanSpec) -> Vec<String> {
    let file = tempfile::NamedTempFile::new().expect("temporary file");
    std::fs::write(file.path(), spec.bytes()).expect("written");
    let Ok(output) = Command::new("dciodvfy").arg(file.path()).output() else {
        println!("dciodvfy is not installed: conformance not checked here");
        return Vec::new();
    };
    String::from_utf8_lossy(&output.stderr)
        .lines()
        .filter(|line| line.contains("Error"))
        .map(str::to_owned)
        .collect()
}

#[test]
fn verify_built_plans_conform() {
    for spec in [
        PlanSpec::default(),
        PlanSpec::default()
            .with_second_group(5, 80.0, 0.8)
            .with_setup_beam(8),
        everything(),
        big_arcs(),
    ] {
        assert_eq!(errors(&spec), [""; 0], "{}", spec.label);
    }
}

/// The same specification gives the same bytes.
#[test]
fn property_building_is_deterministic() {
    assert_eq!(everything().bytes(), everything().bytes());
}
