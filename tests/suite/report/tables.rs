//! The CSV files against the documented columns, RFC 4180 and spreadsheets.

use counterfoil::audit::Verdict;
use counterfoil::report::{data_dictionary, harmless, plain_decimal};
use proptest::prelude::*;

use super::sample::{self, FORMULA_NAME, Folder, HOSTILE_NAME};

/// Columns as users were promised them, in order; more may follow, `run_id` last.
const BEAMS: &str = "file, sop_instance_uid, patient_id, plan_label, fraction_group, machine, beam_number, beam_name, radiation, energy, technique, gantry_deg, gantry_end_deg, collimator_deg, couch_deg, control_points, x_cm, y_cm, collimator_square_cm, phantom_square_cm, ssd_cm, depth_cm, effective_depth_cm, depth_basis, point_basis, off_axis_cm, planned_mu, planned_dose_gy, independent_dose_gy, independent_mu, deviation_percent, expected_spread_percent, tolerance_percent, action_percent, verdict, method, likely_cause, reasons";
const PLANS: &str = "file, sop_instance_uid, patient_id, plan_label, approval, machine, beams, fractions, prescription_gy, planned_point_dose_gy, independent_point_dose_gy, deviation_percent, worst_beam_percent, verdict, findings, first_seen, changed_since";
const FINDINGS: &str = "file, sop_instance_uid, patient_id, plan_label, beam_number, check, severity, message, measured, limit";
const FILES: &str = "file, size_bytes, sha256, kind, outcome, message";

type Rows = Vec<Vec<String>>;

fn read(text: &str) -> (Vec<String>, Rows) {
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let own = |record: &csv::StringRecord| record.iter().map(str::to_owned).collect();
    let header = own(reader.headers().unwrap());
    let rows = reader.records().map(|row| own(&row.unwrap())).collect();
    (header, rows)
}

fn cell<'a>(header: &[String], row: &'a [String], column: &str) -> &'a str {
    let place = header.iter().position(|name| name == column).unwrap();
    &row[place]
}

#[test]
fn verify_headers_are_the_documented_columns() {
    let folder = Folder::new();
    sample::write(&folder.path(), 10, &sample::plans());
    let tables = [
        ("beams.csv", BEAMS, 10),
        ("plans.csv", PLANS, 4),
        ("findings.csv", FINDINGS, 3),
        ("files.csv", FILES, 8),
    ];
    let dictionary = data_dictionary();
    for (index, (name, documented, rows_expected)) in tables.into_iter().enumerate() {
        let (header, rows) = read(&sample::text(&folder.path(), name));
        let documented: Vec<&str> = documented.split(", ").collect();
        assert_eq!(&header[..documented.len()], documented, "{name}");
        assert_eq!(header.last().unwrap(), "run_id", "{name}");
        assert_eq!(rows.len(), rows_expected, "{name}");
        for row in &rows {
            assert_eq!(cell(&header, row, "run_id"), "20300102T030405Z-7f3a");
        }
        let described: Vec<&str> = dictionary[index]
            .columns
            .iter()
            .map(|column| column.name)
            .collect();
        assert_eq!(dictionary[index].file, name);
        assert_eq!(described, header, "{name}");
        assert!(
            dictionary[index]
                .columns
                .iter()
                .all(|column| !column.meaning.is_empty())
        );
    }
}

#[test]
fn verify_missing_is_empty_and_numbers_are_plain() {
    let folder = Folder::new();
    let mut plan = sample::plans().remove(3);
    plan.beams[0].planned_mu = Some(1e-7);
    plan.beams[0].planned_dose_gy = Some(f64::NAN);
    plan.beams[1].calculation.point = None;
    plan.beams[1].calculation.depths = Vec::new();
    sample::write(&folder.path(), 10, &[plan]);
    let (header, rows) = read(&sample::text(&folder.path(), "beams.csv"));
    assert_eq!(cell(&header, &rows[0], "planned_mu"), "0.0000001");
    assert_eq!(cell(&header, &rows[0], "planned_dose_gy"), "");
    assert_eq!(cell(&header, &rows[0], "depth_basis"), "plan");
    assert_eq!(cell(&header, &rows[0], "depth_cm"), "9.7");
    assert_eq!(cell(&header, &rows[0], "ssd_cm"), "90.3");
    for empty in [
        "independent_dose_gy",
        "deviation_percent",
        "method",
        "likely_cause",
        "depth_cm",
    ] {
        assert_eq!(cell(&header, &rows[1], empty), "", "{empty}");
    }
    assert_eq!(cell(&header, &rows[1], "point_basis"), "none");
    assert_eq!(cell(&header, &rows[1], "depth_basis"), "none");
    // Without a depth the plan's own SSD remains.
    assert_eq!(cell(&header, &rows[1], "ssd_cm"), "90.1");
}

