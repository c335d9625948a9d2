//! What the loader refuses, and that each refusal names its place.

use counterfoil::beam_model::{ModelError, load_machine, load_models};

use super::{copy_folder, copy_of, edit, test_folder};

/// The refusal of a spoilt copy of the TG-71 TPR model.
fn refusal(file: &str, old: &str, new: &str) -> String {
    let copy = copy_of("tg71-tpr");
    edit(&copy, file, old, new);
    load_machine(copy.path()).unwrap_err().to_string()
}

/// Asserts that a refusal names everything that a person needs to find the place.
fn names(refusal: &str, parts: &[&str]) {
    for part in parts {
        assert!(refusal.contains(part), "`{part}` is not in: {refusal}");
    }
}

// Lines: the CSV files open with two comment lines, so the header is line 3 and depth 1.5 is line 4.

#[test]
fn verify_wrong_cells_are_named_with_file_line_and_cell() {
    let table = "6/tpr.csv";
    let cases = [
        // A cell that is no number, in the row of 5 cm (line 8), side 5.
        (
            "5,1.240,1.230,",
            "5,1.240,1.23O,",
            "line 8",
            "depth_cm 5, column `5`",
            "`1.23O` is not a number",
        ),
        (
            "5,1.240,1.230,",
            "5,1.240,,",
            "line 8",
            "depth_cm 5, column `5`",
            "the cell is empty",
        ),
        (
            "5,1.240,1.230,",
            "5,1.240,NaN,",
            "line 8",
            "depth_cm 5, column `5`",
            "not a finite number",
        ),
        (
            "5,1.240,1.230,",
            "5,1.240,inf,",
            "line 8",
            "depth_cm 5, column `5`",
            "not a finite number",
        ),
        // A decimal comma splits the cell, or is seen inside quotes.
        (
            "5,1.240,1.230,",
            "5,1.240,1,230,",
            "line 8",
            "row `5`",
            "decimal comma",
        ),
        (
            "5,1.240,1.230,",
            "5,1.240,\"1,230\",",
            "line 8",
            "depth_cm 5, column `5`",
            "decimal comma",
        ),
        // A ragged row.
        (
            "5,1.240,1.230,",
            "5,1.240,",
            "line 8",
            "row `5`",
            "11 cells where the header has 12",
        ),
        // A cell in per cent among shares, and a negative one.
        (
            "5,1.240,1.230,",
            "5,1.240,123.0,",
            "line 8",
            "depth_cm 5, column `5`",
            "outside the credible range",
        ),
        (
            "5,1.240,1.230,",
            "5,1.240,-1.230,",
            "line 8",
            "depth_cm 5, column `5`",
            "outside the credible range",
        ),
        // Coordinates that do not rise, that are none, or beyond any depth.
        (
            "\n6,1.192",
            "\n5,1.192",
            "line 9",
            "depth_cm",
            "5 follows 5",
        ),
        (
            "\n25,.517",
            "\n250,.517",
            "line 19",
            "depth_cm",
            "outside the credible range",
        ),
        (
            "depth_cm,4,5,6",
            "depth_cm,4,6,5",
            "line 3",
            "header `5`",
            "5 follows 6",
        ),
        (
            "depth_cm,4,5,6",
            "depth_cm,4,five,6",
            "line 3",
            "header `five`",
            "not a number",
        ),
        (
            "depth_cm,4,5,6",
            "depth,4,5,6",
            "line 3",
            "header `depth`",
            "must start with `depth_cm`",
        ),
        (
            "depth_cm,4,5,6",
            "depth_cm;4;5;6",
            "line 3",
            "header `depth_cm;4;5;6`",
            "separated by commas",
        ),
        // 0.95 at d0 (line 11) where the table is said to be 1.
        (
            "10,1,1,1,1,1",
            "10,1,0.95,1,1,1",
            "line 3",
            "header `5`",
            "0.9500 of full",
        ),
    ];
    for (old, new, line, cell, why) in cases {
        names(&refusal(table, old, new), &[table, line, cell, why]);
    }
    names(
        &refusal("6/output.csv", "10,1.0,1.0", "10,1.01,1.0"),
        &[
            "6/output.csv",
            "line 3",
            "header `sc`",
            "must be 1 at 10 cm",
        ],
    );
    names(
        &refusal("6/output.csv", "side_cm,sc,sp", "side_cm,sp,sc"),
        &["6/output.csv", "line 3", "side_cm,sc,sp"],
    );
    // Radius 0 is line 4.
    names(
        &refusal("6/off-axis.csv", "\n0,1,1,", "\n0,1,1.05,"),
        &[
            "6/off-axis.csv",
            "line 4",
            "radius_cm 0, column `3`",
            "must be 1 on the axis",
        ],
    );
    names(
        &refusal("6/off-axis.csv", "\n0,1,1,", "\n1,1,1,"),
        &["6/off-axis.csv", "the first radius_cm must be 0"],
    );
}

