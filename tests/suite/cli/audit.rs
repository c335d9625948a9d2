//! `counterfoil audit`: what it ends with, what it writes, what it refuses.

use std::fs;

use super::{Place, program, reference_plan, status, stderr, stdout, test_models};

const WITHIN: i32 = 0;
const BEYOND: i32 = 1;
const FAILED: i32 = 2;
const INCOMPLETE: i32 = 3;

const REPORT_FILES: [&str; 6] = [
    "audit.json",
    "beams.csv",
    "files.csv",
    "findings.csv",
    "plans.csv",
    "report.html",
];

#[test]
fn verify_each_exit_status() {
    let good = reference_plan("2.25.1");
    let off = |mu| reference_plan("2.25.2").with_meterset(mu);
    let unknown = reference_plan("2.25.3").map_beam(|beam| beam.with_machine("ELSEWHERE"));

    let place = Place::new().with("a", &good);
    let output = place.audit(&[]);
    assert_eq!(status(&output), WITHIN, "{}", stderr(&output));

    let place = Place::new().with("a", &good).with("b", &off(104.0));
    assert_eq!(status(&place.audit(&[])), BEYOND);
    assert_eq!(status(&place.audit(&["--fail-on", "action"])), WITHIN);
    assert_eq!(status(&place.audit(&["--fail-on", "never"])), WITHIN);

    let place = Place::new().with("a", &good).with("b", &off(110.0));
    assert_eq!(status(&place.audit(&["--fail-on", "action"])), BEYOND);
    assert_eq!(status(&place.audit(&["--fail-on", "never"])), WITHIN);

    let place = Place::new().with("a", &good).with("c", &unknown);
    assert_eq!(status(&place.audit(&[])), INCOMPLETE);

    // Beyond outranks incomplete, and the summary names both; --fail-on never suppresses 1 only.
    let place = Place::new().with("b", &off(110.0)).with("c", &unknown);
    let output = place.audit(&[]);
    assert_eq!(status(&output), BEYOND);
    assert!(stdout(&output).contains("and 3:"), "{}", stdout(&output));
    assert_eq!(status(&place.audit(&["--fail-on", "never"])), INCOMPLETE);
}

#[test]
fn verify_what_makes_a_run_fail() {
    let place = Place::new();
    assert_eq!(status(&place.audit(&[])), FAILED, "an empty folder");
    place.put("notes.txt", b"not a plan");
    let output = place.audit(&[]);
    assert_eq!(status(&output), FAILED);
    assert!(stderr(&output).contains("nothing to audit"));
    assert!(!place.report().exists(), "nothing is left behind");

    let place = Place::new().with("a", &reference_plan("2.25.1"));
    for options in [
        vec!["no-such-path"],
        vec!["--no-such-option"],
        vec!["--models", "no-such-folder"],
        vec!["--site", "no-such-file"],
        vec!["--depths", "no-such-file"],
        vec!["--jobs", "0"],
    ] {
        let output = place.audit(&options);
        assert_eq!(status(&output), FAILED, "{options:?}");
        assert!(!stderr(&output).is_empty());
    }
}

#[test]
fn verify_a_folder_of_broken_plans_only_is_incomplete() {
    let place = Place::new();
    let bytes = reference_plan("2.25.1").bytes();
    place.put("half.dcm", &bytes[..bytes.len() / 2]);
    assert_eq!(status(&place.audit(&[])), INCOMPLETE);
    assert_eq!(place.column("files.csv", "outcome"), ["unreadable"]);
    assert_eq!(place.column("files.csv", "kind"), ["plan"]);
    assert!(place.column("files.csv", "message")[0].contains("truncated"));
}

#[test]
fn verify_one_bad_file_never_stops_the_others() {
    let place = Place::new().with("b.dcm", &reference_plan("2.25.1"));
    let bytes = reference_plan("2.25.2").bytes();
    place.put("a.dcm", &bytes[..bytes.len() - 7]);
    place.put("c.txt", b"x");
    assert_eq!(status(&place.audit(&[])), INCOMPLETE);
    assert_eq!(
        place.column("files.csv", "outcome"),
        ["unreadable", "audited", "passed-over"]
    );
    assert_eq!(place.column("plans.csv", "verdict"), ["within"]);
}

