//! Beam doses that look like a split prescription.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::dose::Technique;

/// Doses are equal within this, relative: closer than beams of different weight come out by chance.
const EQUAL_RELATIVE: f64 = 1e-6;

/// Metersets differ when they are further apart than this, relative.
const DIFFERENT_RELATIVE: f64 = 0.05;

check! {
    /// What it looks at: the beam doses of a fraction group whose beams have clearly different metersets (over 5 %).
    ///
    /// Why it matters: some systems write the prescribed dose divided by the number of beams, or a fixed placeholder, instead of what each beam adds at its point. Every deviation then says nothing about the beam. Beams that were weighted equally at the point on purpose look the same, so this is a note.
    ///
    /// Silent when: the doses differ, the metersets are alike, or there is only one treatment beam.
    ///
    /// What to do: see in the planning system what each beam adds at the point, and set the export to write that.
    ///
    /// Source: DICOM PS3.3 C.8.8.13, Beam Dose (300A,0084); met in real exports (common practice).
    "equal-beam-doses", Note, look,
    fires on || example::with_two_beams([(100.0, 1.0), (150.0, 1.0)]),
    silent on || example::with_two_beams([(100.0, 1.0), (100.0, 1.0)])
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    (0..input.plan.fraction_groups.len())
        .filter_map(|group_index| {
            let pairs: Vec<(f64, f64)> = input
                .beams
                .iter()
                .filter(|entry| {
                    entry.calculation.group_index == Some(group_index)
                        && entry.calculation.technique != Technique::Setup
                })
                .filter_map(|entry| entry.planned_mu.zip(entry.planned_dose_gy))
                .collect();
            let (&(first_mu, first_gy), others) = pairs.split_first()?;
            let equal = others
                .iter()
                .all(|&(_, dose_gy)| (dose_gy / first_gy - 1.0).abs() < EQUAL_RELATIVE);
            let different = others
                .iter()
                .any(|&(mu, _)| (mu / first_mu - 1.0).abs() > DIFFERENT_RELATIVE);
            (equal && different).then(|| Observation {
                message: format!(
                    "all {} beams of the fraction group state the same beam dose (300A,0084) though their metersets differ: it may be a placeholder or the prescription split evenly",
                    pairs.len()
                ),
                measured: Some(format!("{first_gy} Gy each")),
                limit: Some("each beam's own dose at the point".to_owned()),
                ..Observation::default()
            })
        })
        .collect()
}