#[test]
fn verify_wrong_keys_are_named_with_file_and_line() {
    let file = "machine.toml";
    let cases: [(&str, &str, &[&str]); 19] = [
        (
            "exchange_k = 1.0",
            "exchange_kk = 1.0",
            &["line 31", "exchange_kk"],
        ),
        ("exchange_k = 1.0", "", &["exchange_k"]),
        (
            "exchange_k = 1.0",
            "exchange_k = 10.0",
            &["line 31", "10", "0.3 to 4"],
        ),
        ("exchange_k = 1.0", "exchange_k = nan", &["line 31", "NaN"]),
        (
            "energy_mv = 6.0",
            "energy_mv = 6000.0",
            &["line 30", "kV or keV"],
        ),
        (
            "sad_cm = 100.0",
            "sad_cm = 1000.0",
            &["line 6", "1000 cm is outside", "in mm?"],
        ),
        (
            "dose_per_mu_cgy = 0.8",
            "dose_per_mu_cgy = 0.008",
            &["Gy/MU where cGy/MU is wanted"],
        ),
        (
            "radiation = \"PHOTON\"",
            "radiation = \"ELECTRON\"",
            &["ELECTRON", "PHOTON"],
        ),
        ("on = 2014-03-01", "on = \"March 2014\"", &["line 11"]),
        (
            "on = 2014-03-01",
            "on = 2014-03-01T10:00:00",
            &["line 11", "a date such as"],
        ),
        (
            "until = 2099-12-31",
            "until = 1999-12-31",
            &["approval.until", "before"],
        ),
        (
            "schema = 1",
            "schema = 2",
            &["schema", "must be 1", "it is 2"],
        ),
        ("schema = 1", "", &["schema", "none is stated"]),
        (
            "serves = [\"TG71-TPR\"]",
            "serves = [\"A\", \" A \"]",
            &["line 5", "`A` is given twice"],
        ),
        (
            "serves = [\"TG71-TPR\"]",
            "serves = []",
            &["serves", "no treatment machine name"],
        ),
        (
            "place = \"lower\"",
            "place = \"upper\"",
            &["jaws", "one with \"lower\""],
        ),
        (
            "kind = \"tpr\"",
            "kind = \"pdd\"",
            &["beams 6, depth_table.ssd_cm", "needs the SSD"],
        ),
        (
            "kind = \"tpr\"",
            "kind = \"tpr\"\nssd_cm = 100.0",
            &["beams 6, depth_table.ssd_cm", "does not depend on SSD"],
        ),
        (
            "d_max_cm = 1.5",
            "d_max_cm = 11.5",
            &["reference.depth_cm", "build-up"],
        ),
    ];
    for (old, new, parts) in cases {
        let text = refusal(file, old, new);
        names(&text, &[file]);
        names(&text, parts);
    }
}

#[test]
fn verify_files_outside_the_folder_are_refused() {
    for outside in [
        "../tpr.csv",
        "/etc/hostname",
        "6/../../tpr.csv",
        "",
        "6\\\\tpr.csv",
    ] {
        let text = refusal("machine.toml", "\"6/tpr.csv\"", &format!("\"{outside}\""));
        names(
            &text,
            &["machine.toml", "must lie inside the model's folder"],
        );
    }
}

