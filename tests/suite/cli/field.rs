//! Fields typed by hand: published worked examples through the program's own
//! calculation, to the digits given, with their traces.
//!
//! The four textbook examples are from F. M. Khan, The Physics of Radiation
//! Therapy, chapter on dose calculation (from memory; each was recomputed by
//! hand and the arithmetic stands beside it). The others are worked by hand
//! from the tables of the AAPM TG-71 6 MV reference data set.

use super::{program, status, stderr, stdout, test_models};

/// The number behind `label` in the output.
fn number(text: &str, label: &str) -> f64 {
    let at = text
        .find(label)
        .unwrap_or_else(|| panic!("no {label} in {text}"));
    text[at + label.len()..]
        .split_whitespace()
        .find_map(|word| word.trim_matches(['=', ',']).parse().ok())
        .unwrap()
}

fn field(words: &str) -> String {
    let output = program()
        .arg("field")
        .args(words.split_whitespace())
        .arg("--models")
        .arg(test_models())
        .output()
        .unwrap();
    assert_eq!(status(&output), 0, "{}{}", stdout(&output), stderr(&output));
    stdout(&output)
}

fn trace(words: &str) -> serde_json::Value {
    serde_json::from_str(&field(&format!("{words} --json"))).unwrap()
}

fn factor(trace: &serde_json::Value, name: &str) -> f64 {
    trace["factors"]
        .as_array()
        .unwrap()
        .iter()
        .find(|factor| factor["name"] == name)
        .unwrap_or_else(|| panic!("no {name}"))["value"]
        .as_f64()
        .unwrap()
}

fn near(found: f64, expected: f64, within: f64) {
    assert!(
        (found - expected).abs() <= within,
        "{found} is not {expected} within {within}"
    );
}

/// 200 / (1 x 1.020 x 1.010 x 0.651 x 1) = 298.214
const SSD_100: &str = "--square 15 --depth 10 --ssd 100 --pdd 65.1 --sc 1.020 --sp 1.010 --oar 1 \
    --output 1 --reference-depth 1 --reference-distance 101 --d-max 1";

#[test]
fn verify_ssd_100_example() {
    let text = field(&format!("{SSD_100} --dose 2"));
    near(number(&text, "MU for 2 Gy ="), 298.214, 0.000_5);
    let trace = trace(SSD_100);
    near(factor(&trace, "inverse_square"), 1.0, 1e-12);
    near(factor(&trace, "percent_depth_dose"), 0.651, 1e-12);
    assert_eq!(trace["formula"], "D'0 * Sc * Sp * PDD/100 * OAR * ISF");
}

/// 200 / (1.010 x 1.010 x 0.667 x (101/121)^2) = 421.880; the collimator opens 15 x 100/120 = 12.5 cm
#[test]
fn verify_extended_ssd_example() {
    let words = "--square 15 --sides-at surface --depth 10 --ssd 120 --pdd 66.7 --sc 1.010 \
        --sp 1.010 --oar 1 --output 1 --reference-depth 1 --reference-distance 101 --d-max 1";
    let text = field(&format!("{words} --dose 2"));
    near(number(&text, "MU for 2 Gy ="), 421.880, 0.000_5);
    let trace = trace(words);
    let c = trace["inputs"]
        .as_array()
        .unwrap()
        .iter()
        .find(|input| input["symbol"] == "c")
        .unwrap();
    near(c["value"].as_f64().unwrap(), 12.5, 1e-9);
    near(
        factor(&trace, "inverse_square"),
        (101.0_f64 / 121.0).powi(2),
        1e-12,
    );
}

/// 200 / (0.787 x 0.970 x 0.990) = 264.636 calibrated at the isocentre;
/// with (101/100)^2 when calibrated at SSD 100, d_max 1: 259.421
#[test]
fn verify_isocentric_example_and_the_calibration_step() {
    let words = "--square 6 --depth 8 --tmr 0.787 --sc 0.970 --sp 0.990 --oar 1 --output 1 \
        --reference-depth 1 --d-max 1 --dose 2";
    let text = field(&format!("{words} --reference-distance 100"));
    near(number(&text, "MU for 2 Gy ="), 264.636, 0.000_5);
    let text = field(&format!("{words} --reference-distance 101"));
    near(number(&text, "MU for 2 Gy ="), 259.421, 0.000_5);
}

