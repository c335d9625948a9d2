//! The page: what it must say, in which order, and what it must never hold.

use counterfoil::audit::{Judgement, PlanEntry, Verdict};

use super::sample::{self, FORMULA_NAME, Folder, HOSTILE_NAME};

fn page(plans_in_full: usize, plans: &[PlanEntry]) -> String {
    let folder = Folder::new();
    sample::write(&folder.path(), plans_in_full, plans);
    sample::text(&folder.path(), "report.html")
}

/// Leaves the sample page under the build folder, for the eye: screen, dark mode, print preview.
fn leave_for_the_eye(page: &str) {
    let place = std::path::Path::new(env!("CARGO_TARGET_TMPDIR")).join("sample-report.html");
    std::fs::write(place, page).unwrap();
}

/// The first stretch of text from one mark to the next.
fn between<'a>(text: &'a str, from: &str, to: &str) -> &'a str {
    let start = text.find(from).unwrap_or_else(|| panic!("no {from:?}"));
    let rest = &text[start..];
    let end = rest[from.len()..]
        .find(to)
        .unwrap_or_else(|| panic!("no {to:?}"));
    &rest[..from.len() + end]
}

fn attention(page: &str) -> Vec<&str> {
    let table = between(page, "<table class=\"attention\">", "</table>");
    table.split("<tr>").skip(2).collect()
}

#[test]
fn verify_page_says_what_it_must() {
    let page = page(10, &sample::plans());
    leave_for_the_eye(&page);
    for text in [
        "This report supports and does not replace a qualified physicist's review, measurement, licensed practice and local rules.",
        "Demonstration data, not for clinical use",
        "Model not approved",
        "20300102T030405Z-7f3a",
        "Exit status 1: a treatment beam is beyond its tolerance.",
        "The audit is incomplete",
        "4 plans, in the order of the files; each in full further down.",
        "built-in defaults (no site file)",
        "fluence-mode-not-stated",
        "5e884898da28047151d0e56f8dc6292773603d0d6aabbdd62a11ef721d1542d8",
        "made by a script for demonstration",
        "not approved:",
        "The file ends inside BeamSequence (300A,00B0), byte 1811",
        "the same as plans/monday/a.dcm: same instance, same bytes",
        "6/tpr.csv, depths 9 and 10, sides 10 and 15",
        "dose per MU = D&#39;0 \u{d7} Sc \u{d7} Sp \u{d7} TPR \u{d7} OAR \u{d7} ISF",
        "AAPM TG-71, isocentric form",
        "the planning system&#39;s word",
        "2.0 mm on the planning system&#39;s word, 3.6 %/cm",
        "judged: +0.2 % of total",
        "outside the method&#39;s range",
    ] {
        assert!(page.contains(text), "{text}");
    }
    let stamp = page
        .find("Demonstration data, not for clinical use")
        .unwrap();
    assert!(stamp < page.find("What needs a person").unwrap());
}

#[test]
fn verify_page_needs_nothing_from_outside() {
    let page = page(10, &sample::plans());
    for text in [
        "http:",
        "https:",
        "//",
        "src=",
        "@import",
        "<script",
        "<link",
        "<img",
        "javascript:",
        " style=\"",
    ] {
        assert!(!page.contains(text), "{text}");
    }
    let policy = between(&page, "Content-Security-Policy\" content=\"", "\">");
    assert!(
        policy.contains("default-src 'none'") && !policy.contains("unsafe"),
        "{policy}"
    );
    // Every picture has a name and a description, and every table a caption.
    let pictures = page.matches("role=\"img\"").count();
    assert!(pictures > 10, "{pictures}");
    assert_eq!(page.matches("<title id=").count(), pictures);
    assert_eq!(page.matches("<desc id=").count(), pictures);
    assert_eq!(
        page.matches("<table").count(),
        page.matches("<caption").count()
    );
    assert_eq!(
        page.matches("<table").count(),
        page.matches("</table>").count()
    );
}