#[cfg(unix)]
#[test]
fn verify_a_link_out_of_the_folder_is_refused() {
    let copy = copy_of("tg71-tpr");
    let table = copy.path().join("6/tpr.csv");
    std::fs::remove_file(&table).unwrap();
    std::os::unix::fs::symlink(test_folder().join("tg71-tpr/6/tpr.csv"), &table).unwrap();
    let refusal = load_machine(copy.path()).unwrap_err();
    assert!(matches!(refusal, ModelError::Outside { .. }), "{refusal}");
}

#[test]
fn verify_missing_oversized_and_binary_files_are_refused() {
    let copy = copy_of("tg71-tpr");
    let table = copy.path().join("6/tpr.csv");
    let text = std::fs::read(&table).unwrap();

    std::fs::remove_file(&table).unwrap();
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["6/tpr.csv", "cannot be read"],
    );

    std::fs::create_dir(&table).unwrap();
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["6/tpr.csv", "cannot be read"],
    );
    std::fs::remove_dir(&table).unwrap();

    std::fs::write(&table, vec![b'#'; 5 * 1024 * 1024]).unwrap();
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["6/tpr.csv", "larger than"],
    );

    let mut spoilt = text.clone();
    spoilt.extend_from_slice(b"\n30,\xff\n");
    std::fs::write(&table, spoilt).unwrap();
    // 19 lines as they are, ending with a line feed, then an empty one.
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["6/tpr.csv", "line 21", "UTF-8"],
    );

    std::fs::write(&table, "# nothing\n").unwrap();
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["6/tpr.csv", "at least two rows"],
    );

    std::fs::write(&table, "depth_cm,10\n1.5,1.3\n10,1\n").unwrap();
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["6/tpr.csv", "at least two field sides"],
    );

    // Byte order mark and CRLF are how spreadsheets write.
    let as_spreadsheet = String::from_utf8(text).unwrap().replace('\n', "\r\n");
    std::fs::write(&table, format!("\u{feff}{as_spreadsheet}")).unwrap();
    load_machine(copy.path()).unwrap();
}

#[test]
fn verify_two_models_for_one_name_are_refused_with_both_named() {
    let folder = tempfile::tempdir().unwrap();
    copy_folder(
        &test_folder().join("tg71-tpr"),
        &folder.path().join("first"),
    );
    copy_folder(
        &test_folder().join("tg71-tpr"),
        &folder.path().join("second"),
    );
    let text = load_models(folder.path()).unwrap_err().to_string();
    names(
        &text,
        &["`TG71-TPR`", "first/machine.toml", "second/machine.toml"],
    );
}

#[test]
fn verify_folders_without_models_are_refused_and_a_model_itself_is_accepted() {
    let empty = tempfile::tempdir().unwrap();
    let refusal = load_models(empty.path()).unwrap_err();
    assert!(matches!(refusal, ModelError::NoModels { .. }), "{refusal}");
    let missing = load_models(&empty.path().join("nowhere")).unwrap_err();
    names(&missing.to_string(), &["nowhere", "cannot be read"]);
    let one = load_models(&test_folder().join("tg71-pdd")).unwrap();
    assert_eq!(one.known_names(), ["TG71-PDD"]);
    assert_eq!(one.machines[0].name, "tg71-pdd");
}

#[test]
fn verify_beams_that_one_energy_could_mean_are_refused() {
    let copy = copy_of("tg71-tpr");
    let path = copy.path().join("machine.toml");
    let text = std::fs::read_to_string(&path).unwrap();
    let beam = text.find("[[beams]]").unwrap();
    let second = text[beam..].replace("label = \"6\"", "label = \"six\"");
    std::fs::write(&path, format!("{text}{second}")).unwrap();
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["`6` and `six`", "same energy"],
    );

    let fff = second.replace(
        "energy_mv = 6.0",
        "energy_mv = 6.0\nfluence_mode_ids = [\"FFF\"]",
    );
    std::fs::write(&path, format!("{text}{fff}")).unwrap();
    assert_eq!(load_machine(copy.path()).unwrap().beams.len(), 2);
}

