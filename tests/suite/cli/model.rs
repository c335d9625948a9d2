//! `counterfoil model`.

use std::fs;

use super::{program, status, stderr, stdout, test_models};

#[test]
fn verify_check_tells_a_mistyped_cell() {
    let folder = tempfile::tempdir().unwrap();
    let model = folder.path().join("model");
    fs::create_dir_all(model.join("6")).unwrap();
    let source = test_models().join("tg71-tpr");
    for file in [
        "machine.toml",
        "6/tpr.csv",
        "6/output.csv",
        "6/off-axis.csv",
    ] {
        fs::copy(source.join(file), model.join(file)).unwrap();
    }
    let check = || {
        program()
            .args(["model", "check"])
            .arg(&model)
            .output()
            .unwrap()
    };
    let output = check();
    assert_eq!(status(&output), 0, "{}{}", stdout(&output), stderr(&output));
    // TPR(8, 10 x 10) is 1.074 in the data set; two digits exchanged.
    let table = fs::read_to_string(model.join("6/tpr.csv")).unwrap();
    fs::write(model.join("6/tpr.csv"), table.replacen("1.074", "1.047", 1)).unwrap();
    let output = check();
    assert_eq!(status(&output), 1, "{}", stdout(&output));
    assert!(
        stdout(&output).contains("depth_cm 8"),
        "{}",
        stdout(&output)
    );
}

#[test]
fn verify_derive_gives_the_table_of_the_other_kind() {
    let output = program()
        .args([
            "model",
            "derive",
            "--machine",
            "TG71-PDD",
            "--energy",
            "6",
            "--to",
            "tpr",
        ])
        .arg("--models")
        .arg(test_models())
        .output()
        .unwrap();
    assert_eq!(status(&output), 0, "{}", stderr(&output));
    let mut table = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .from_reader(output.stdout.as_slice());
    let at = table
        .headers()
        .unwrap()
        .iter()
        .position(|side| side == "10")
        .unwrap();
    let row = table
        .records()
        .map(Result::unwrap)
        .find(|row| &row[0] == "20")
        .unwrap();
    // TPR(20, 10 x 10) of the data set's own TPR table is 0.672; 0.3 % is the agreement of its conversion.
    let value: f64 = row[at].parse().unwrap();
    assert!((value / 0.672 - 1.0).abs() < 0.003, "{value}");
}

#[test]
fn verify_show_writes_one_page() {
    let folder = tempfile::tempdir().unwrap();
    let page = folder.path().join("model.html");
    let output = program()
        .args(["model", "show", "tg71-tpr", "--out"])
        .arg(&page)
        .arg("--models")
        .arg(test_models())
        .output()
        .unwrap();
    assert_eq!(status(&output), 0, "{}", stderr(&output));
    let text = fs::read_to_string(page).unwrap();
    assert!(text.contains("<svg") && text.contains("tg71-tpr"));
    assert!(!text.contains("http://") && !text.contains("https://"));
}

/// A pipe in a model would keep the run waiting for a writer that never comes.
#[cfg(unix)]
#[test]
fn verify_a_pipe_in_a_model_is_refused_at_once() {
    let folder = tempfile::tempdir().unwrap();
    let model = folder.path().join("model");
    fs::create_dir_all(model.join("6")).unwrap();
    for file in ["machine.toml", "6/output.csv", "6/off-axis.csv"] {
        fs::copy(test_models().join("tg71-tpr").join(file), model.join(file)).unwrap();
    }
    let pipe = model.join("6/tpr.csv");
    let made = std::process::Command::new("mkfifo")
        .arg(&pipe)
        .status()
        .unwrap();
    assert!(made.success());
    let output = program()
        .args(["model", "check"])
        .arg(&model)
        .output()
        .unwrap();
    assert_eq!(status(&output), 2);
    assert!(
        stderr(&output).contains("not a regular file"),
        "{}",
        stderr(&output)
    );
}