/// Cobalt-60, SSD 80 to 100, d 10, d_max 0.5: F = ((100.5/80.5) (90/110))^2 = 1.043374; 58.4 x F = 60.933
#[test]
fn verify_mayneord_example() {
    let text = field(
        "--square 10 --depth 10 --ssd 100 --pdd 58.4 --pdd-ssd 80 --sc 1 --sp 1 --oar 1 \
        --output 1 --reference-depth 0.5 --reference-distance 100.5 --d-max 0.5",
    );
    near(number(&text, "Mayneord F ="), 1.043_374, 5e-7);
    near(number(&text, "PDD ="), 60.933, 5e-4);
}

/// 200 / (0.8 x 1 x Sp(11) 1.010 x 1 x (100/110)^2 0.826446) = 299.505
#[test]
fn verify_tg71_square_at_ssd_100() {
    for machine in ["TG71-PDD", "TG71-TPR"] {
        let text = field(&format!(
            "--square 10 --depth 10 --ssd 100 --machine {machine} --energy 6 --dose 2"
        ));
        near(number(&text, "MU for 2 Gy ="), 299.505, 0.000_5);
    }
}

/// 12 x 20 (X x Y), d 8: s = 15; Sc(15) = 1.016; Sp(16.5) = 1.054125; PDD 110.3; ISF 0.826446;
/// 180 / (0.8 x 1.016 x 1.054125 x 1.103 x 0.826446) = 230.466
#[test]
fn verify_tg71_rectangle_at_ssd_100() {
    let words = "--x 12 --y 20 --depth 8 --ssd 100 --machine TG71-PDD --energy 6";
    let text = field(&format!("{words} --dose 1.8"));
    near(number(&text, "MU for 1.8 Gy ="), 230.466, 0.000_5);
    let trace = trace(words);
    near(factor(&trace, "collimator_scatter"), 1.016, 1e-9);
    near(factor(&trace, "phantom_scatter"), 1.054_125, 1e-9);
    near(factor(&trace, "percent_depth_dose"), 1.103, 1e-9);
    near(factor(&trace, "inverse_square"), 0.826_446, 5e-7);
}

/// Isocentric 15 x 15, d 12, wedge 0.70, tray 0.97: Sc 1.016, Sp 1.044, TPR 0.936;
/// 200 / (0.8 x Sc(15) x Sp(15) x TPR(12, 15) x 0.70 x 0.97) = 370.852
#[test]
fn verify_tg71_isocentric_with_wedge_and_tray() {
    let text = field(
        "--square 15 --depth 12 --machine TG71-TPR --energy 6 --wedge-factor 0.70 \
        --tray-factor 0.97 --dose 2",
    );
    near(number(&text, "MU for 2 Gy ="), 370.852, 0.000_5);
}

#[test]
fn verify_every_factor_is_shown_with_its_source() {
    let text = field("--square 10 --depth 8 --machine TG71-TPR --energy 6 --dose 2");
    for word in [
        "D'0",
        "Sc",
        "Sp",
        "TPR",
        "OAR",
        "ISF",
        "tpr.csv",
        "output.csv",
        "cGy/MU",
    ] {
        assert!(text.contains(word), "no {word} in:\n{text}");
    }
}

#[test]
fn verify_outside_the_method_is_said_and_is_not_zero() {
    for (words, reason) in [
        ("--square 10 --depth 1.5 --d-max 2", "build-up"),
        ("--x 1,9 --y 10 --depth 10 --d-max 1.5", "under a jaw"),
        ("--square 10 --point 4.5,0 --depth 10 --d-max 1.5", "edge"),
    ] {
        let output = program()
            .arg("field")
            .args(words.split_whitespace())
            .args(["--machine", "TG71-TPR", "--energy", "6", "--models"])
            .arg(test_models())
            .output()
            .unwrap();
        assert_eq!(status(&output), 3, "{words}");
        assert!(stdout(&output).contains(reason), "{}", stdout(&output));
    }
}

#[test]
fn verify_what_cannot_be_meant_is_refused() {
    let model = "--machine TG71-TPR --energy 6";
    for (words, word) in [
        (format!("--square 10 --depth 80 {model}"), "mm"),
        (format!("--square 100 --depth 10 {model}"), "mm"),
        (format!("--square 2 --depth 10 {model}"), "range"),
        (format!("--square 10 --depth 28 {model}"), "range"),
        (format!("--square 10 --depth NaN {model}"), "NaN"),
        ("--square 10 --depth 10".to_owned(), "D'0"),
        (
            "--square 10 --depth 10 --machine X --energy 6".to_owned(),
            "TG71-TPR",
        ),
        (
            "--square 10 --depth 10 --machine TG71-TPR --energy 10".to_owned(),
            "it has 6",
        ),
        (
            format!("--square 10 --depth 10 --ssd 100 --pdd 0.667 {model}"),
            "per cent",
        ),
        (
            format!("--square 10 --depth 10 --tray-factor 97 {model}"),
            "per cent",
        ),
        (format!("--depth 10 {model}"), "sides"),
    ] {
        let output = program()
            .arg("field")
            .args(words.split_whitespace())
            .arg("--models")
            .arg(test_models())
            .output()
            .unwrap();
        assert_eq!(status(&output), 2, "{words}\n{}", stdout(&output));
        assert!(
            stderr(&output).contains(word),
            "{words}: {}",
            stderr(&output)
        );
    }
}