#[test]
fn verify_couch_arcs_that_overlap_are_refused() {
    let with_couch = |arcs: &[(f64, f64)]| {
        let copy = copy_of("tg71-tpr");
        let path = copy.path().join("machine.toml");
        let mut text = std::fs::read_to_string(&path).unwrap();
        for (from, to) in arcs {
            text.push_str(&format!(
                "\n[[beams.couch]]\nfrom_gantry_deg = {from:?}\nto_gantry_deg = {to:?}\ntransmission = 0.97\n"
            ));
        }
        std::fs::write(&path, text).unwrap();
        load_machine(copy.path()).map(|machine| machine.beams[0].couch.len())
    };
    assert_eq!(with_couch(&[(90.0, 180.0), (180.0, 270.0)]).unwrap(), 2);
    assert_eq!(with_couch(&[(300.0, 60.0), (60.0, 300.0)]).unwrap(), 2);
    for arcs in [
        [(90.0, 180.0), (170.0, 270.0)],
        [(300.0, 60.0), (30.0, 90.0)],
        [(90.0, 180.0), (100.0, 110.0)],
        [(90.0, 180.0), (90.0, 100.0)],
    ] {
        names(
            &with_couch(&arcs).unwrap_err().to_string(),
            &["couch", "overlap"],
        );
    }
}

#[test]
fn property_fingerprint_follows_every_file_and_nothing_else() {
    let copy = copy_of("tg71-tpr");
    let fingerprint = || load_machine(copy.path()).unwrap().fingerprint;
    let original = fingerprint();
    assert_eq!(original.len(), 64);
    assert_eq!(original, fingerprint());
    std::fs::write(copy.path().join("notes.txt"), "not part of the model").unwrap();
    assert_eq!(original, fingerprint());
    for file in [
        "machine.toml",
        "6/tpr.csv",
        "6/output.csv",
        "6/off-axis.csv",
    ] {
        let path = copy.path().join(file);
        let text = std::fs::read(&path).unwrap();
        // One byte, in a comment.
        let mut changed = text.clone();
        changed[2] ^= 1;
        std::fs::write(&path, changed).unwrap();
        assert_ne!(original, fingerprint(), "{file}");
        std::fs::write(&path, text).unwrap();
    }
    assert_eq!(original, fingerprint());
}

#[test]
fn verify_a_table_of_the_maximum_is_renormalised_to_d0() {
    let copy = copy_of("tg71-tpr");
    // A TMR of two sides: 0.9 / 0.8 at 5 cm and 0.7 / 0.6 at 10 cm become 9/7 and 8/6 at d0 = 10 cm.
    std::fs::write(
        copy.path().join("6/tpr.csv"),
        "depth_cm,4,40\n1.5,1,1\n5,0.9,0.8\n10,0.7,0.6\n20,0.35,0.3\n",
    )
    .unwrap();
    edit(&copy, "machine.toml", "kind = \"tpr\"", "kind = \"tmr\"");
    names(
        &load_machine(copy.path()).unwrap_err().to_string(),
        &["a TMR is normalised at d_max"],
    );
    edit(
        &copy,
        "machine.toml",
        "normalised_at = \"d0\"",
        "normalised_at = \"d_max\"",
    );
    let machine = load_machine(copy.path()).unwrap();
    let table = &machine.beams[0].depth_table;
    let at = |depth, side| table.at(depth, side).unwrap().value;
    let near = |value: f64, expected: f64| assert!((value - expected).abs() < 1e-12, "{value}");
    near(at(5.0, 4.0), 9.0 / 7.0);
    near(at(5.0, 40.0), 8.0 / 6.0);
    near(at(10.0, 4.0), 1.0);
    near(at(20.0, 40.0), 0.5);
}
