//! Wedges of a beam model: look-ups by hand, what the loader refuses, and
//! errors planted in wedge tables, which the model check must point at.

use counterfoil::beam_model::{
    JawAxis, MachineModel, ModelFinding, ModelSeverity, WedgeModelKind, check_machine, load_machine,
};
use counterfoil::quantity::PointSquare;
use jiff::civil::date;
use proptest::prelude::*;

use super::{copy_folder, edit, shipped_folder, shipped_machines};

fn copy_of_rowan() -> tempfile::TempDir {
    let copy = tempfile::tempdir().unwrap();
    copy_folder(&shipped_folder().join("rowan"), copy.path());
    copy
}

/// The refusal of a spoilt copy of the shipped model.
fn refusal(file: &str, old: &str, new: &str) -> String {
    let copy = copy_of_rowan();
    edit(&copy, file, old, new);
    load_machine(copy.path()).unwrap_err().to_string()
}

/// Findings beyond notes of a copy changed by `change`.
fn findings(change: impl FnOnce(&tempfile::TempDir)) -> Vec<ModelFinding> {
    let copy = copy_of_rowan();
    change(&copy);
    let mut machine = load_machine(copy.path()).unwrap();
    machine.beams.truncate(1);
    check_machine(&machine, date(2026, 12, 1))
        .into_iter()
        .filter(|finding| finding.severity > ModelSeverity::Note)
        .collect()
}

fn texts(findings: &[ModelFinding]) -> String {
    let lines: Vec<String> = findings.iter().map(ToString::to_string).collect();
    lines.join("\n")
}

#[test]
fn verify_shipped_wedges_by_kind_and_id() {
    let machines: Vec<MachineModel> = shipped_machines();
    for beam in &machines[0].beams {
        let kinds: Vec<(&str, WedgeModelKind, f64)> = beam
            .wedges
            .iter()
            .map(|wedge| (wedge.id.as_str(), wedge.kind(), wedge.angle_deg))
            .collect();
        // As machine.toml says.
        assert_eq!(
            kinds,
            [
                ("W15", WedgeModelKind::Fixed, 15.0),
                ("W30", WedgeModelKind::Fixed, 30.0),
                ("W45", WedgeModelKind::Fixed, 45.0),
                ("W60", WedgeModelKind::Fixed, 60.0),
                ("M60", WedgeModelKind::Motorised, 60.0),
                ("D60", WedgeModelKind::Dynamic, 60.0),
            ]
        );
        // Blanks around an ID do not count, case does; a further ID means the same wedge.
        assert_eq!(beam.wedge(" W30 ").unwrap().id, "W30");
        assert!(beam.wedge("w30").is_none() && beam.wedge("").is_none());
        assert_eq!(beam.wedge("D30").unwrap().id, "D60");
        let sweep = beam.wedge("D60").unwrap().sweep().unwrap();
        assert_eq!(sweep.moves_along, JawAxis::Y);
        assert_eq!(sweep.closing_gap_cm, 0.5);
        assert!(beam.wedge("D60").unwrap().tables().is_none());
    }
    assert!(machines[1].beams.iter().all(|beam| beam.wedges.is_empty()));
}