/// The same bytes for any number of threads and on every run: 300 plans, more than one window holds.
#[test]
fn verify_jobs_change_no_byte() {
    let place = Place::new();
    for number in 0..300_u32 {
        let spec = reference_plan(&format!("2.25.{number}"))
            .with_meterset(95.0 + f64::from(number) / 30.0);
        place.put(&format!("{number:03}.dcm"), &spec.bytes());
    }
    let written = |jobs: &str| {
        place.audit(&["--jobs", jobs]);
        REPORT_FILES.map(|name| fs::read(place.report().join(name)).unwrap())
    };
    let one = written("1");
    for jobs in ["2", "7", "1"] {
        assert_eq!(written(jobs), one, "--jobs {jobs}");
    }
}

#[test]
fn verify_an_earlier_report_is_replaced_and_nothing_else_is() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    assert_eq!(status(&place.audit(&[])), WITHIN);
    assert_eq!(status(&place.audit(&[])), WITHIN, "replaced");
    fs::write(place.report().join("letter.txt"), "keep me").unwrap();
    let output = place.audit(&[]);
    assert_eq!(status(&output), FAILED);
    assert!(stderr(&output).contains("letter.txt"));
    assert_eq!(status(&place.audit(&["--force"])), WITHIN);
    assert_eq!(
        fs::read_to_string(place.report().join("letter.txt")).unwrap(),
        "keep me"
    );
}

#[test]
fn verify_copies_are_audited_once_and_contradictions_bar_each_other() {
    let plan = reference_plan("2.25.1");
    let place = Place::new().with("a.dcm", &plan).with("b.dcm", &plan);
    assert_eq!(status(&place.audit(&[])), WITHIN);
    assert_eq!(
        place.column("files.csv", "outcome"),
        ["audited", "duplicate-of"]
    );
    assert!(place.column("files.csv", "message")[1].contains("a.dcm"));
    assert_eq!(place.column("plans.csv", "verdict").len(), 1);

    let place = place.with("c.dcm", &reference_plan("2.25.1").with_meterset(100.5));
    assert_eq!(status(&place.audit(&[])), BEYOND);
    assert_eq!(
        place.column("plans.csv", "verdict"),
        ["not-verifiable", "not-verifiable"]
    );
    assert!(
        place
            .column("findings.csv", "check")
            .contains(&"uid-not-unique".to_owned())
    );
}

#[test]
fn verify_depths_that_fit_no_beam_or_stand_twice_are_refused() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    place.audit(&[]);
    let uid = place.column("plans.csv", "sop_instance_uid").remove(0);
    let table = place.folder.path().join("depths.csv");
    let header = "sop_instance_uid,beam_number,depth_cm,effective_depth_cm,ssd_cm,independent\n";
    let audit_with = |rows: &str| {
        fs::write(&table, format!("{header}{rows}")).unwrap();
        place.audit(&["--depths", table.to_str().unwrap()])
    };
    let good = format!("{uid},1,10,,90,yes\n");
    assert_eq!(status(&audit_with(&good)), WITHIN);
    assert_eq!(place.column("beams.csv", "depth_basis"), ["table"]);
    for (rows, word) in [
        (format!("{good}{good}"), "twice"),
        (format!("{good}{uid},2,10,,90,yes\n"), "beam 2"),
        (format!("{good}1.2.3,1,10,,90,yes\n"), "1.2.3"),
        (format!("{uid},1,-10,,90,yes\n"), "depth"),
        (format!("{uid},1,10,,90,perhaps\n"), "perhaps"),
        (format!("{uid},1,1O,,90,yes\n"), "line 2"),
    ] {
        let output = audit_with(&rows);
        assert_eq!(status(&output), FAILED, "{rows}");
        assert!(stderr(&output).contains(word), "{}", stderr(&output));
    }
}