#[test]
fn verify_formula_like_cells_are_harmless() {
    let folder = Folder::new();
    sample::write(&folder.path(), 10, &sample::plans());
    let (header, rows) = read(&sample::text(&folder.path(), "beams.csv"));
    let hostile = rows
        .iter()
        .find(|row| cell(&header, row, "beam_name").contains("SUM"))
        .unwrap();
    assert_eq!(
        cell(&header, hostile, "plan_label"),
        format!("'{FORMULA_NAME}")
    );
    assert_eq!(cell(&header, hostile, "beam_name"), "'@SUM(A1)");
    assert_eq!(cell(&header, hostile, "patient_id"), HOSTILE_NAME);
    assert_eq!(cell(&header, hostile, "deviation_percent"), "3.6");
    let (header, rows) = read(&sample::text(&folder.path(), "findings.csv"));
    assert_eq!(cell(&header, &rows[1], "measured"), "-1.5");
    assert_eq!(cell(&header, &rows[1], "limit"), "'=0");
}

#[test]
fn verify_harmless_text() {
    // Formula starts: OWASP, CSV injection: = + - @, tab, carriage return; the rest is our own caution.
    let cases = [
        ("=1+1", "'=1+1"),
        ("+1", "'+1"),
        ("-1", "'-1"),
        ("@A1", "'@A1"),
        ("\t=1", "' =1"),
        ("\r=1", "' =1"),
        ("  =1", "'  =1"),
        ("\u{a0}=1", "'\u{a0}=1"),
        ("\u{feff}=1", "'\u{feff}=1"),
        ("\u{ff1d}1", "'\u{ff1d}1"),
        ("\u{ff0d}1", "'\u{ff0d}1"),
        ("a;=1", "a;'=1"),
        ("a; -1", "a;' -1"),
        ("line\nbreak\u{0}\u{7f}", "line break"),
        ("a\u{202e}b", "ab"),
        ("6-FFF", "6-FFF"),
        ("", ""),
    ];
    for (text, expected) in cases {
        assert_eq!(harmless(text), expected, "{text:?}");
    }
}

#[test]
fn verify_plain_decimals() {
    let cases = [
        (0.1, "0.1"),
        (-0.0, "0"),
        (1e-9, "0.000000001"),
        (1e15, "1000000000000000"),
        (f64::NAN, ""),
        (f64::INFINITY, ""),
    ];
    for (value, expected) in cases {
        assert_eq!(plain_decimal(value), expected);
    }
}

proptest! {
    #[test]
    fn property_plain_decimal_reads_back(value in proptest::num::f64::NORMAL) {
        let text = plain_decimal(value);
        prop_assert!(!text.contains(['e', 'E', ',']));
        prop_assert_eq!(text.parse::<f64>().unwrap().to_bits(), value.to_bits());
    }

    #[test]
    fn property_no_cell_starts_a_formula(text in ".{0,12}") {
        let out = harmless(&text);
        for part in out.split(';') {
            let first = part.trim_start().chars().next();
            prop_assert!(!matches!(first, Some('=' | '+' | '-' | '@')), "{out:?}");
        }
        prop_assert!(!out.contains(char::is_control));
    }

}

proptest! {
    // Each case writes a whole report.
    #![proptest_config(ProptestConfig::with_cases(24))]

    #[test]
    fn property_tables_parse_back(name in "[\"',;\r\na= ]{0,10}") {
        let folder = Folder::new();
        let plan = sample::plan("x", "p", &name, vec![sample::beam(1, &name, 0.0, Verdict::Within)]);
        sample::write(&folder.path(), 0, &[plan]);
        let (header, rows) = read(&sample::text(&folder.path(), "beams.csv"));
        prop_assert_eq!(rows.len(), 1);
        prop_assert_eq!(cell(&header, &rows[0], "beam_name"), harmless(&name));
    }
}
