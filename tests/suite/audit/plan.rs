//! The plan as a whole: verdict, prescription, copies that contradict, the user's depths.

use counterfoil::audit::{Rivals, Verdict};
use counterfoil::dose::{DepthBasis, DepthRow};
use counterfoil::settings::Site;

use super::{REFERENCE_DOSE_GY, audit, audit_bytes, near, reference_plan, second_beam};
use crate::builder::{DoseReferenceSpec, Encoding, PlanSpec, ReferenceSpec, encode};

#[test]
fn verify_the_plan_bears_the_worst_verdict_of_its_beams() {
    let with_second = |reference: ReferenceSpec| {
        audit(&reference_plan().with_beam(second_beam(), reference)).verdict
    };
    let second = |dose_gy| ReferenceSpec::new(2, 100.0, dose_gy);
    assert_eq!(with_second(second(0.8)), Verdict::Within);
    assert_eq!(with_second(second(0.83)), Verdict::BeyondTolerance);
    let mut unknown = second(0.8);
    unknown.dose_gy = None;
    assert_eq!(with_second(unknown.clone()), Verdict::NotVerifiable);
    assert_eq!(with_second(second(1.0)), Verdict::BeyondAction);
    // Beyond action outranks not verifiable, which outranks beyond tolerance.
    let three = |dose_gy| {
        let third = crate::builder::BeamSpec::new(3, "Third").with_machine("TG71-TPR");
        reference_plan()
            .with_beam(second_beam(), unknown.clone())
            .with_beam(third, ReferenceSpec::new(3, 100.0, dose_gy))
    };
    assert_eq!(audit(&three(0.83)).verdict, Verdict::NotVerifiable);
    assert_eq!(audit(&three(1.0)).verdict, Verdict::BeyondAction);
}

#[test]
fn verify_setup_beams_are_listed_and_not_judged() {
    let entry = audit(&reference_plan().with_setup_beam(9));
    assert_eq!(entry.verdict, Verdict::Within);
    let setup = entry
        .beams
        .iter()
        .find(|beam| beam.beam_number == Some(9))
        .unwrap();
    assert_eq!(setup.verdict, Verdict::NotTreated);
    assert!(setup.reasons[0].contains("SETUP"));
}

#[test]
fn verify_a_plan_of_setup_beams_only_is_not_applicable() {
    let mut spec = PlanSpec::default().with_setup_beam(2);
    spec.beams.remove(0);
    spec.groups[0].beams.clear();
    assert_eq!(audit(&spec).verdict, Verdict::NotApplicable);
}

#[test]
fn verify_a_repeated_number_or_a_dangling_reference_is_never_within() {
    for spec in [
        reference_plan().with_repeated_beam_number(),
        reference_plan().with_dangling_reference(7),
    ] {
        let entry = audit(&spec);
        assert_eq!(entry.verdict, Verdict::NotVerifiable);
        assert!(!entry.findings.is_empty());
    }
}

#[test]
fn verify_a_treatment_beam_without_a_reference_is_never_within() {
    let mut spec = reference_plan();
    spec.beams.push(second_beam());
    let entry = audit(&spec);
    assert_eq!(entry.verdict, Verdict::NotVerifiable);
    assert!(
        entry
            .findings
            .iter()
            .any(|finding| finding.check == "beam-not-referenced" && finding.beam_number == Some(2))
    );
}

#[test]
fn verify_copies_that_contradict_bar_the_plan() {
    let bytes = encode(&reference_plan().object(), Encoding::ExplicitLittle);
    let entry = audit_bytes(
        &bytes,
        &Site::default(),
        &Rivals::new(1, ["b.dcm".to_owned()]),
        &[],
    );
    assert_eq!(entry.verdict, Verdict::NotVerifiable);
    assert!(
        entry.beams[0]
            .reasons
            .iter()
            .any(|reason| reason.contains("b.dcm"))
    );
}

#[test]
fn verify_the_prescription_is_the_one_that_is_stated() {
    let entry = audit(&reference_plan());
    assert_eq!(entry.prescription_gy, Some(30.0));
    assert_eq!(entry.fractions, Some(30));
    let mut spec = reference_plan();
    spec.dose_references.push(DoseReferenceSpec {
        number: 2,
        prescription_gy: Some(40.0),
        ..DoseReferenceSpec::default()
    });
    spec.groups[0].dose_references.push(2);
    let entry = audit(&spec);
    assert_eq!(entry.prescription_gy, None);
    let several = entry
        .findings
        .iter()
        .filter(|finding| finding.check == "several-prescriptions");
    assert_eq!(several.count(), 2);
}

/// A depth of the user's own outranks the plan's: at 10 cm the reference dose, though the plan says SSD 85.
#[test]
fn verify_the_users_depth_comes_first() {
    let spec = reference_plan().map_beam(|beam| beam.with_ssd(85.0));
    let bytes = encode(&spec.object(), Encoding::ExplicitLittle);
    let alone = audit_bytes(&bytes, &Site::default(), &Rivals::default(), &[]);
    assert_ne!(alone.verdict, Verdict::Within);
    let row = DepthRow {
        sop_instance_uid: alone.sop_instance_uid.clone().unwrap(),
        beam_number: 1,
        depth_cm: 10.0,
        effective_depth_cm: None,
        ssd_cm: Some(90.0),
        independent: true,
    };
    let entry = audit_bytes(&bytes, &Site::default(), &Rivals::default(), &[row]);
    let beam = &entry.beams[0];
    near(beam.independent_dose_gy, REFERENCE_DOSE_GY, 1e-9);
    assert_eq!(beam.calculation.depths[0].basis, DepthBasis::Table);
    assert!(beam.calculation.depths[0].independent);
    // The two grounds differ by 5 cm: that is a finding of its own.
    assert!(
        entry
            .findings
            .iter()
            .any(|finding| finding.check == "depth-bases-disagree")
    );
}

/// A reference that stands 200 times stops its beam 200 times; its row names 20 and counts the others.
#[test]
fn verify_a_beam_does_not_repeat_every_note_of_a_faulty_file() {
    let mut spec = reference_plan();
    spec.groups[0].beams = vec![spec.groups[0].beams[0].clone(); 200];
    let entry = audit(&spec);
    assert_eq!(entry.verdict, Verdict::NotVerifiable);
    let first = &entry.beams[0].reasons;
    assert!(first.len() < 30, "{}", first.len());
    assert!(
        first
            .iter()
            .any(|reason| reason.contains("180 more reading notes stop this beam")),
        "{first:?}"
    );
}
