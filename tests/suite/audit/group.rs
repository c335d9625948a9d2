//! Beams among their neighbours.

use counterfoil::audit::{Judgement, Verdict};

use super::{REFERENCE_DOSE_GY, audit, near, reference_plan, second_beam};
use crate::builder::{PlanSpec, ReferenceSpec};

/// Two beams under reference conditions with these metersets and planned doses.
fn two_beams(first: (f64, f64), second: (f64, f64)) -> PlanSpec {
    reference_plan()
        .with_meterset(first.0)
        .with_beam_dose(first.1)
        .with_beam(second_beam(), ReferenceSpec::new(2, second.0, second.1))
}

#[test]
fn verify_beams_that_share_a_point_are_summed() {
    // 100 MU and 50 MU under reference conditions: 0.8 Gy + 0.4 Gy against 0.82 + 0.4.
    let entry = audit(&two_beams((100.0, 0.82), (50.0, 0.4)));
    let sum = entry.sum.as_ref().unwrap();
    near(Some(sum.planned_dose_gy), 1.22, 1e-12);
    near(Some(sum.independent_dose_gy), 1.2, 1e-9);
    near(
        Some(sum.deviation_percent),
        100.0 * (1.2 - 1.22) / 1.22,
        1e-9,
    );
    assert_eq!(entry.verdict, Verdict::Within);
}

#[test]
fn verify_beams_with_different_points_are_not_summed() {
    let mut spec = two_beams((100.0, 0.8), (50.0, 0.4));
    spec.groups[0].beams[1].point_cm = Some([2.0, 0.0, 0.0]);
    spec.groups[0].beams[1].dose_reference = None;
    let entry = audit(&spec);
    assert_eq!(entry.sum, None);
    assert!(entry.no_sum_reason.unwrap().contains("do not share"));
}

#[test]
fn verify_a_beam_that_adds_little_is_judged_by_its_share_of_the_total() {
    // 100 MU give 0.8 Gy; 4 MU give 0.032 Gy where 0.030 Gy is planned: +6.7 % alone,
    // 0.24 % of 0.830 Gy; its share is 3.6 %.
    let entry = audit(&two_beams((100.0, 0.8), (4.0, 0.030)));
    let beam = &entry.beams[1];
    assert_eq!(beam.verdict, Verdict::Within);
    let Some(Judgement::ShareOfTotal {
        share_percent,
        percent_of_total,
    }) = beam.judgement
    else {
        panic!("{:?}", beam.judgement);
    };
    near(Some(share_percent), 100.0 * 0.030 / 0.830, 1e-9);
    near(Some(percent_of_total), 100.0 * 0.002 / 0.830, 1e-9);
    assert!(beam.remarks[0].contains("per cent of the total"));
    assert_eq!(entry.beams[0].judgement, Some(Judgement::Alone));
}

#[test]
fn verify_a_small_share_that_is_far_off_is_still_beyond() {
    // 40 MU give 0.32 Gy where 0.03 Gy is planned: 35 % of 0.83 Gy.
    let entry = audit(&two_beams((100.0, 0.8), (40.0, 0.03)));
    assert_eq!(entry.beams[1].verdict, Verdict::BeyondAction);
    assert_eq!(entry.verdict, Verdict::BeyondAction);
}

fn at_fraction_level(mut spec: PlanSpec) -> PlanSpec {
    for reference in &mut spec.groups[0].beams {
        reference.dose_meaning = Some("FRACTION_LEVEL".to_owned());
    }
    spec
}

#[test]
fn verify_doses_at_fraction_level_are_judged_as_a_sum() {
    // Each beam is off by a quarter, the sum (0.8 + 0.8 Gy) is right.
    let spec = at_fraction_level(two_beams((100.0, 1.0), (100.0, 0.6)));
    let entry = audit(&spec);
    assert_eq!(entry.verdict, Verdict::Within);
    for beam in &entry.beams {
        assert!(matches!(
            beam.judgement,
            Some(Judgement::FractionSum { .. })
        ));
    }
    let spec = at_fraction_level(two_beams((100.0, 1.0), (100.0, 0.7)));
    let entry = audit(&spec);
    // 1.6 against 1.7 Gy: -5.9 %.
    assert_eq!(entry.verdict, Verdict::BeyondAction);
}

#[test]
fn verify_doses_at_fraction_level_without_a_sum_are_not_verifiable() {
    let mut spec = at_fraction_level(two_beams((100.0, 0.8), (100.0, 0.8)));
    spec.groups[0].beams[1].dose_gy = None;
    let entry = audit(&spec);
    assert_eq!(entry.beams[0].verdict, Verdict::NotVerifiable);
    assert!(entry.beams[0].reasons[0].contains("only as a sum"));
}

#[test]
fn verify_results_belong_to_the_group_and_the_beam() {
    // The same beam twice: 100 MU in the first group, 200 MU for the same dose in the second.
    let spec = reference_plan().with_second_group(5, 200.0, REFERENCE_DOSE_GY);
    let entry = audit(&spec);
    let rows: Vec<_> = entry
        .beams
        .iter()
        .map(|beam| (beam.fraction_group, beam.planned_mu, beam.verdict))
        .collect();
    assert_eq!(
        rows,
        [
            (Some(1), Some(100.0), Verdict::Within),
            (Some(2), Some(200.0), Verdict::BeyondAction),
        ]
    );
    assert_eq!(
        entry.no_sum_reason.as_deref(),
        Some("several fraction groups")
    );
}
