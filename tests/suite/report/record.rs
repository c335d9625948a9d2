//! `audit.json`: valid, unrounded, without NaN, with a schema version.

use super::sample::{self, Folder};

#[test]
fn verify_audit_json_parses_and_has_everything() {
    let folder = Folder::new();
    let mut plans = sample::plans();
    plans[0].beams[0].planned_mu = Some(f64::NAN);
    plans[0].beams[0].planned_dose_gy = Some(1.0 / 3.0);
    sample::write(&folder.path(), 1, &plans);
    let text = sample::text(&folder.path(), "audit.json");
    let json: serde_json::Value = serde_json::from_str(&text).unwrap();
    assert_eq!(json["schema"], "counterfoil.audit/1");
    assert_eq!(json["run"]["run_id"], "20300102T030405Z-7f3a");
    assert_eq!(json["plans"].as_array().unwrap().len(), 4);
    assert_eq!(json["files"].as_array().unwrap().len(), 8);
    assert_eq!(json["summary"]["complete"], false);
    let beam = &json["plans"][0]["beams"][0];
    assert!(beam["planned_mu"].is_null());
    assert_eq!(
        beam["planned_dose_gy"].as_f64().unwrap().to_bits(),
        (1.0f64 / 3.0).to_bits()
    );
    assert_eq!(beam["verdict"], "within");
    assert!(!text.contains("NaN"));
    assert_eq!(json["files"][4]["outcome"], "duplicate-of");
}

#[test]
fn verify_audit_json_without_plans_and_files_is_valid() {
    let folder = Folder::new();
    let writer =
        counterfoil::report::ReportWriter::create(&folder.path(), &sample::run(5)).unwrap();
    writer.finish(&sample::summary()).unwrap();
    let text = sample::text(&folder.path(), "audit.json");
    let json: serde_json::Value = serde_json::from_str(&text).unwrap();
    assert_eq!(json["plans"].as_array().unwrap().len(), 0);
    assert_eq!(json["files"].as_array().unwrap().len(), 0);
}
