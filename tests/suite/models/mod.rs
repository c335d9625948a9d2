//! Beam models: what the loader accepts and refuses, the TG-71 data set, the shipped models.

mod shipped;

use std::path::PathBuf;

/// The models that the project ships.
fn shipped_folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("beam-models")
}

/// The models that only tests use.
fn test_folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/models")
}
