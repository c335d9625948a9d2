//! Beam models: what the loader accepts and refuses, the TG-71 data set, the
//! shipped models, the published kernel, interpolation.

mod damaged;
mod interpolation;
mod kernel;
mod loader;
mod page;
mod planted;
mod shipped;
mod tg71;
mod wedges;

use std::path::{Path, PathBuf};

use counterfoil::beam_model::{BeamModel, MachineModel, load_machine, load_models};

/// The models that the project ships.
fn shipped_folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("beam-models")
}

/// The models that only tests use.
fn test_folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/models")
}

/// Every shipped machine.
fn shipped_machines() -> Vec<MachineModel> {
    load_models(&shipped_folder()).unwrap().machines
}

/// The beam of one of the TG-71 test models.
fn tg71_beam(model: &str) -> BeamModel {
    let machine = load_machine(&test_folder().join(model)).unwrap();
    machine.beams.into_iter().next().unwrap()
}

/// A copy of a test model in a folder of its own, to be spoilt.
fn copy_of(model: &str) -> tempfile::TempDir {
    let copy = tempfile::tempdir().unwrap();
    copy_folder(&test_folder().join(model), copy.path());
    copy
}

fn copy_folder(from: &Path, to: &Path) {
    std::fs::create_dir_all(to).unwrap();
    for entry in std::fs::read_dir(from).unwrap() {
        let entry = entry.unwrap();
        let target = to.join(entry.file_name());
        if entry.path().is_dir() {
            copy_folder(&entry.path(), &target);
        } else {
            std::fs::copy(entry.path(), target).unwrap();
        }
    }
}

/// Replaces a text in a file of a copied model; the text must be there exactly once.
fn edit(copy: &tempfile::TempDir, file: &str, old: &str, new: &str) {
    let path = copy.path().join(file);
    let text = std::fs::read_to_string(&path).unwrap();
    assert_eq!(text.matches(old).count(), 1, "{old} in {file}");
    std::fs::write(path, text.replace(old, new)).unwrap();
}