/// `--x -5,5` is what a hand types; the value is no option although it begins with a hyphen.
#[test]
fn verify_positions_that_begin_with_a_minus_sign_are_values() {
    let rest = "--depth 8 --tpr 0.787 --sc 0.970 --sp 0.990 --oar 1 --output 1 \
        --reference-depth 1.5 --reference-distance 100 --d-max 1.5 --mu 100";
    let apart = field(&format!("--x -5,5 --y -4,6 --point -1.5,2 {rest}"));
    assert_eq!(
        apart,
        field(&format!("--x=-5,5 --y=-4,6 --point=-1.5,2 {rest}"))
    );
    // 100 MU x 1 cGy/MU x 0.970 x 0.990 x 0.787 = 75.576 cGy
    near(number(&apart, "dose of 100 MU ="), 0.7558, 0.000_05);

    // A forgotten value does not swallow the option after it.
    for words in ["--x --y -4,6", "--square 10 --point --depth 8"] {
        let output = program()
            .arg("field")
            .args(words.split_whitespace())
            .args(rest.split_whitespace())
            .output()
            .unwrap();
        assert_eq!(status(&output), 2, "{words}");
    }
}

/// What is printed for a shipped model.
fn shipped(words: &str) -> (i32, String) {
    let output = program()
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .arg("field")
        .args("--square 10 --depth 10 --machine ROWAN-1 --energy 6".split_whitespace())
        .args(words.split_whitespace())
        .args(["--models", "beam-models"])
        .output()
        .unwrap();
    let text = format!("{}{}", stdout(&output), stderr(&output));
    (status(&output), text)
}

/// `6/wedge-M60.csv`, 10 cm deep, side 10: 0.2680. In for 0.4: 0.4 * 0.2680 + 0.6 = 0.7072; D'0 is 0.79 and all else is 1.
/// `6/wedge-W45-profile.csv` at 3 and -3 cm: 1.1788 and 0.8450.
#[test]
fn verify_wedges_of_a_model() {
    let (code, text) = shipped("--wedge M60 --wedge-orientation 0 --wedge-share 0.4 --json");
    assert_eq!(code, 0, "{text}");
    let trace: serde_json::Value = serde_json::from_str(&text).unwrap();
    near(factor(&trace, "wedge"), 0.7072, 1e-9);
    near(
        trace["dose_per_mu_cgy"].as_f64().unwrap(),
        0.79 * 0.7072,
        1e-9,
    );
    for (orientation, profile) in [("0", 1.1788), ("180", 0.8450)] {
        let words = format!("--wedge W45 --wedge-orientation {orientation} --point 0,3 --json");
        let (code, text) = shipped(&words);
        assert_eq!(code, 0, "{text}");
        let trace: serde_json::Value = serde_json::from_str(&text).unwrap();
        near(factor(&trace, "wedge_profile"), profile, 1e-9);
    }
}

#[test]
fn verify_a_wedge_that_cannot_be_looked_up_is_refused() {
    for (words, wanted) in [
        (
            "--wedge W99 --wedge-orientation 0",
            "it has W15, W30, W45, W60, M60, D60",
        ),
        ("--wedge D60 --wedge-orientation 0", "dynamic"),
        ("--wedge W45", "--wedge-orientation"),
        (
            "--wedge W45 --wedge-orientation 0 --wedge-share 0.5",
            "fixed wedge",
        ),
        (
            "--wedge M60 --wedge-orientation 0 --wedge-share 1.5",
            "--wedge-share",
        ),
        (
            "--wedge W45 --wedge-orientation 0 --wedge-factor 0.5",
            "cannot be used with",
        ),
    ] {
        let (code, text) = shipped(words);
        assert_eq!(code, 2, "{words}: {text}");
        assert!(text.contains(wanted), "{words}: {text}");
    }
}