#[test]
fn verify_look_ups_by_hand() {
    let machines = shipped_machines();
    let tables = machines[0].beams[0].wedge("W60").unwrap().tables().unwrap();
    // 6/wedge-W60.csv: depth 5, sides 10 and 12: 0.3970 0.3981; depth 7.5: 0.3995 0.4006. At 6 cm and side 11:
    // 0.39755 + (0.40005 - 0.39755) * 1/2.5 = 0.39855.
    let found = tables.factor(6.0, PointSquare::new(11.0)).unwrap();
    assert!((found.value - 0.398_55).abs() < 1e-9, "{}", found.value);
    // 6/wedge-W60-profile.csv: -7 0.5008, -6 0.5540; a quarter of the way up from -7: 0.5008 + 0.0532/4 = 0.5141.
    let found = tables.profile(-6.75).unwrap();
    assert!((found.value - 0.5141).abs() < 1e-9, "{}", found.value);
    // Never beyond the table: depth 1.5 to 35, side 4 to 25, position -10 to 10.
    let refused = tables.factor(1.0, PointSquare::new(10.0)).unwrap_err();
    assert_eq!(
        (refused.axis, refused.least, refused.greatest),
        ("depth_cm", 1.5, 35.0)
    );
    let refused = tables.factor(10.0, PointSquare::new(26.0)).unwrap_err();
    assert_eq!(
        (refused.axis, refused.least, refused.greatest),
        ("side_cm", 4.0, 25.0)
    );
    let refused = tables.profile(10.5).unwrap_err();
    assert_eq!(
        (refused.axis, refused.least, refused.greatest),
        ("position_cm", -10.0, 10.0)
    );
    assert!(tables.profile(f64::NAN).is_err());
    // 6/wedge-D60-segments.csv: -20 0.05869, -19.5 0.06158; the middle 0.060135. All has been delivered at 9.5.
    let sweep = machines[0].beams[0].wedge("D60").unwrap().sweep().unwrap();
    let found = sweep.delivered_share(-19.75).unwrap();
    assert!((found.value - 0.060_135).abs() < 1e-9, "{}", found.value);
    assert_eq!(sweep.delivered_share(9.5).unwrap().value, 1.0);
    assert!(sweep.delivered_share(9.6).is_err());
}

#[test]
fn verify_wrong_wedge_tables_are_refused_with_file_line_and_cell() {
    // The files open with two comment lines: the header is line 3, the first row line 4.
    let cases: &[(&str, &str, &str, &[&str])] = &[
        // A factor of 1.3 where a wedge lets less through than none.
        (
            "6/wedge-W60.csv",
            "5,0.3937,",
            "5,1.3937,",
            &[
                "6/wedge-W60.csv",
                "line 6",
                "depth_cm 5, column `4`",
                "outside the credible range 0.05 to 1",
            ],
        ),
        (
            "6/wedge-W60.csv",
            "5,0.3937,",
            "5,,",
            &["line 6", "depth_cm 5, column `4`", "the cell is empty"],
        ),
        (
            "6/wedge-W60.csv",
            "depth_cm,4,6",
            "depth_cm,6,4",
            &["line 3", "header `4`", "4 follows 6"],
        ),
        (
            "6/wedge-W60-profile.csv",
            "\n0,1.0000\n",
            "\n0,1.0300\n",
            &["6/wedge-W60-profile.csv", "must be 1 on the axis", "1.0300"],
        ),
        (
            "6/wedge-W60-profile.csv",
            "position_cm,ratio",
            "position_cm,factor",
            &["line 3", "must be `position_cm,ratio`"],
        ),
        (
            "6/wedge-W60-profile.csv",
            "\n-7,0.5008\n",
            "\n-7,50.08\n",
            &[
                "line 7",
                "position_cm -7, column `ratio`",
                "outside the credible range",
            ],
        ),
        (
            "6/wedge-D60-segments.csv",
            "\n-19.5,0.06158\n",
            "\n-19.5,0.03158\n",
            &[
                "6/wedge-D60-segments.csv",
                "line 5",
                "position_cm -19.5",
                "0.03158 follows 0.05869",
            ],
        ),
        (
            "6/wedge-D60-segments.csv",
            "\n9.5,1.00000\n",
            "\n9.5,0.99900\n",
            &[
                "line 63",
                "position_cm 9.5",
                "ends with a share of 1, not 0.999",
            ],
        ),
    ];
    for (file, old, new, parts) in cases {
        let refusal = refusal(file, old, new);
        for part in *parts {
            assert!(refusal.contains(part), "`{part}` is not in: {refusal}");
        }
    }
}

