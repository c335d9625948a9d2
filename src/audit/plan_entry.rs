//! One plan's entry: every beam of every fraction group, what they sum to,
//! the findings, and the verdict.

use super::checks::{CheckInput, run_checks};
use super::compare::beam_entry;
use super::group::{judge_group, strictest_levels};
use super::{BeamEntry, PlanEntry, Rivals, SharedPointSum, Verdict};
use crate::beam_model::{DataOrigin, ModelSet};
use crate::dose::{
    BeamRequest, DepthRow, ModelAnswer, Obstacle, ObstacleKind, StepLimits, calculate_beam,
};
use crate::plan::{Effect, NoteScope, Plan};
use crate::settings::Site;

/// What the audit of one plan needs.
#[derive(Clone, Copy, Debug)]
pub struct PlanInput<'a> {
    /// File, as it was given or found.
    pub file: &'a str,
    /// SHA-256 of the file, hex.
    pub sha256: &'a str,
    /// The plan.
    pub plan: &'a Plan,
    /// Other files with the same SOP Instance UID and different content.
    pub rivals: &'a Rivals,
    /// The models on offer.
    pub models: &'a ModelSet,
    /// The site's rules.
    pub site: &'a Site,
    /// Rows of the user's depth table for this plan.
    pub depth_rows: &'a [DepthRow],
}

/// Audits one plan.
#[must_use]
pub fn audit_plan(input: PlanInput<'_>) -> PlanEntry {
    let PlanInput { plan, site, .. } = input;
    let mut beams: Vec<BeamEntry> = beam_places(plan)
        .into_iter()
        .map(|(beam_index, group)| {
            let mut calculation = calculate_beam(&BeamRequest {
                plan,
                beam_index,
                group,
                model: model_for(input, beam_index),
                site,
                depth_row: depth_row_for(input, beam_index),
                steps: StepLimits::default(),
            });
            calculation.obstacles.extend(rival_obstacle(input.rivals));
            beam_entry(plan, calculation, site)
        })
        .collect();

    let sums = judge_groups(plan, &mut beams, site);
    let (sum, no_sum_reason) = match <[_; 1]>::try_from(sums) {
        Ok([Ok(sum)]) => (Some(sum), None),
        Ok([Err(reason)]) => (None, Some(reason)),
        Err(sums) if sums.is_empty() => (None, Some("no fraction group with beams".to_owned())),
        Err(_) => (None, Some("several fraction groups".to_owned())),
    };
    let findings = run_checks(
        &CheckInput {
            plan,
            beams: &beams,
            rivals: input.rivals,
            site,
        },
        &site.checks,
    );
    let verdict = plan_verdict(plan, &beams, sum.as_ref(), site);
    PlanEntry {
        file: input.file.to_owned(),
        sha256: input.sha256.to_owned(),
        sop_instance_uid: plan.identity.sop_instance_uid.get(),
        patient_id: plan.identity.patient_id.get(),
        patient_name: plan.identity.patient_name.get(),
        plan_label: plan
            .identity
            .plan_label
            .get()
            .or_else(|| plan.identity.plan_name.get()),
        approval: plan.identity.approval.status.get(),
        machine: machines(&beams),
        fractions: fractions(plan),
        prescription_gy: prescription_gy(plan),
        sum,
        no_sum_reason,
        worst_beam_percent: worst_beam_percent(&beams),
        verdict,
        uses_invented_model: uses_invented_model(input, &beams),
        beams,
        findings,
    }
}

/// Every (beam, group reference) of the plan: references in order, then beams that no group references.
fn beam_places(plan: &Plan) -> Vec<(usize, Option<(usize, usize)>)> {
    let mut places = Vec::new();
    let mut referenced = vec![false; plan.beams.len()];
    for (group_index, group) in plan.fraction_groups.iter().enumerate() {
        for (reference_index, reference) in group.beams.iter().enumerate() {
            let Some(&number) = reference.beam_number.value() else {
                continue;
            };
            // A number that stands twice concerns every beam that bears it: each gets its row.
            for (beam_index, beam) in plan.beams.iter().enumerate() {
                if beam.number.value() == Some(&number) {
                    referenced[beam_index] = true;
                    places.push((beam_index, Some((group_index, reference_index))));
                }
            }
        }
    }
    let alone = referenced
        .iter()
        .enumerate()
        .filter(|(_, referenced)| !**referenced)
        .map(|(beam_index, _)| (beam_index, None));
    places.extend(alone);
    places
}

fn model_for<'a>(input: PlanInput<'a>, beam_index: usize) -> ModelAnswer<'a> {
    let machine = input
        .plan
        .beams
        .get(beam_index)
        .and_then(|beam| beam.machine.value());
    match machine.and_then(|name| input.models.machine_for(name)) {
        Some(model) => ModelAnswer::Found(model),
        None => ModelAnswer::Unknown {
            known_names: input.models.known_names(),
        },
    }
}