#[test]
fn verify_the_site_file_rules_and_is_named() {
    let place = Place::new().with("a", &reference_plan("2.25.1").with_meterset(102.0));
    let site = place.folder.path().join("site.toml");
    fs::write(
        &site,
        "[action_levels.static]\ntolerance_percent = 1.0\naction_percent = 1.5\nbasis = \"our own\"\n",
    )
    .unwrap();
    assert_eq!(status(&place.audit(&[])), WITHIN);
    assert!(stdout(&place.audit(&[])).contains("built-in defaults"));
    let output = place.audit(&["--site", site.to_str().unwrap()]);
    assert_eq!(status(&output), BEYOND);
    assert!(stdout(&output).contains("site.toml"));
    assert_eq!(place.column("beams.csv", "verdict"), ["beyond-action"]);
    let page = fs::read_to_string(place.report().join("report.html")).unwrap();
    assert!(page.contains("site.toml") && page.contains("our own"));
    fs::write(&site, "[checks]\noff = [\"no-such-check\"]\n").unwrap();
    let output = place.audit(&["--site", site.to_str().unwrap()]);
    assert_eq!(status(&output), FAILED);
    assert!(stderr(&output).contains("no-such-check"));
}

#[test]
fn verify_a_model_that_is_not_approved_never_ends_with_zero() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let models = place.folder.path().join("models/tg71");
    fs::create_dir_all(models.join("6")).unwrap();
    let source = test_models().join("tg71-tpr");
    for file in ["6/tpr.csv", "6/output.csv", "6/off-axis.csv"] {
        fs::copy(source.join(file), models.join(file)).unwrap();
    }
    let toml = fs::read_to_string(source.join("machine.toml")).unwrap();
    let (before, after) = toml.split_once("until = ").unwrap();
    let rest = after.split_once('\n').unwrap().1;
    let expired = format!("{before}until = 2026-01-31\n{rest}");
    fs::write(models.join("machine.toml"), expired).unwrap();
    let folder = place.folder.path().join("models");
    let output = place.audit(&["--models", folder.to_str().unwrap()]);
    assert_eq!(status(&output), FAILED, "--models twice is a slip");

    let output = program()
        .arg("audit")
        .arg(place.plans())
        .arg("--models")
        .arg(folder)
        .arg("--out")
        .arg(place.report())
        .output()
        .unwrap();
    assert_eq!(status(&output), INCOMPLETE, "{}", stderr(&output));
    assert!(stdout(&output).contains("not approved"));
    assert_eq!(place.column("beams.csv", "verdict"), ["within"]);
}

#[test]
fn verify_a_list_of_paths_does_as_paths_do() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let list = place.folder.path().join("list");
    fs::write(&list, format!("{}\n\n", place.plans().join("a").display())).unwrap();
    let output = program()
        .args(["audit", "--files-from"])
        .arg(&list)
        .arg("--models")
        .arg(test_models())
        .arg("--out")
        .arg(place.report())
        .output()
        .unwrap();
    assert_eq!(status(&output), WITHIN, "{}", stderr(&output));
    assert_eq!(place.column("plans.csv", "verdict"), ["within"]);
}

#[test]
fn verify_hostile_names_stay_text() {
    let mut spec = reference_plan("2.25.1").with_label("=HYPERLINK(\"x\")");
    spec.patient_id = "<script>alert(1)</script>".to_owned();
    let place = Place::new().with("<b>&amp;\"'.dcm", &spec);
    assert_eq!(status(&place.audit(&[])), WITHIN);
    assert!(place.column("plans.csv", "plan_label")[0].starts_with("'="));
    let page = fs::read_to_string(place.report().join("report.html")).unwrap();
    assert!(!page.contains("<script>alert") && !page.contains("<b>&amp;\""));
}

#[test]
fn verify_patient_data_reach_no_terminal() {
    let mut spec = reference_plan("2.25.1").with_meterset(120.0);
    spec.patient_id = "SECRETID".to_owned();
    spec.patient_name = "SECRET^NAME".to_owned();
    let place = Place::new().with("a", &spec);
    let output = place.audit(&[]);
    assert!(!stdout(&output).contains("SECRET"));
    assert!(!stderr(&output).contains("SECRET"));
}

#[test]
fn verify_settings_in_force_are_shown_with_their_source() {
    let output = program()
        .args(["audit", "--show-settings"])
        .output()
        .unwrap();
    assert_eq!(status(&output), WITHIN);
    assert!(stdout(&output).contains("built-in defaults"));
    assert!(stdout(&output).contains("edge_margin_cm = 1.0"));
}

