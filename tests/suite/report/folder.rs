//! Whole or not at all, and never into somebody else's folder.

use std::fs;

use counterfoil::report::{REPORT_FILES, ReportWriter, TargetState, target_state};

use super::sample::{self, Folder};

fn names(folder: &std::path::Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .unwrap()
        .map(|item| item.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    names
}

#[test]
fn verify_two_runs_are_equal_byte_for_byte() {
    let (one, other) = (Folder::new(), Folder::new());
    sample::write(&one.path(), 2, &sample::plans());
    sample::write(&other.path(), 2, &sample::plans());
    for name in REPORT_FILES {
        assert_eq!(
            fs::read(one.path().join(name)).unwrap(),
            fs::read(other.path().join(name)).unwrap(),
            "{name}"
        );
    }
}

#[test]
fn verify_finish_writes_six_files_and_nothing_else() {
    let folder = Folder::new();
    let written = sample::write(&folder.path(), 2, &sample::plans());
    let mut expected: Vec<String> = REPORT_FILES.iter().map(|name| (*name).to_owned()).collect();
    assert_eq!(
        written.files.last().unwrap(),
        &folder.path().join("audit.json")
    );
    expected.sort();
    assert_eq!(names(&folder.path()), expected);
}

#[cfg(unix)]
#[test]
fn verify_only_the_owner_can_read() {
    use std::os::unix::fs::PermissionsExt;
    let folder = Folder::new();
    sample::write(&folder.path(), 2, &sample::plans());
    let mode = |path: &std::path::Path| fs::metadata(path).unwrap().permissions().mode() & 0o777;
    assert_eq!(mode(&folder.path()), 0o700);
    for name in REPORT_FILES {
        assert_eq!(mode(&folder.path().join(name)), 0o600, "{name}");
    }
}

#[test]
fn verify_dropping_leaves_nothing() {
    let folder = Folder::new();
    let mut writer = ReportWriter::create(&folder.path(), &sample::run(2)).unwrap();
    writer.plan(&sample::plans()[0]).unwrap();
    drop(writer);
    assert!(!folder.path().exists());
}

#[test]
fn verify_dropping_leaves_the_earlier_report() {
    let folder = Folder::new();
    sample::write(&folder.path(), 2, &sample::plans());
    let before = fs::read(folder.path().join("audit.json")).unwrap();
    let mut writer = ReportWriter::create(&folder.path(), &sample::run(2)).unwrap();
    writer.plan(&sample::plans()[0]).unwrap();
    drop(writer);
    assert_eq!(fs::read(folder.path().join("audit.json")).unwrap(), before);
    assert_eq!(names(&folder.path()).len(), 6);
    assert_eq!(
        target_state(&folder.path()).unwrap(),
        TargetState::EarlierReport
    );
}

#[test]
fn verify_a_report_replaces_an_earlier_one() {
    let folder = Folder::new();
    sample::write(&folder.path(), 2, &sample::plans());
    sample::write(&folder.path(), 2, &sample::plans()[..1]);
    let json: serde_json::Value =
        serde_json::from_str(&sample::text(&folder.path(), "audit.json")).unwrap();
    assert_eq!(json["plans"].as_array().unwrap().len(), 1);
}

#[test]
fn verify_states_of_a_folder() {
    let folder = Folder::new();
    let path = folder.path();
    let foreign = |example: &str| TargetState::Foreign {
        example: example.to_owned(),
    };
    assert_eq!(target_state(&path).unwrap(), TargetState::Absent);
    fs::create_dir(&path).unwrap();
    assert_eq!(target_state(&path).unwrap(), TargetState::Empty);
    // What an interrupted audit leaves behind is nobody's work, and goes with the next one.
    fs::write(path.join(".counterfoil-Ab12.tmp"), "half a row").unwrap();
    assert_eq!(target_state(&path).unwrap(), TargetState::Empty);
    fs::write(path.join("beams.csv"), "somebody's beams").unwrap();
    assert_eq!(target_state(&path).unwrap(), foreign("beams.csv"));
    fs::write(path.join("audit.json"), "{\"schema\":\"another/1\"}").unwrap();
    assert_eq!(target_state(&path).unwrap(), foreign("audit.json"));
    fs::remove_file(path.join("audit.json")).unwrap();
    sample::write(&path, 2, &sample::plans());
    assert_eq!(target_state(&path).unwrap(), TargetState::EarlierReport);
    assert_eq!(names(&path).len(), 6);
    fs::write(path.join("thesis.odt"), "years of work").unwrap();
    assert_eq!(target_state(&path).unwrap(), foreign("thesis.odt"));
    assert_eq!(
        target_state(&path.join("thesis.odt")).unwrap(),
        foreign(&path.join("thesis.odt").display().to_string())
    );
}

/// A run that is killed between two renamings leaves our files without the mark: the next one replaces them.
#[test]
fn verify_interrupted_renaming_does_not_bar_the_next_run() {
    let folder = Folder::new();
    let path = folder.path();
    sample::write(&path, 2, &sample::plans());
    fs::remove_file(path.join("audit.json")).unwrap();
    fs::write(path.join(".counterfoil-Ab12.tmp"), "{\"schema\":").unwrap();
    assert_eq!(target_state(&path).unwrap(), TargetState::EarlierReport);
    fs::remove_file(path.join("plans.csv")).unwrap();
    assert_eq!(target_state(&path).unwrap(), TargetState::EarlierReport);
    for name in ["report.html", "beams.csv"] {
        let ours = fs::read(path.join(name)).unwrap();
        fs::write(path.join(name), "somebody's own").unwrap();
        assert_eq!(
            target_state(&path).unwrap(),
            TargetState::Foreign {
                example: name.to_owned()
            }
        );
        fs::write(path.join(name), ours).unwrap();
    }
}

/// A second run would clear away the temporary files of the first.
#[cfg(unix)]
#[test]
fn verify_two_runs_do_not_write_into_one_folder() {
    let folder = Folder::new();
    let first = ReportWriter::create(&folder.path(), &sample::run(2)).unwrap();
    let error = ReportWriter::create(&folder.path(), &sample::run(2)).unwrap_err();
    assert!(error.to_string().contains("another audit"), "{error}");
    first.finish(&sample::summary()).unwrap();
    assert_eq!(names(&folder.path()).len(), 6);
    assert!(ReportWriter::create(&folder.path(), &sample::run(2)).is_ok());
}

/// What is in the way is seen before the earlier report loses its mark.
#[test]
fn verify_a_folder_in_the_way_leaves_the_earlier_report() {
    let folder = Folder::new();
    let path = folder.path();
    sample::write(&path, 2, &sample::plans());
    fs::remove_file(path.join("plans.csv")).unwrap();
    fs::create_dir(path.join("plans.csv")).unwrap();
    let writer = ReportWriter::create(&path, &sample::run(2)).unwrap();
    let error = writer.finish(&sample::summary()).unwrap_err().to_string();
    assert!(error.contains("plans.csv"), "{error}");
    assert_eq!(names(&path).len(), 6, "with its mark");
}

#[test]
fn verify_a_failed_finish_leaves_no_temporary_file_and_no_mark() {
    let folder = Folder::new();
    let path = folder.path();
    fs::create_dir_all(path.join("plans.csv").join("in the way")).unwrap();
    let writer = ReportWriter::create(&path, &sample::run(2)).unwrap();
    let error = writer.finish(&sample::summary()).unwrap_err().to_string();
    assert!(error.contains("plans.csv"), "{error}");
    let left = names(&path);
    assert!(!left.contains(&"audit.json".to_owned()), "{left:?}");
    assert!(left.iter().all(|name| !name.starts_with('.')), "{left:?}");
}

#[test]
fn verify_a_folder_that_cannot_be_made_is_named() {
    let folder = Folder::new();
    fs::write(folder.path(), "a file in the way").unwrap();
    let error = ReportWriter::create(&folder.path(), &sample::run(2)).unwrap_err();
    assert!(error.to_string().contains("report"), "{error}");
    assert_eq!(fs::read(folder.path()).unwrap(), b"a file in the way");
}
