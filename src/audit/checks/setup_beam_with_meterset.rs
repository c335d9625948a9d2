//! A beam that is marked as not treated and yet has a meterset.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::dose::Technique;

check! {
    /// What it looks at: beams whose delivery type says that they do not treat, with a meterset above zero.
    ///
    /// Why it matters: such a beam is not verified; if its delivery type is wrong, it would treat unchecked.
    ///
    /// Silent when: beams that do not treat have no meterset or 0 MU.
    ///
    /// What to do: see in the planning system whether the beam is an imaging field.
    ///
    /// Source: DICOM PS3.3 C.8.8.14, Treatment Delivery Type (300A,00CE); common practice in chart checks.
    "setup-beam-with-meterset", Note, look,
    fires on || example::changed(|example| example.beams[0].calculation.technique = Technique::Setup),
    silent on || example::changed(|example| {
        example.beams[0].calculation.technique = Technique::Setup;
        example.beams[0].planned_mu = Some(0.0);
    })
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    input
        .beams
        .iter()
        .filter(|entry| entry.calculation.technique == Technique::Setup)
        .filter_map(|entry| {
            let mu = entry.planned_mu.filter(|&mu| mu > 0.0)?;
            Some(Observation {
                beam_number: entry.beam_number,
                message: "a beam that is marked as not delivered for treatment has a meterset and is not verified: see whether it is an imaging field".to_owned(),
                measured: Some(format!("{mu} MU")),
                limit: Some("no meterset".to_owned()),
            })
        })
        .collect()
}
