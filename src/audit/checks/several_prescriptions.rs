//! More than one prescribed dose.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::audit::prescription::stated_prescriptions;

check! {
    /// What it looks at: the target prescription doses that the fraction groups refer to.
    ///
    /// Why it matters: with several (a simultaneous boost, or a left-over) the one prescribed dose of a plan cannot be told, so that cell stays empty.
    ///
    /// Silent when: there is one, or none.
    ///
    /// What to do: compare each with the prescription in the patient's record.
    ///
    /// Source: DICOM PS3.3 C.8.8.10, Target Prescription Dose (300A,0026).
    "several-prescriptions", Note, look,
    fires on || example::with_prescriptions(&[50.0, 60.0]),
    silent on || example::with_prescriptions(&[50.0])
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    let stated = stated_prescriptions(input.plan);
    if stated.len() < 2 {
        return Vec::new();
    }
    stated
        .iter()
        .map(|one| Observation {
            message: format!(
                "one of {} target prescription doses: dose reference {}; compare it with the prescription",
                stated.len(),
                one.reference_number
                    .map_or_else(|| "without a number".to_owned(), |number| number.to_string()),
            ),
            measured: Some(format!("{} Gy", one.dose_gy)),
            ..Observation::default()
        })
        .collect()
}
