//! Beams among their neighbours: the sum at a shared point, doses that have a
//! meaning only as a sum, and beams that add little.

use super::compare::{beyond_reason, is_fraction_level};
use super::levels::{Levels, levels_for};
use super::{BeamEntry, Judgement, SharedPointSum, Verdict};
use crate::plan::Plan;
use crate::quantity::tolerance;
use crate::settings::Site;

/// Judges the entries of one fraction group together. Gives the sum at the
/// shared point, or why there is none. `lost` says that a beam of the group is
/// not in the plan: then there is no sum.
pub(super) fn judge_group(
    plan: &Plan,
    entries: &mut [&mut BeamEntry],
    lost: Option<String>,
    site: &Site,
) -> Result<SharedPointSum, String> {
    let sum = match lost {
        Some(reason) => Err(reason),
        None => shared_point_sum(entries),
    };
    judge_small_shares(plan, entries, site);
    judge_fraction_level(plan, entries, site, sum.as_ref());
    sum
}

fn is_treated(entry: &BeamEntry) -> bool {
    entry.verdict != Verdict::NotTreated
}

/// Whether two beams have one dose point.
fn share_point(first: &BeamEntry, second: &BeamEntry) -> bool {
    let point = |entry: &BeamEntry| entry.calculation.point.as_ref().map(|point| point.patient);
    point(first)
        .zip(point(second))
        .is_some_and(|(first, second)| first.distance_cm(second) <= tolerance::SHARED_POINT_CM)
}

fn shared_point_sum(entries: &[&mut BeamEntry]) -> Result<SharedPointSum, String> {
    let treated: Vec<&BeamEntry> = entries
        .iter()
        .map(|entry| &**entry)
        .filter(|entry| is_treated(entry))
        .collect();
    let Some(&first) = treated.first() else {
        return Err("no treatment beam".to_owned());
    };
    let name = |entry: &BeamEntry| {
        entry.beam_number.map_or_else(
            || "without a number".to_owned(),
            |number| number.to_string(),
        )
    };
    if let Some(other) = treated.iter().find(|entry| !share_point(first, entry)) {
        return Err(format!(
            "beams {} and {} do not share a dose point",
            name(first),
            name(other)
        ));
    }
    let (mut planned_dose_gy, mut independent_dose_gy) = (0.0, 0.0);
    for entry in treated {
        match (entry.planned_dose_gy, entry.independent_dose_gy) {
            (Some(planned), Some(independent)) if entry.calculation.obstacles.is_empty() => {
                planned_dose_gy += planned;
                independent_dose_gy += independent;
            }
            _ => return Err(format!("beam {} could not be verified", name(entry))),
        }
    }
    Ok(SharedPointSum {
        fraction_group: first.fraction_group,
        planned_dose_gy,
        independent_dose_gy,
        deviation_percent: 100.0 * (independent_dose_gy - planned_dose_gy) / planned_dose_gy,
    })
}

/// A beam that adds little to its point is judged by its share of the total.
fn judge_small_shares(plan: &Plan, entries: &mut [&mut BeamEntry], site: &Site) {
    let shares: Vec<Option<(f64, f64)>> = entries
        .iter()
        .map(|entry| {
            let judged_alone = entry.judgement == Some(Judgement::Alone);
            if !judged_alone || is_fraction_level(plan, entry) {
                return None;
            }
            let planned_gy = entry.planned_dose_gy?;
            let difference_gy = entry.independent_dose_gy? - planned_gy;
            let total_gy: f64 = entries
                .iter()
                .filter(|other| is_treated(other) && share_point(entry, other))
                .filter_map(|other| other.planned_dose_gy)
                .sum();
            let share_percent = 100.0 * planned_gy / total_gy;
            let limit_percent = site.action_levels.low_weight_share_percent;
            (share_percent < limit_percent)
                .then_some((share_percent, 100.0 * difference_gy / total_gy))
        })
        .collect();
    for (entry, share) in entries.iter_mut().zip(shares) {
        let Some((share_percent, percent_of_total)) = share else {
            continue;
        };
        let Some(levels) = levels_of(entry, site) else {
            continue;
        };
        entry.verdict = levels.verdict(percent_of_total);
        entry.judgement = Some(Judgement::ShareOfTotal {
            share_percent,
            percent_of_total,
        });
        entry.reasons.clear();
        let said = format!(
            "the beam adds {share_percent:.1} % of the dose at its point, so its difference was judged as a per cent of the total: {percent_of_total:+.2} %"
        );
        if entry.verdict == Verdict::Within {
            entry.remarks.insert(0, said);
        } else {
            entry.reasons.push(said);
            let beyond = beyond_reason(entry);
            entry.reasons.push(beyond);
        }
    }
}

/// Doses at fraction level are judged by their sum, or not at all.
fn judge_fraction_level(
    plan: &Plan,
    entries: &mut [&mut BeamEntry],
    site: &Site,
    sum: Result<&SharedPointSum, &String>,
) {
    if !entries.iter().any(|entry| is_fraction_level(plan, entry)) {
        return;
    }
    let strictest = strictest_levels(entries.iter().map(|entry| &**entry), site);
    for entry in entries.iter_mut().filter(|entry| is_treated(entry)) {
        if !entry.calculation.obstacles.is_empty() || entry.judgement.is_none() {
            continue;
        }
        entry.reasons.clear();
        match (&sum, &strictest) {
            (Ok(sum), Some(levels)) => {
                entry.verdict = levels.verdict(sum.deviation_percent);
                entry.judgement = Some(Judgement::FractionSum {
                    sum_deviation_percent: sum.deviation_percent,
                });
                let said = format!(
                    "the plan states beam doses at fraction level (300A,008B), so only the sum over the beams was judged: {:+.2} %",
                    sum.deviation_percent
                );
                if entry.verdict == Verdict::Within {
                    entry.remarks.insert(0, said);
                } else {
                    entry.reasons.push(said);
                }
            }
            _ => {
                let why = match &sum {
                    Err(reason) => reason.as_str(),
                    Ok(_) => "no action level holds for it",
                };
                entry.verdict = Verdict::NotVerifiable;
                entry.judgement = None;
                entry.reasons.push(format!(
                    "the plan states beam doses at fraction level (300A,008B), which have a meaning only as a sum, and there is no sum: {why}"
                ));
            }
        }
    }
}

fn levels_of(entry: &BeamEntry, site: &Site) -> Option<Levels> {
    levels_for(
        entry.calculation.technique,
        entry.calculation.depths.first(),
        &site.action_levels,
    )
}

/// The tightest levels among some beams.
pub(super) fn strictest_levels<'a>(
    entries: impl IntoIterator<Item = &'a BeamEntry>,
    site: &Site,
) -> Option<Levels> {
    entries
        .into_iter()
        .filter(|entry| is_treated(entry))
        .filter_map(|entry| levels_of(entry, site))
        .min_by(|a, b| a.tolerance_percent.total_cmp(&b.tolerance_percent))
}
