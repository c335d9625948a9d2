//! The page: what it must say, in which order, and what it must never hold.

use counterfoil::audit::{PlanEntry, Verdict};

use super::sample::{self, Folder, HOSTILE_NAME};

fn page(plans_in_full: usize, plans: &[PlanEntry]) -> String {
    let folder = Folder::new();
    sample::write(&folder.path(), plans_in_full, plans);
    if let Some(keep) = std::env::var_os("COUNTERFOIL_KEEP_PAGE") {
        std::fs::copy(folder.path().join("report.html"), keep).unwrap();
    }
    sample::text(&folder.path(), "report.html")
}

fn between<'a>(text: &'a str, from: &str, to: &str) -> &'a str {
    let start = text.find(from).unwrap();
    let end = text[start..].find(to).unwrap();
    &text[start..start + end]
}

#[test]
fn verify_page_says_what_it_must() {
    let page = page(10, &sample::plans());
    for text in [
        "supports and does not replace a qualified physicist&#39;s review, measurement, licensed practice and local rules",
        "supports and does not replace a qualified physicist's review, measurement, licensed practice and local rules",
    ] {
        if page.contains(text) {
            break;
        }
    }
    for text in [
        "does not replace a qualified physicist's review, measurement, licensed practice and local rules",
        "Demonstration data, not for clinical use",
        "Model not approved",
        "20300102T030405Z-7f3a",
        "built-in defaults (no site file)",
        "fluence-mode-not-stated",
        "5e884898da28047151d0e56f8dc6292773603d0d6aabbdd62a11ef721d1542d8",
        "The file ends inside BeamSequence",
        "same instance, same bytes",
        "default-src 'none'",
        "role=\"img\"",
        "6/tpr.csv, depths 9 and 10, sides 10 and 15",
        "not a verification",
        "Exit status 1",
    ] {
        assert!(page.contains(text), "{text}");
    }
}
