//! One beam's entry: the plan's claim beside the independent number. The
//! beam's standing among its neighbours (small share, fraction-level doses) is
//! judged afterwards, in `group`.

use super::levels::levels_for;
use super::{BeamEntry, Judgement, Verdict};
use crate::dose::{BeamCalculation, Obstacle, ObstacleKind, Technique};
use crate::plan::{DeliveryType, DoseMeaning, DoseType, Plan, ReferencedBeam};
use crate::settings::Site;

/// A beam's entry before its neighbours are looked at.
pub(super) fn beam_entry(plan: &Plan, mut calculation: BeamCalculation, site: &Site) -> BeamEntry {
    let beam = plan.beams.get(calculation.beam_index);
    let group = calculation
        .group_index
        .and_then(|index| plan.fraction_groups.get(index));
    let reference = group.and_then(|group| {
        calculation
            .reference_index
            .and_then(|index| group.beams.get(index))
    });
    let treated = calculation.technique != Technique::Setup;
    if treated && let Some(reference) = reference {
        calculation.obstacles.extend(claim_obstacles(reference));
    }
    if treated && !calculation.is_calculated() && calculation.obstacles.is_empty() {
        // Nothing may pass without a number: this would be a mistake of the program.
        calculation.obstacles.push(Obstacle {
            kind: ObstacleKind::Reading,
            message: "no dose was calculated and no reason was given; please report this".into(),
        });
    }

    let planned_mu = reference.and_then(|reference| reference.meterset_mu.get());
    let planned_dose_gy = reference
        .and_then(|reference| reference.beam_dose_gy.get())
        .filter(|&dose_gy| dose_gy > 0.0);
    let dose_per_mu_cgy = calculation
        .trace
        .as_ref()
        .map(|trace| trace.dose_per_mu_cgy)
        .filter(|dose| dose.is_finite() && *dose > 0.0);
    let independent_dose_gy = match (planned_mu, dose_per_mu_cgy) {
        (Some(mu), Some(dose_cgy)) if mu > 0.0 => Some(mu * dose_cgy / 100.0),
        _ => None,
    };
    let physical =
        reference.is_none_or(|reference| reference.dose_type.value() != Some(&DoseType::Effective));
    let independent_mu = match (planned_dose_gy, dose_per_mu_cgy) {
        (Some(dose_gy), Some(dose_cgy)) if physical => Some(100.0 * dose_gy / dose_cgy),
        _ => None,
    };
    let deviation_percent = match (independent_dose_gy, planned_dose_gy) {
        (Some(independent), Some(planned)) if physical => {
            Some(100.0 * (independent - planned) / planned)
        }
        _ => None,
    };
    let levels = levels_for(
        calculation.technique,
        calculation.depths.first(),
        &site.action_levels,
    );

    let reasons: Vec<String> = calculation
        .obstacles
        .iter()
        .map(|obstacle| obstacle.message.clone())
        .collect();
    let (verdict, judgement) = match (&levels, deviation_percent) {
        _ if !treated => (Verdict::NotTreated, None),
        (Some(levels), Some(deviation)) if reasons.is_empty() => {
            (levels.verdict(deviation), Some(Judgement::Alone))
        }
        _ => (Verdict::NotVerifiable, None),
    };
    let mut entry = BeamEntry {
        fraction_group: group.and_then(|group| group.number.get()),
        machine: beam.and_then(|beam| beam.machine.get()),
        beam_number: beam.and_then(|beam| beam.number.get()),
        beam_name: beam.and_then(|beam| beam.name.get()),
        radiation: beam
            .and_then(|beam| beam.radiation.value())
            .map(|radiation| radiation.term().to_owned()),
        energy: beam.and_then(|beam| beam.energy.label()),
        control_points: beam.map_or(0, |beam| beam.control_points.len()),
        planned_mu,
        planned_dose_gy,
        independent_dose_gy,
        independent_mu,
        deviation_percent,
        expected_spread_percent: calculation.spread.as_ref().map(|spread| spread.percent),
        tolerance_percent: levels.as_ref().map(|levels| levels.tolerance_percent),
        action_percent: levels.as_ref().map(|levels| levels.action_percent),
        level_basis: levels.map(|levels| levels.basis),
        judgement,
        verdict,
        reasons,
        remarks: std::mem::take(&mut calculation.remarks),
        calculation,
    };
    match entry.verdict {
        Verdict::NotTreated => entry
            .reasons
            .insert(0, not_treated_reason(plan, &entry.calculation)),
        Verdict::BeyondTolerance | Verdict::BeyondAction => {
            let reason = beyond_reason(&entry);
            entry.reasons.push(reason);
        }
        _ => {}
    }
    entry
}

/// Why the plan's dose of a beam cannot be compared on its own.
fn claim_obstacles(reference: &ReferencedBeam) -> Vec<Obstacle> {
    let mut obstacles = Vec::new();
    let mut refuse = |message: &str| {
        obstacles.push(Obstacle {
            kind: ObstacleKind::PlannedDose,
            message: message.to_owned(),
        });
    };
    match reference.beam_dose_gy.value() {
        None => refuse(
            "the plan states no beam dose (Beam Dose, 300A,0084), so there is nothing to compare with",
        ),
        Some(&dose_gy) if dose_gy <= 0.0 => refuse(
            "the plan states a beam dose of 0 Gy (Beam Dose, 300A,0084), so there is nothing to compare with",
        ),
        Some(_) => {}
    }
    if reference.dose_type.value() == Some(&DoseType::Effective) {
        refuse(
            "the plan's beam dose is a biologically effective dose (Beam Dose Type, 300A,0090), which is not compared with a physical one",
        );
    }
    obstacles
}

/// Whether a group's beam doses have a meaning as a sum only.
pub(super) fn is_fraction_level(plan: &Plan, entry: &BeamEntry) -> bool {
    let reference = entry
        .calculation
        .group_index
        .zip(entry.calculation.reference_index)
        .and_then(|(group, index)| plan.fraction_groups.get(group)?.beams.get(index));
    reference.is_some_and(|reference| {
        reference.dose_meaning.value() == Some(&DoseMeaning::FractionLevel)
    })
}

fn not_treated_reason(plan: &Plan, calculation: &BeamCalculation) -> String {
    let word = plan
        .beams
        .get(calculation.beam_index)
        .and_then(|beam| beam.delivery.value())
        .map_or("not stated", DeliveryType::term);
    format!("Treatment Delivery Type (300A,00CE) is {word}: not delivered for treatment")
}

/// The sentence for a deviation beyond a level, with its sign explained.
pub(super) fn beyond_reason(entry: &BeamEntry) -> String {
    let (Some(deviation), Some(tolerance), Some(action)) = (
        entry.deviation_percent,
        entry.tolerance_percent,
        entry.action_percent,
    ) else {
        return "beyond the level".to_owned();
    };
    let direction = if deviation > 0.0 {
        "the planned MU give more than the planned dose"
    } else {
        "the planned MU give less than the planned dose"
    };
    let level = if entry.verdict == Verdict::BeyondAction {
        format!("the action level of {action} %")
    } else {
        format!("the tolerance of {tolerance} %")
    };
    format!(
        "the independent dose differs by {deviation:+.2} % ({direction} by this calculation), beyond {level}"
    )
}
