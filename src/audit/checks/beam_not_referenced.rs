//! A treatment beam that no fraction group delivers.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::dose::Technique;

check! {
    /// What it looks at: treatment beams that no fraction group references.
    ///
    /// Why it matters: such a beam has no meterset; either it was meant to be treated and will not be, or it is a left-over that confuses.
    ///
    /// Silent when: every treatment beam is referenced; setup beams may stand alone.
    ///
    /// What to do: delete the beam or add it to its fraction group in the planning system.
    ///
    /// Source: DICOM PS3.3 C.8.8.13, Referenced Beam Sequence (300C,0004); common practice in chart checks.
    "beam-not-referenced", Tolerance, look,
    fires on || example::changed(|example| example.beams[0].calculation.group_index = None),
    silent on || example::changed(|example| {
        example.beams[0].calculation.group_index = None;
        example.beams[0].calculation.technique = Technique::Setup;
    })
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    input
        .beams
        .iter()
        .filter(|entry| {
            entry.calculation.technique != Technique::Setup
                && entry.calculation.group_index.is_none()
        })
        .map(|entry| Observation {
            beam_number: entry.beam_number,
            message: "no fraction group references this treatment beam (Referenced Beam Sequence, 300C,0004): delete it or add it to its group".to_owned(),
            ..Observation::default()
        })
        .collect()
}