/// A table for another folder is told in one line, not in thousands of rows.
#[test]
fn verify_a_long_table_that_fits_no_plan_is_told_briefly() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let table = place.folder.path().join("depths.csv");
    let mut rows =
        "sop_instance_uid,beam_number,depth_cm,effective_depth_cm,ssd_cm,independent\n".to_owned();
    for number in 1..=20_000 {
        rows.push_str(&format!("1.2.{number},1,10,,90,yes\n"));
    }
    fs::write(&table, rows).unwrap();
    let output = place.audit(&["--depths", table.to_str().unwrap()]);
    assert_eq!(status(&output), FAILED);
    assert!(stderr(&output).contains("and 19995 rows more"));
    assert!(stderr(&output).len() < 500, "{}", stderr(&output));
}

/// What the record says of the models agrees with the page: only what a plan was calculated with is used.
#[test]
fn verify_the_record_names_the_models_that_were_used() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    assert_eq!(status(&place.audit(&[])), WITHIN);
    let text = fs::read_to_string(place.report().join("audit.json")).unwrap();
    let record: serde_json::Value = serde_json::from_str(&text).unwrap();
    let offered = record["run"]["models"].as_array().unwrap();
    assert!(offered.len() > 1);
    assert!(offered.iter().all(|model| model.get("used").is_none()));
    assert_eq!(
        record["summary"]["models_used"],
        serde_json::json!(["tg71-tpr"])
    );
    let page = fs::read_to_string(place.report().join("report.html")).unwrap();
    assert_eq!(page.matches("<td>used</td>").count(), 1);
    assert_eq!(page.matches("<td>not used</td>").count(), offered.len() - 1);
}

/// The user's own site file that is a broken link is an error, not a reason for other tolerances.
#[cfg(unix)]
#[test]
fn verify_a_broken_site_file_never_gives_way_to_defaults() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let config = place.folder.path().join("config");
    fs::create_dir_all(config.join("counterfoil")).unwrap();
    let audit = || {
        program()
            .env("XDG_CONFIG_HOME", &config)
            .arg("audit")
            .arg(place.plans())
            .arg("--models")
            .arg(test_models())
            .arg("--out")
            .arg(place.report())
            .output()
            .unwrap()
    };
    assert_eq!(status(&audit()), WITHIN);
    std::os::unix::fs::symlink("not-there.toml", config.join("counterfoil/site.toml")).unwrap();
    let output = audit();
    assert_eq!(status(&output), FAILED);
    assert!(stderr(&output).contains("site.toml"), "{}", stderr(&output));
}

/// A depth table from a pipe can be read only once, and its fingerprint is that of what was read.
#[cfg(unix)]
#[test]
fn verify_a_depth_table_may_be_a_pipe() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    place.audit(&[]);
    let uid = place.column("plans.csv", "sop_instance_uid").remove(0);
    let rows = format!(
        "sop_instance_uid,beam_number,depth_cm,effective_depth_cm,ssd_cm,independent\n{uid},1,10,,90,yes\n"
    );
    let table = place.folder.path().join("depths.csv");
    fs::write(&table, &rows).unwrap();
    let mut command = program();
    command
        .arg("audit")
        .arg(place.plans())
        .args(["--depths", "/dev/stdin", "--models"])
        .arg(test_models())
        .arg("--out")
        .arg(place.report())
        .stdin(std::process::Stdio::piped());
    let mut child = command
        .stdout(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    let mut pipe = child.stdin.take().unwrap();
    std::io::Write::write_all(&mut pipe, rows.as_bytes()).unwrap();
    drop(pipe);
    assert_eq!(status(&child.wait_with_output().unwrap()), WITHIN);
    let fingerprint = |text: &str| text.split("sha256 ").nth(1).unwrap()[..64].to_owned();
    let json = || fs::read_to_string(place.report().join("audit.json")).unwrap();
    let of_pipe = fingerprint(&json());
    place.audit(&["--depths", table.to_str().unwrap()]);
    assert_eq!(of_pipe, fingerprint(&json()));
}

