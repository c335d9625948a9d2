//! Plans for the checks' own tests: an ordinary one that no check objects to,
//! and changes of it. Not read from DICOM, so that each shows one thing only.

use crate::audit::{BeamEntry, Rivals, Verdict};
use crate::dose::{
    BeamCalculation, BeamView, DepthBasis, DepthCandidate, Obstacle, ObstacleKind, Technique,
};
use crate::plan::{
    Beam, DoseReference, Effect, FractionGroup, NoteKind, NoteScope, Plan, ReadingNote,
    ReferencedBeam,
};
use crate::quantity::Given;

/// What a check looks at.
pub(super) struct Example {
    pub(super) plan: Plan,
    pub(super) beams: Vec<BeamEntry>,
    pub(super) rivals: Rivals,
}

/// One static beam of 100 MU and 1 Gy in one fraction group.
pub(super) fn ordinary() -> Example {
    with_beams(&[(100.0, 1.0)])
}

pub(super) fn changed(change: impl FnOnce(&mut Example)) -> Example {
    let mut example = ordinary();
    change(&mut example);
    example
}

pub(super) fn with_two_beams(mu_and_gy: [(f64, f64); 2]) -> Example {
    with_beams(&mu_and_gy)
}

pub(super) fn with_note(kind: NoteKind) -> Example {
    changed(|example| {
        example.plan.notes.push(ReadingNote {
            scope: NoteScope::Beam(0),
            kind,
            effect: Effect::BlocksScope,
            place: "BeamSequence[1].BeamName (300A,00C2)".to_owned(),
            message: "an example".to_owned(),
            measured: None,
            limit: None,
        });
    })
}

pub(super) fn with_obstacle(kind: ObstacleKind) -> Example {
    changed(|example| {
        example.beams[0].calculation.obstacles.push(Obstacle {
            kind,
            message: "an example".to_owned(),
        });
    })
}

pub(super) fn with_prescriptions(doses_gy: &[f64]) -> Example {
    changed(|example| {
        for (number, &dose_gy) in (1..).zip(doses_gy) {
            example.plan.dose_references.push(DoseReference {
                number: Given::stated(number),
                target_prescription_dose_gy: Given::stated(dose_gy),
                ..DoseReference::default()
            });
        }
    })
}

pub(super) fn with_depths(depths_cm: [f64; 2]) -> Example {
    let bases = [DepthBasis::Plan, DepthBasis::Ssd];
    changed(|example| {
        example.beams[0].calculation.depths = bases
            .into_iter()
            .zip(depths_cm)
            .map(|(basis, depth_cm)| DepthCandidate {
                basis,
                independent: false,
                perpendicular_cm: Some(depth_cm),
                along_ray_cm: Some(depth_cm),
                effective_cm: depth_cm,
                ssd_cm: None,
                source: "an example".to_owned(),
            })
            .collect();
    })
}

fn with_beams(mu_and_gy: &[(f64, f64)]) -> Example {
    let mut plan = Plan::default();
    let mut group = FractionGroup::default();
    let mut beams = Vec::new();
    for (index, &(mu, dose_gy)) in mu_and_gy.iter().enumerate() {
        let number = i32::try_from(index).unwrap() + 1;
        plan.beams.push(Beam {
            number: Given::stated(number),
            ..Beam::default()
        });
        group.beams.push(ReferencedBeam {
            beam_number: Given::stated(number),
            meterset_mu: Given::stated(mu),
            beam_dose_gy: Given::stated(dose_gy),
            ..ReferencedBeam::default()
        });
        beams.push(entry(index, number, mu, dose_gy));
    }
    plan.fraction_groups.push(group);
    Example {
        plan,
        beams,
        rivals: Rivals::default(),
    }
}

fn entry(index: usize, number: i32, mu: f64, dose_gy: f64) -> BeamEntry {
    BeamEntry {
        fraction_group: Some(1),
        machine: None,
        beam_number: Some(number),
        beam_name: None,
        radiation: None,
        energy: None,
        control_points: 2,
        calculation: BeamCalculation {
            beam_index: index,
            group_index: Some(0),
            reference_index: Some(index),
            technique: Technique::Static,
            gantry_deg: None,
            gantry_end_deg: None,
            collimator_deg: None,
            couch_deg: None,
            x_cm: None,
            y_cm: None,
            squares: None,
            point: None,
            depths: Vec::new(),
            plan_ssd_cm: None,
            trace: None,
            method: None,
            shaped: None,
            spread: None,
            obstacles: Vec::new(),
            remarks: Vec::new(),
            view: BeamView::default(),
        },
        planned_mu: Some(mu),
        planned_dose_gy: Some(dose_gy),
        independent_dose_gy: Some(dose_gy),
        independent_mu: Some(mu),
        deviation_percent: Some(0.0),
        expected_spread_percent: None,
        tolerance_percent: Some(3.0),
        action_percent: Some(5.0),
        level_basis: None,
        judgement: None,
        verdict: Verdict::Within,
        reasons: Vec::new(),
        remarks: Vec::new(),
    }
}