#[test]
fn verify_wedge_keys_that_do_not_go_together_are_refused() {
    let cases = [
        ("id = \"W15\" ", "id = \"W30\" ", "`W30` is given twice"),
        // A further ID that another wedge bears.
        (
            "# further_ids = [\"W15L\"] ",
            "further_ids = [\"D45\"] ",
            "`D45` is given twice",
        ),
        (
            "profile_file = \"6/wedge-W30-profile.csv\"",
            "",
            "beams 6, wedges W30, profile_file: a fixed wedge needs it",
        ),
        (
            "factor_file = \"6/wedge-M60.csv\"",
            "",
            "beams 6, wedges M60, factor_file: a motorised wedge needs it",
        ),
        (
            "factor_file = \"6/wedge-W45.csv\"",
            "factor_file = \"6/wedge-W45.csv\"\nclosing_gap_cm = 0.5",
            "beams 6, wedges W45, closing_gap_cm: a fixed wedge has none",
        ),
        (
            "moves_along = \"y\"                # the axis of the jaw pair",
            "",
            "beams 6, wedges D60, moves_along: a dynamic wedge needs it",
        ),
        (
            "closing_gap_cm = 0.5             #",
            "closing_gap_cm = 5.0             #",
            "outside the credible range 0 to 2 cm",
        ),
        (
            "angle_deg = 15.0                 #",
            "angle_deg = 150.0                #",
            "outside the credible range 1 to 75 degrees",
        ),
        (
            "kind = \"fixed\"                   #",
            "kind = \"virtual\"                 #",
            "unknown variant `virtual`",
        ),
        (
            "segments_file = \"6/wedge-D60-segments.csv\"  #",
            "segments_file = \"../wedge-D60-segments.csv\"  #",
            "must lie inside the model's folder",
        ),
    ];
    for (old, new, wanted) in cases {
        let refusal = refusal("machine.toml", old, new);
        assert!(refusal.contains(wanted), "`{wanted}` is not in: {refusal}");
        assert!(refusal.contains("machine.toml"), "{refusal}");
    }
}

#[test]
fn property_the_fingerprint_follows_the_wedge_tables() {
    let before = load_machine(copy_of_rowan().path()).unwrap().fingerprint;
    for (file, old, new) in [
        ("6/wedge-W60.csv", "5,0.3937,", "5,0.3938,"),
        ("18/wedge-W15-profile.csv", "\n0,1.0000\n", "\n0,1.0001\n"),
        (
            "6/wedge-D60-segments.csv",
            "\n-19.5,0.06158\n",
            "\n-19.5,0.06159\n",
        ),
    ] {
        let copy = copy_of_rowan();
        edit(&copy, file, old, new);
        assert_ne!(
            load_machine(copy.path()).unwrap().fingerprint,
            before,
            "{file}"
        );
    }
}

#[test]
fn validate_planted_errors_of_3_percent_in_wedge_tables_are_pointed_at() {
    let mut planted = 0;
    for file in [
        "6/wedge-W15.csv",
        "6/wedge-M60.csv",
        "6/wedge-W60-profile.csv",
        "6/wedge-D60-segments.csv",
    ] {
        let text = std::fs::read_to_string(shipped_folder().join("rowan").join(file)).unwrap();
        let lines: Vec<&str> = text.lines().collect();
        let header: Vec<&str> = lines[2].split(',').collect();
        // Every seventh row of every second column is enough, the first and last too.
        let rows = (3..lines.len()).filter(|line| (line - 3) % 7 == 0 || line + 1 == lines.len());
        for line in rows {
            for column in (1..header.len()).step_by(2) {
                let mut cells: Vec<String> = lines[line].split(',').map(str::to_owned).collect();
                let value: f64 = cells[column].parse().unwrap();
                let place: f64 = cells[0].parse().unwrap();
                // 1 on the axis and at the end of a sweep are the loader's matter.
                let loaders = (file.contains("profile") && place == 0.0)
                    || (file.contains("segments") && line + 1 == lines.len());
                if loaders {
                    continue;
                }
                let sign = if line % 2 == 0 { 1.03 } else { 0.97 };
                cells[column] = format!("{:.5}", (value * sign).min(1.0_f64.max(value)));
                let mut spoilt: Vec<String> = lines.iter().map(|&line| line.to_owned()).collect();
                spoilt[line] = cells.join(",");
                let copy = copy_of_rowan();
                std::fs::write(copy.path().join(file), spoilt.join("\n") + "\n").unwrap();
                let Ok(mut machine) = load_machine(copy.path()) else {
                    // A sweep that falls is refused at once.
                    assert!(file.contains("segments"), "{file} {place}");
                    continue;
                };
                machine.beams.truncate(1);
                planted += 1;
                let found = check_machine(&machine, date(2026, 12, 1))
                    .into_iter()
                    .filter(|finding| finding.severity > ModelSeverity::Note)
                    .any(|finding| {
                        finding.table.as_deref() == Some(file)
                            && finding.place.is_some_and(|at| at.row == place)
                    });
                assert!(found, "{file}, {place}, column {}", header[column]);
            }
        }
    }
    println!("{planted} planted, all pointed at");
    assert!(planted > 20);
}