/// A copy that ends before it says what it is may be a plan: the audit is incomplete, wherever the copy ends.
#[test]
fn verify_a_copy_cut_before_its_class_makes_the_audit_incomplete() {
    let bytes = reference_plan("2.25.2").bytes();
    for length in 132..400 {
        let place = Place::new().with("a", &reference_plan("2.25.1"));
        place.put("half", &bytes[..length]);
        assert_eq!(status(&place.audit(&[])), INCOMPLETE, "{length} bytes");
        assert_eq!(
            place.column("files.csv", "outcome"),
            ["audited", "unreadable"]
        );
    }
}

/// What is empty or packed is passed over with a word, since it may hide a plan.
#[test]
fn verify_empty_and_packed_files_are_named() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    place.put("b", b"");
    place.put("c.gz", b"\x1F\x8B\x08\0\0\0\0\0");
    place.put("d.zip", b"PK\x03\x04\x14\0\0\0");
    place.put("e.txt", b"Please audit");
    assert_eq!(status(&place.audit(&[])), WITHIN);
    let messages = place.column("files.csv", "message");
    assert!(messages[1].contains("empty"));
    assert!(messages[2].contains("unpack") && messages[3].contains("unpack"));
    assert_eq!(messages[4], "");
}

/// Plans in the folder that the report is forced into would be passed over: 0 would be wrong.
#[test]
fn verify_plans_in_the_report_folder_are_not_skipped_silently() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let out = place.plans().join("monday");
    fs::create_dir(&out).unwrap();
    fs::write(
        out.join("b"),
        reference_plan("2.25.2").with_meterset(150.0).bytes(),
    )
    .unwrap();
    let output = program()
        .arg("audit")
        .arg(place.plans())
        .arg("--models")
        .arg(test_models())
        .arg("--force")
        .arg("--out")
        .arg(&out)
        .output()
        .unwrap();
    assert_eq!(status(&output), FAILED, "{}", stdout(&output));
    assert!(stderr(&output).contains("monday"), "{}", stderr(&output));
    assert!(!out.join("audit.json").exists());
}

/// `audit ... | head -1` must not turn a deviation into 0: the status is that of the audit, read to its end or not.
#[test]
fn verify_a_closed_pipe_does_not_change_the_status() {
    let off = reference_plan("2.25.2").with_meterset(110.0);
    let place = Place::new().with("b", &off);
    let (reader, writer) = std::io::pipe().unwrap();
    drop(reader);
    let ended = program()
        .arg("audit")
        .arg(place.plans())
        .arg("--models")
        .arg(test_models())
        .arg("--out")
        .arg(place.report())
        .stdout(writer)
        .output()
        .unwrap();
    assert_eq!(status(&ended), BEYOND);
    assert_eq!(stderr(&ended), "");
    assert!(place.report().join("audit.json").exists());
}

/// `--files-from -` is standard input, as for other programs.
#[test]
fn verify_a_list_of_paths_may_come_from_standard_input() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let (reader, mut writer) = std::io::pipe().unwrap();
    let list = format!("{}\n", place.plans().join("a").display());
    std::io::Write::write_all(&mut writer, list.as_bytes()).unwrap();
    drop(writer);
    let output = program()
        .args(["audit", "--files-from", "-", "--models"])
        .arg(test_models())
        .arg("--out")
        .arg(place.report())
        .stdin(reader)
        .output()
        .unwrap();
    assert_eq!(status(&output), WITHIN, "{}", stderr(&output));
}

/// Without its header a table of one row would be read as a table of none, and its depth go unused.
#[test]
fn verify_a_depth_table_without_its_header_is_refused() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let table = place.folder.path().join("depths.csv");
    for text in [
        "",
        "2.25.1,1,10,,90,yes\n",
        "sop_instance_uid;beam_number;depth_cm;effective_depth_cm;ssd_cm;independent\n",
    ] {
        fs::write(&table, text).unwrap();
        let output = place.audit(&["--depths", table.to_str().unwrap()]);
        assert_eq!(status(&output), FAILED, "{text}");
        assert!(stderr(&output).contains("header"), "{}", stderr(&output));
    }
}
