//! A treatment beam without a usable meterset.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::dose::Technique;

check! {
    /// What it looks at: treatment beams that a fraction group references without a meterset, or with 0 MU.
    ///
    /// Why it matters: nothing can be verified, and a beam that is meant to treat will deliver nothing; imaging fields are sometimes exported as treatment beams.
    ///
    /// Silent when: every referenced treatment beam has a meterset above zero; setup beams need none.
    ///
    /// What to do: calculate the plan, or mark the beam as a setup beam, and export again.
    ///
    /// Source: DICOM PS3.3 C.8.8.13, Beam Meterset (300A,0086).
    "meterset-missing", Action, look,
    fires on || example::changed(|example| example.beams[0].planned_mu = None),
    silent on || example::changed(|example| {
        example.beams[0].planned_mu = None;
        example.beams[0].calculation.technique = Technique::Setup;
    })
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    input
        .beams
        .iter()
        .filter(|entry| {
            entry.calculation.technique != Technique::Setup
                && entry.calculation.group_index.is_some()
                && entry.planned_mu.is_none_or(|mu| mu <= 0.0)
        })
        .map(|entry| Observation {
            beam_number: entry.beam_number,
            message: "a treatment beam without a meterset (Beam Meterset, 300A,0086): calculate the plan, or mark the beam as setup".to_owned(),
            measured: entry.planned_mu.map(|mu| format!("{mu} MU")),
            limit: Some("above 0 MU".to_owned()),
        })
        .collect()
}