#[test]
fn verify_links_lead_somewhere_and_ids_are_unique() {
    for plans_in_full in [0, 2, 10] {
        let page = page(plans_in_full, &sample::plans());
        let mut ids: Vec<&str> = page
            .split(" id=\"")
            .skip(1)
            .map(|rest| rest.split('"').next().unwrap())
            .collect();
        for rest in page.split("href=\"#").skip(1) {
            let target = rest.split('"').next().unwrap();
            assert!(ids.contains(&target), "{target}");
        }
        let count = ids.len();
        ids.sort_unstable();
        ids.dedup();
        assert_eq!(ids.len(), count);
    }
}

#[test]
fn verify_hostile_names_are_escaped() {
    let page = page(10, &sample::plans());
    assert!(!page.contains(HOSTILE_NAME));
    assert!(page.contains("&#60;script&#62;alert(1)&#60;/script&#62;"));
    assert!(!page.contains("<b>Beam 1</b> has"));
    assert!(page.contains(&FORMULA_NAME.replace('\'', "&#39;")));
}

#[test]
fn verify_worst_comes_first() {
    let mut plans = sample::plans();
    let mut worse = sample::plan(
        "w.dcm",
        "INV-0005",
        "Worse",
        vec![sample::beam(1, "small", 5.5, Verdict::BeyondAction)],
    );
    worse
        .beams
        .push(sample::beam(2, "large", 11.0, Verdict::BeyondAction));
    worse
        .beams
        .push(sample::beam(3, "less", -3.2, Verdict::BeyondTolerance));
    plans.push(worse);
    let page = page(10, &plans);
    let lines = attention(&page);
    let expected = [
        ("beyond action level", "2 large"),
        ("beyond action level", "1 Fl\u{fc}gel"),
        ("beyond action level", "1 small"),
        ("finding: action", "ssd-disagrees"),
        ("unreadable", "truncated.dcm"),
        ("not verifiable", "1 edge"),
        ("not verifiable", "2 conformal"),
        ("beyond tolerance", "1 @SUM"),
        ("beyond tolerance", "3 less"),
        ("finding: tolerance", "meterset-whole-number"),
    ];
    assert_eq!(lines.len(), expected.len());
    for (line, (status, text)) in lines.iter().zip(expected) {
        assert!(
            line.contains(status) && line.contains(text),
            "{status} {text}: {line}"
        );
    }
    // Plans in full: the one with the largest deviation first, the one that needs nobody last.
    let headings: Vec<&str> = page
        .split("<article class=\"foil\"")
        .skip(1)
        .map(|rest| between(rest, "<h3>", "</h3>"))
        .collect();
    assert!(
        headings[0].contains("Worse") && headings[1].contains("A very long"),
        "{headings:?}"
    );
    assert!(
        headings[2].contains("Tangents") && headings[4].contains("Four field box"),
        "{headings:?}"
    );
}

#[test]
fn verify_a_number_without_verification_never_looks_like_a_result() {
    let page = page(
        10,
        &[sample::plan("x", "p", "l", vec![sample::outside_beam(1)])],
    );
    let row = between(&page, "id=\"plan-1-beam-1-row\"", "</tr>");
    assert!(
        row.contains("[+1.2]") && row.contains("not a verification"),
        "{row}"
    );
    // Its deviation is 1.2 %, its independent dose 1.041 Gy: the sample's factors multiplied by hand are
    // 1.0095 * 1.0081 = 1.01767695, * 1.0123 = 1.03019437, * 1.0102 = 1.04070236 cGy/MU.
    for number in ["+1.2", "1.041", "1.0407"] {
        for (place, _) in page.match_indices(number) {
            let before = &page[..place];
            // 1.0407 also stands as a factor of the arithmetic that gives the bracketed numbers.
            let bracketed = before.ends_with('[') || before.ends_with("[(");
            let in_words = page[place..]
                .chars()
                .take(160)
                .collect::<String>()
                .contains("not a verification");
            assert!(
                bracketed || in_words,
                "{number}: {}",
                &page[place.saturating_sub(80)..place + 20]
            );
        }
    }
    assert!(page.contains("bar-hollow\""));
}

