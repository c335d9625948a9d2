//! One beam: deviation, sign, levels, and every way in which there is nothing to compare.

use counterfoil::audit::{Judgement, Verdict};
use counterfoil::settings::Severity;

use super::{REFERENCE_DOSE_GY, audit, near, only_beam, reference_plan};

#[test]
fn verify_reference_conditions_are_within_and_agree_exactly() {
    let beam = only_beam(&reference_plan());
    assert_eq!(beam.verdict, Verdict::Within, "{:?}", beam.reasons);
    assert_eq!(beam.judgement, Some(Judgement::Alone));
    assert!(beam.reasons.is_empty());
    near(beam.independent_dose_gy, REFERENCE_DOSE_GY, 1e-12);
    near(beam.independent_mu, 100.0, 1e-9);
    near(beam.deviation_percent, 0.0, 1e-9);
}

/// The same comparison through the PDD table of the data set: 0.8 cGy/MU is its definition too.
#[test]
fn verify_the_depth_dose_table_gives_the_same() {
    let spec = reference_plan().map_beam(|beam| beam.with_machine("TG71-PDD"));
    let beam = only_beam(&spec);
    assert_eq!(beam.verdict, Verdict::Within, "{:?}", beam.reasons);
    near(beam.independent_dose_gy, REFERENCE_DOSE_GY, 1e-9);
}

#[test]
fn verify_more_mu_than_needed_is_a_positive_deviation() {
    // 110 MU give 0.88 Gy where 0.80 Gy is planned: +10 %.
    let beam = only_beam(&reference_plan().with_meterset(110.0));
    near(beam.deviation_percent, 10.0, 1e-9);
    near(beam.independent_mu, 100.0, 1e-9);
    assert_eq!(beam.verdict, Verdict::BeyondAction);
    assert!(beam.reasons[0].contains("more than the planned dose"));
}

#[test]
fn verify_levels_divide_where_they_stand() {
    // Built-in levels of static fields: tolerance 3 %, action 5 %.
    for (meterset_mu, expected) in [
        (102.9, Verdict::Within),
        (97.1, Verdict::Within),
        (103.1, Verdict::BeyondTolerance),
        (96.9, Verdict::BeyondTolerance),
        (95.1, Verdict::BeyondTolerance),
        (105.1, Verdict::BeyondAction),
        (94.9, Verdict::BeyondAction),
    ] {
        let beam = only_beam(&reference_plan().with_meterset(meterset_mu));
        assert_eq!(beam.verdict, expected, "{meterset_mu} MU");
    }
}

#[test]
fn verify_without_a_planned_dose_the_number_is_shown_and_not_judged() {
    for spec in [
        reference_plan().without_beam_dose(),
        reference_plan().with_beam_dose(0.0),
    ] {
        let beam = only_beam(&spec);
        assert_eq!(beam.verdict, Verdict::NotVerifiable);
        near(beam.independent_dose_gy, REFERENCE_DOSE_GY, 1e-12);
        assert_eq!(beam.deviation_percent, None);
        assert!(beam.reasons[0].contains("300A,0084"), "{:?}", beam.reasons);
    }
}

#[test]
fn verify_an_effective_dose_is_not_compared() {
    let spec = reference_plan()
        .map_reference(|reference| reference.dose_type = Some("EFFECTIVE".to_owned()));
    let beam = only_beam(&spec);
    assert_eq!(beam.verdict, Verdict::NotVerifiable);
    assert_eq!(beam.deviation_percent, None);
    assert_eq!(beam.independent_mu, None);
}

#[test]
fn verify_no_meterset_and_zero_meterset_are_not_zero_mu() {
    for spec in [
        reference_plan().without_meterset(),
        reference_plan().with_meterset(0.0),
    ] {
        let entry = audit(&spec);
        assert_eq!(entry.verdict, Verdict::NotVerifiable);
        assert_eq!(entry.beams[0].independent_dose_gy, None);
        let finding = entry
            .findings
            .iter()
            .find(|finding| finding.check == "meterset-missing")
            .unwrap();
        assert_eq!(finding.severity, Severity::Action);
    }
}

#[test]
fn verify_an_unknown_machine_names_the_known_ones_and_keeps_what_the_plan_says() {
    let spec = reference_plan().map_beam(|beam| beam.with_machine("tg71-tpr"));
    let beam = only_beam(&spec);
    assert_eq!(beam.verdict, Verdict::NotVerifiable);
    assert!(
        beam.reasons
            .iter()
            .any(|reason| reason.contains("TG71-PDD, TG71-TPR"))
    );
    assert_eq!(beam.calculation.x_cm, Some(10.0));
    assert_eq!(beam.planned_mu, Some(100.0));
    assert_eq!(beam.calculation.depths.len(), 1);
}

#[test]
fn verify_an_energy_that_the_machine_lacks_is_not_verifiable() {
    let spec = reference_plan().map_beam(|beam| beam.with_energy(10.0));
    let beam = only_beam(&spec);
    assert_eq!(beam.verdict, Verdict::NotVerifiable);
    assert!(beam.independent_dose_gy.is_none());
    let unflattened =
        reference_plan().map_beam(|beam| beam.with_fluence_mode("NON_STANDARD", Some("FFF")));
    assert_eq!(only_beam(&unflattened).verdict, Verdict::NotVerifiable);
}

/// A number outside the method's range is shown and never within: 1 cm deep, d_max 1.5 cm.
#[test]
fn verify_the_build_up_is_never_within() {
    let spec = reference_plan().map_beam(|beam| beam.with_ssd(99.0));
    let entry = audit(&spec);
    assert_eq!(entry.verdict, Verdict::NotVerifiable);
    assert!(
        entry
            .findings
            .iter()
            .any(|finding| finding.check == "point-in-build-up")
    );
}

#[test]
fn verify_a_point_under_a_jaw_or_near_an_edge_is_never_within() {
    let jaws = |x_cm| reference_plan().map_beam(|beam| beam.with_jaws(x_cm, [-5.0, 5.0]));
    for (x_cm, check) in [
        ([1.0, 11.0], "point-under-device"),
        ([-0.9, 9.1], "point-near-edge"),
    ] {
        let entry = audit(&jaws(x_cm));
        assert_eq!(entry.verdict, Verdict::NotVerifiable, "{check}");
        assert!(
            entry.findings.iter().any(|finding| finding.check == check),
            "{check}"
        );
    }
}
