//! The program as a user runs it: exit statuses, outputs, options, and fields
//! typed by hand.

mod audit;
mod field;
mod model;
mod read;
mod readme;

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use crate::builder::PlanSpec;

/// A folder of its own for one test, with plans in it and the report beside them.
struct Place {
    folder: tempfile::TempDir,
}

impl Place {
    fn new() -> Self {
        let folder = tempfile::tempdir().unwrap();
        fs::create_dir(folder.path().join("plans")).unwrap();
        Self { folder }
    }

    fn with(self, name: &str, spec: &PlanSpec) -> Self {
        self.put(name, &spec.bytes());
        self
    }

    fn put(&self, name: &str, bytes: &[u8]) {
        fs::write(self.plans().join(name), bytes).unwrap();
    }

    fn plans(&self) -> PathBuf {
        self.folder.path().join("plans")
    }

    fn report(&self) -> PathBuf {
        self.folder.path().join("report")
    }

    /// The audit of the plans with the test models and these further options.
    fn audit(&self, options: &[&str]) -> Output {
        let mut command = program();
        command
            .arg("audit")
            .arg(self.plans())
            .arg("--models")
            .arg(test_models())
            .arg("--out")
            .arg(self.report())
            .args(options);
        command.output().unwrap()
    }

    fn table(&self, name: &str) -> Vec<Vec<String>> {
        csv::ReaderBuilder::new()
            .from_path(self.report().join(name))
            .unwrap()
            .records()
            .map(|record| record.unwrap().iter().map(str::to_owned).collect())
            .collect()
    }

    fn column(&self, table: &str, column: &str) -> Vec<String> {
        let mut reader = csv::Reader::from_path(self.report().join(table)).unwrap();
        let at = reader
            .headers()
            .unwrap()
            .iter()
            .position(|name| name == column)
            .unwrap();
        self.table(table)
            .into_iter()
            .map(|row| row[at].clone())
            .collect()
    }
}

/// The built program, with a fixed clock and nothing of the user's own settings.
fn program() -> Command {
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("counterfoil"));
    command
        .env("SOURCE_DATE_EPOCH", "1796083200")
        .env("XDG_CONFIG_HOME", "/nonexistent")
        .env_remove("COUNTERFOIL_MODELS")
        .env_remove("COUNTERFOIL_SITE");
    command
}

fn test_models() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/models")
}

fn status(output: &Output) -> i32 {
    output.status.code().expect("ended by itself")
}

fn stdout(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}

fn stderr(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

/// One beam under the reference conditions of the TG-71 data set: 100 MU give 0.8 Gy by definition.
fn reference_plan(root: &str) -> PlanSpec {
    PlanSpec::default()
        .with_uid_root(root)
        .map_beam(|beam| beam.with_machine("TG71-TPR"))
        .with_beam_dose(0.8)
}