#[test]
fn verify_full_detail_is_bounded_and_the_page_says_so() {
    let plans: Vec<PlanEntry> = (1..=12)
        .map(|number| {
            let verdict = if number == 9 {
                Verdict::BeyondTolerance
            } else {
                Verdict::Within
            };
            sample::plan(
                &format!("{number}.dcm"),
                "p",
                &format!("plan {number}"),
                vec![sample::beam(1, "AP", 1.0, verdict)],
            )
        })
        .collect();
    let page = page(3, &plans);
    assert_eq!(page.matches("<article class=\"foil\"").count(), 3);
    assert_eq!(page.matches("id=\"line-").count(), 12);
    assert!(
        page.contains("12 plans, in the order of the files. 3 of them stand in full"),
        "{page}"
    );
    assert!(page.contains("the other 9 are abbreviated"));
    let full = &page[page.find("id=\"full\"").unwrap()..];
    // The one that needs a person, then the first two of the files.
    let order = ["plan 9<", "plan 1<", "plan 2<"].map(|label| full.find(label).unwrap());
    assert!(order.is_sorted());
    assert!(!full.contains("plan 3<"));
}

#[test]
fn verify_many_beams_are_bounded_and_the_page_says_so() {
    let beams = (1..=50)
        .map(|number| {
            let verdict = if number == 50 {
                Verdict::BeyondAction
            } else {
                Verdict::Within
            };
            sample::beam(number, "b", 1.0, verdict)
        })
        .collect();
    let page = page(3, &[sample::plan("x", "p", "l", beams)]);
    assert_eq!(page.matches("<details class=\"beam\"").count(), 40);
    assert!(page.contains("id=\"plan-1-beam-50\""));
    assert!(page.contains("The detail of 10 further beams is left out here"));
    assert_eq!(
        page.matches("-row\"").count(),
        50 + 1,
        "50 rows and one link to a row"
    );
}

#[test]
fn verify_a_plan_worse_than_its_beams_is_named() {
    let mut plan = sample::plan(
        "x",
        "p",
        "Copies",
        vec![sample::beam(1, "AP", 0.1, Verdict::Within)],
    );
    plan.verdict = Verdict::NotVerifiable;
    let page = page(3, &[plan]);
    assert!(
        attention(&page)
            .iter()
            .any(|line| line.contains("Copies") && line.contains("not verifiable"))
    );
}

#[test]
fn verify_wild_numbers_break_nothing() {
    let mut beam = sample::beam(1, "wild", f64::INFINITY, Verdict::NotVerifiable);
    beam.judgement = Some(Judgement::Alone);
    beam.planned_mu = Some(1e300);
    beam.calculation.view.jaws_x_cm = Some([f64::NAN, 1e12]);
    beam.calculation.view.point_cm = Some([1e9, f64::NEG_INFINITY]);
    beam.tolerance_percent = Some(f64::NAN);
    let mut far = sample::beam(2, "far", 4000.0, Verdict::BeyondAction);
    far.expected_spread_percent = Some(1e9);
    let page = page(3, &[sample::plan("x", "p", "l", vec![beam, far])]);
    assert!(
        !page.contains("NaN") && !page.contains("inf\"") && !page.contains("inf,"),
        "a coordinate or number"
    );
    assert!(page.contains("off the scale"));
}

#[test]
fn verify_many_urgent_lines_are_bounded_and_the_page_says_so() {
    let plan = sample::plan("x", "p", "l", vec![sample::shaped_beam(1)]);
    let page = page(1, &vec![plan; 2100]);
    // 2100 beams and the truncated file.
    assert_eq!(attention(&page).len(), 2000);
    assert!(page.contains("2101 things need a person; the 2000 most urgent stand here"));
    assert!(page.contains("<td>technique or device not covered</td><td class=\"n\">2100</td>"));
}

#[test]
fn verify_many_findings_are_bounded_and_the_page_says_so() {
    let mut plan = sample::plans().remove(0);
    let note = plan.findings[0].clone();
    plan.findings = vec![note; 130];
    plan.findings[129].severity = counterfoil::settings::Severity::Action;
    plan.findings[129].message = "the one that matters".to_owned();
    let page = page(3, &[plan]);
    assert!(page.contains("30 further findings are left out here, the least severe"));
    let table = between(&page, "<table class=\"findings\">", "</table>");
    assert!(table.contains("the one that matters"));
}
