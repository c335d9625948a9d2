//! A model's page and check text: every beam and finding is on them, and texts of the model cannot become markup.

use counterfoil::beam_model::{ModelSeverity, check_machine};
use counterfoil::report::{model_check_text, model_page};
use jiff::civil::date;

use super::shipped_machines;

#[test]
fn verify_page_shows_every_beam_with_curves_and_is_self_contained() {
    let today = date(2026, 12, 1);
    for machine in shipped_machines() {
        let findings = check_machine(&machine, today);
        let page = model_page(&machine, &findings, today, "0.0.0").unwrap();
        assert!(page.contains(&format!("<h1>Beam model {}</h1>", machine.name)));
        assert!(page.contains("Demonstration data, not for clinical use"));
        assert!(!page.contains("Model not approved"));
        assert!(page.contains(&machine.fingerprint));
        for beam in &machine.beams {
            assert!(page.contains(&format!("<h2>Beam {}</h2>", beam.label)));
        }
        // Three drawings a beam: depth table, output factors, off-axis ratios; dots are the table's own values.
        assert_eq!(
            page.matches("class=\"curves\"").count(),
            3 * machine.beams.len()
        );
        assert!(page.matches("class=\"dot\"").count() > 200 * machine.beams.len());
        assert_eq!(
            page.matches("<script").count()
                + page.matches("http://").count()
                + page.matches("src=").count(),
            0
        );
        let late = model_page(&machine, &findings, date(2100, 1, 1), "0.0.0").unwrap();
        assert!(late.contains("Model not approved"));
    }
}

#[test]
fn verify_texts_of_a_model_are_escaped_on_its_page() {
    let mut machine = shipped_machines().remove(0);
    machine.provenance.remark = "<script>alert(1)</script>".to_owned();
    machine.beams[0].label = "<b>6".to_owned();
    let today = date(2026, 12, 1);
    let page = model_page(&machine, &check_machine(&machine, today), today, "0.0.0").unwrap();
    assert!(!page.contains("<script") && !page.contains("<b>6"));
}

#[test]
fn verify_check_text_has_every_finding_worst_first_and_their_count() {
    let mut machine = shipped_machines().remove(0);
    machine.beams[0].exchange_k = 0.4;
    machine.beams[1].d_max_cm = 2.0;
    let findings = check_machine(&machine, date(2026, 12, 1));
    let text = model_check_text(&machine, &findings);
    for finding in &findings {
        assert!(text.contains(&finding.to_string()), "{finding}");
    }
    let place = |word| text.find(word).unwrap();
    assert!(place("  error: ") < place("  warning: ") && place("  warning: ") < place("  note: "));
    let count = |severity| {
        findings
            .iter()
            .filter(|finding| finding.severity == severity)
            .count()
    };
    let last = format!(
        "  errors {}, warnings {}, notes {}\n",
        count(ModelSeverity::Error),
        count(ModelSeverity::Warning),
        count(ModelSeverity::Note)
    );
    assert!(text.ends_with(&last), "{text}");
}
