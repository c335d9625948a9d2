//! The files of `sample-plans/` are exactly what this module builds, byte for
//! byte, and the README there lists them. With COUNTERFOIL_WRITE_SAMPLES=1 the
//! test writes the files instead; the README's rows are printed when one is missing.

use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::path::{Path, PathBuf};

use super::all;

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-plans")
}

/// Every `.dcm` file there, by path relative to the folder.
fn files() -> BTreeMap<String, PathBuf> {
    walkdir::WalkDir::new(folder())
        .into_iter()
        .map(|entry| entry.expect("sample-plans can be walked").into_path())
        .filter(|path| path.extension().is_some_and(|end| end == "dcm"))
        .map(|path| {
            let inside = path.strip_prefix(folder()).expect("in the folder");
            let parts: Vec<&str> = inside.iter().filter_map(|part| part.to_str()).collect();
            (parts.join("/"), path)
        })
        .collect()
}

fn write_all() {
    for path in files().values() {
        fs::remove_file(path).expect("an old file can go");
    }
    for sample in all() {
        let path = folder().join(&sample.path);
        fs::create_dir_all(path.parent().expect("a folder")).expect("folder made");
        fs::write(&path, sample.bytes()).expect("written");
    }
}

#[test]
fn verify_sample_files_are_what_is_built_here() {
    if std::env::var_os("COUNTERFOIL_WRITE_SAMPLES").is_some_and(|value| value == "1") {
        write_all();
    }
    let files = files();
    let samples = all();
    let built: BTreeSet<&str> = samples.iter().map(|sample| sample.path.as_str()).collect();
    assert_eq!(built.len(), samples.len(), "two samples of one name");
    let there: BTreeSet<&str> = files.keys().map(String::as_str).collect();
    assert_eq!(there, built, "extra or missing files");
    for sample in &samples {
        let bytes = fs::read(&files[&sample.path]).expect("readable");
        assert!(
            bytes == sample.bytes(),
            "{} is not what is built: see sample-plans/README.md",
            sample.path
        );
    }
}

#[test]
fn verify_samples_are_distinct_plans_of_distinct_patients() {
    let samples = all();
    let distinct = |of: fn(&super::Sample) -> String| -> usize {
        samples.iter().map(of).collect::<BTreeSet<_>>().len()
    };
    assert_eq!(
        distinct(|sample| sample.spec.sop_instance_uid()),
        samples.len()
    );
    assert_eq!(
        distinct(|sample| sample.spec.patient_id.clone()),
        samples.len()
    );
    assert_eq!(
        distinct(|sample| sample.spec.patient_name.clone()),
        samples.len()
    );
}

#[test]
fn verify_the_readme_lists_every_sample() {
    let readme = fs::read_to_string(folder().join("README.md")).expect("README.md");
    let listed: Vec<&str> = readme
        .lines()
        .filter(|line| line.contains(".dcm` |"))
        .collect();
    let wanted: Vec<String> = all().iter().map(super::Sample::readme_row).collect();
    assert_eq!(listed, wanted, "the rows must be:\n{}", wanted.join("\n"));
}
