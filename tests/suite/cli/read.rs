//! `counterfoil read`.

use super::{Place, program, reference_plan, status, stderr, stdout};

#[test]
fn verify_read_shows_values_with_their_standing() {
    let place = Place::new().with("a", &reference_plan("2.25.1"));
    let read = |options: &[&str]| {
        program()
            .arg("read")
            .arg(place.plans().join("a"))
            .args(options)
            .output()
            .unwrap()
    };
    let output = read(&[]);
    assert_eq!(status(&output), 0, "{}", stderr(&output));
    for word in ["TG71-TPR", "100", "0.8", "90"] {
        assert!(stdout(&output).contains(word), "no {word}");
    }
    let output = read(&["--json"]);
    let plan: serde_json::Value = serde_json::from_str(&stdout(&output)).unwrap();
    let second = &plan["beams"][0]["control_points"][1];
    assert_eq!(second["ssd_cm"]["standing"], "inherited");
    assert_eq!(second["ssd_cm"]["value"], 90.0);
    assert_eq!(second["cumulative_weight"]["standing"], "stated");
}

#[test]
fn verify_read_refuses_what_is_no_plan() {
    let place = Place::new();
    place.put("a", b"not a plan");
    let output = program()
        .arg("read")
        .arg(place.plans().join("a"))
        .output()
        .unwrap();
    assert_eq!(status(&output), 2);
    assert!(stderr(&output).contains('a'));
}

/// A file name must not steer the terminal, whether the file is read or refused.
#[cfg(unix)]
#[test]
fn verify_a_file_name_does_not_write_on_the_terminal() {
    let place = Place::new().with("a\u{1b}[2Jb", &reference_plan("2.25.1"));
    place.put("c\u{1b}[2Jd", b"no plan");
    for (name, ends) in [("a\u{1b}[2Jb", 0), ("c\u{1b}[2Jd", 2)] {
        let output = program()
            .arg("read")
            .arg(place.plans().join(name))
            .output()
            .unwrap();
        assert_eq!(status(&output), ends);
        assert!(!stdout(&output).contains('\u{1b}'));
        assert!(!stderr(&output).contains('\u{1b}'));
    }
}