#[test]
fn verify_exchanged_and_turned_tables_are_pointed_at() {
    // The shipped model as it is: nothing to object to.
    assert_eq!(texts(&findings(|_| {})), "");
    let copy_over = |copy: &tempfile::TempDir, from: &str, to: &str| {
        std::fs::copy(copy.path().join(from), copy.path().join(to)).unwrap();
    };
    // The factors of 60 degrees under 30: 0.402 where 0.42 to 0.80 is usual, and 45 degrees then lets more through.
    let found = texts(&findings(|copy| {
        copy_over(copy, "6/wedge-W60.csv", "6/wedge-W30.csv")
    }));
    assert!(
        found.contains("outside the usual range 0.42 to 0.8 of 30 degrees"),
        "{found}"
    );
    assert!(found.contains("the steeper one usually less"), "{found}");
    // The profile of 15 degrees under 45: tan 15 = 0.27 where tan 45 = 1.
    let found = texts(&findings(|copy| {
        copy_over(copy, "6/wedge-W15-profile.csv", "6/wedge-W45-profile.csv");
    }));
    assert!(
        found.contains("as steep as that of about 15 degrees"),
        "{found}"
    );
    // A profile turned round: the thin end at negative positions.
    let turned = findings(|copy| {
        let path = copy.path().join("6/wedge-W45-profile.csv");
        let text = std::fs::read_to_string(&path).unwrap();
        let (head, rows): (Vec<&str>, Vec<&str>) =
            text.lines().partition(|line| line.starts_with(['#', 'p']));
        let mut rows: Vec<(f64, &str)> = rows
            .iter()
            .map(|row| row.split_once(',').unwrap())
            .map(|(place, ratio)| (-place.parse::<f64>().unwrap(), ratio))
            .collect();
        rows.reverse();
        let rows: Vec<String> = rows
            .iter()
            .map(|(place, ratio)| format!("{place},{ratio}"))
            .collect();
        std::fs::write(&path, format!("{}\n{}\n", head.join("\n"), rows.join("\n"))).unwrap();
    });
    assert!(
        texts(&turned).contains("turned round"),
        "{}",
        texts(&turned)
    );
    assert!(
        turned
            .iter()
            .any(|finding| finding.severity == ModelSeverity::Error)
    );
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 100, failure_persistence: None, ..ProptestConfig::default() })]

    /// Refused or read, never a panic; and what is read can be checked and looked up.
    #[test]
    fn property_damaged_wedge_tables_never_panic(
        file in 0_usize..3,
        edits in prop::collection::vec((any::<prop::sample::Index>(), "[-0-9.,;#\"\n]{0,4}", 0_usize..4), 1..4),
    ) {
        let file = ["6/wedge-W60.csv", "6/wedge-W60-profile.csv", "6/wedge-D60-segments.csv"][file];
        let copy = copy_of_rowan();
        let path = copy.path().join(file);
        let mut text: Vec<u8> = std::fs::read(&path).unwrap();
        for (at, insert, remove) in edits {
            let at = at.index(text.len());
            let end = (at + remove).min(text.len());
            text.splice(at..end, insert.bytes());
        }
        std::fs::write(&path, text).unwrap();
        match load_machine(copy.path()) {
            Err(error) => prop_assert!(error.to_string().contains(file), "{error}"),
            Ok(mut machine) => {
                machine.beams.truncate(1);
                let _ = check_machine(&machine, date(2026, 12, 1));
                for wedge in &machine.beams[0].wedges {
                    for value in [-1e9, -1.0, 0.0, 9.99, 40.0, f64::NAN, f64::INFINITY] {
                        let _ = wedge.tables().map(|tables| tables.profile(value));
                        let _ = wedge.tables().map(|tables| tables.factor(value, PointSquare::new(value)));
                        let _ = wedge.sweep().map(|sweep| sweep.delivered_share(value));
                    }
                }
            }
        }
    }
}
