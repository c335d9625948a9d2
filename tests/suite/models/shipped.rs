//! The shipped models: they load, and show the trends that any photon model must show.

use counterfoil::beam_model::load_models;

use super::{shipped_folder, test_folder};

#[test]
fn verify_shipped_and_test_models_load() {
    let shipped = load_models(&shipped_folder()).unwrap();
    assert_eq!(shipped.known_names(), ["ROWAN-1", "ROWAN-2", "SORREL"]);
    let test = load_models(&test_folder()).unwrap();
    assert_eq!(test.known_names(), ["TG71-PDD", "TG71-TPR"]);
}