fn depth_row_for<'a>(input: PlanInput<'a>, beam_index: usize) -> Option<&'a DepthRow> {
    let number = input.plan.beams.get(beam_index)?.number.get()?;
    input
        .depth_rows
        .iter()
        .find(|row| row.beam_number == number)
}

fn rival_obstacle(rivals: &Rivals) -> Option<Obstacle> {
    let first = rivals.first()?;
    Some(Obstacle {
        kind: ObstacleKind::Reading,
        message: format!(
            "{} more file(s) carry the same SOP Instance UID (0008,0018) with different content, such as {first}: which one is the plan cannot be told; remove the wrong one",
            rivals.count()
        ),
    })
}

fn judge_groups(
    plan: &Plan,
    beams: &mut [BeamEntry],
    site: &Site,
) -> Vec<Result<SharedPointSum, String>> {
    let mut sums = Vec::new();
    for group_index in 0..plan.fraction_groups.len() {
        let mut entries: Vec<&mut BeamEntry> = beams
            .iter_mut()
            .filter(|entry| entry.calculation.group_index == Some(group_index))
            .collect();
        let lost = lost_references(plan, group_index);
        if !entries.is_empty() || lost.is_some() {
            sums.push(judge_group(plan, &mut entries, lost, site));
        }
    }
    sums
}

/// References of a group that lead to no beam, in words: something that was meant to be treated is not in the file.
fn lost_references(plan: &Plan, group_index: usize) -> Option<String> {
    let group = plan.fraction_groups.get(group_index)?;
    let lost = group.beams.iter().find(|reference| {
        !plan.beams.iter().any(|beam| {
            !beam.number.is_absent() && beam.number.get() == reference.beam_number.get()
        })
    })?;
    Some(lost.beam_number.get().map_or_else(
        || "a reference of the fraction group names no beam".to_owned(),
        |number| format!("the fraction group refers to beam {number}, which is not in the plan"),
    ))
}

fn plan_verdict(
    plan: &Plan,
    beams: &[BeamEntry],
    sum: Option<&SharedPointSum>,
    site: &Site,
) -> Verdict {
    // A note that blocks a group or the plan counts even where no beam is left to carry it.
    let blocked = plan.notes.iter().any(|note| match note.effect {
        Effect::None => false,
        Effect::BlocksPlan => true,
        Effect::BlocksScope => !matches!(note.scope, NoteScope::Beam(_)),
    });
    let lost = (0..plan.fraction_groups.len()).any(|group| lost_references(plan, group).is_some());
    let of_notes = if blocked || lost {
        Verdict::NotVerifiable
    } else {
        Verdict::NotApplicable
    };
    let of_beams = beams
        .iter()
        .map(|entry| entry.verdict)
        .filter(|verdict| *verdict != Verdict::NotTreated)
        .max()
        .unwrap_or(Verdict::NotApplicable);
    let of_sum = sum.map_or(Verdict::NotApplicable, |sum| {
        strictest_levels(beams, site).map_or(Verdict::NotVerifiable, |levels| {
            levels.verdict(sum.deviation_percent)
        })
    });
    of_notes.max(of_beams).max(of_sum)
}

fn machines(beams: &[BeamEntry]) -> Option<String> {
    let mut names: Vec<&str> = Vec::new();
    for name in beams.iter().filter_map(|entry| entry.machine.as_deref()) {
        if !names.contains(&name) {
            names.push(name);
        }
    }
    (!names.is_empty()).then(|| names.join(" + "))
}

fn fractions(plan: &Plan) -> Option<i32> {
    let mut planned = plan
        .fraction_groups
        .iter()
        .map(|group| group.fractions_planned.get());
    let first = planned.next()??;
    planned.all(|other| other == Some(first)).then_some(first)
}

/// The one target prescription dose that the fraction groups refer to; `None` when there is none or several.
fn prescription_gy(plan: &Plan) -> Option<f64> {
    match super::prescription::stated_prescriptions(plan).as_slice() {
        [one] => Some(one.dose_gy),
        _ => None,
    }
}

fn worst_beam_percent(beams: &[BeamEntry]) -> Option<f64> {
    beams
        .iter()
        .filter(|entry| entry.judgement.is_some())
        .filter_map(|entry| entry.deviation_percent)
        .max_by(|a, b| a.abs().total_cmp(&b.abs()))
}

fn uses_invented_model(input: PlanInput<'_>, beams: &[BeamEntry]) -> bool {
    beams
        .iter()
        .filter(|entry| entry.calculation.is_calculated())
        .filter_map(|entry| input.models.machine_for(entry.machine.as_deref()?))
        .any(|model| model.provenance.origin == DataOrigin::Invented)
}
