//! Damaged model files: refused or read, never a panic; and what is read can be checked and looked up.

use counterfoil::beam_model::{check_machine, load_machine};
use counterfoil::quantity::{CollimatorSquare, PointSquare, SurfaceSquare};
use proptest::prelude::*;

use super::copy_of;

const FILES: [&str; 4] = [
    "machine.toml",
    "6/pdd.csv",
    "6/output.csv",
    "6/off-axis.csv",
];

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn property_damaged_files_never_panic(
        file in 0_usize..4,
        edits in prop::collection::vec((any::<prop::sample::Index>(), "[-0-9.,;#\"\n\\[\\]=a-e \u{e9}]{0,4}", 0_usize..4), 1..4),
    ) {
        let copy = copy_of("tg71-pdd");
        let path = copy.path().join(FILES[file]);
        let mut text: Vec<u8> = std::fs::read(&path).unwrap();
        for (at, insert, remove) in edits {
            let at = at.index(text.len());
            let end = (at + remove).min(text.len());
            text.splice(at..end, insert.bytes());
        }
        std::fs::write(&path, text).unwrap();
        match load_machine(copy.path()) {
            Err(error) => prop_assert!(error.to_string().contains(copy.path().to_str().unwrap())),
            Ok(machine) => {
                let _ = check_machine(&machine, jiff::civil::date(2026, 12, 1));
                for beam in &machine.beams {
                    for value in [-1.0, 0.0, 1.5, 9.99, 40.0, 1e9, f64::NAN, f64::INFINITY] {
                        let _ = beam.tpr(value, PointSquare::new(value));
                        let _ = beam.pdd_percent(10.0, SurfaceSquare::new(value), 90.0);
                        let _ = beam.sc(CollimatorSquare::new(value));
                        let _ = beam.off_axis_ratio(value, value);
                    }
                }
            }
        }
    }
}
