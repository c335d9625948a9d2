//! Cumulative meterset weights out of order.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: cumulative meterset weights: they start at zero, never fall, and the last equals the final weight.
    ///
    /// Why it matters: the share of the meterset in every segment follows from them; a corrupt sequence delivers a wrong dose.
    ///
    /// Silent when: the weights are in order.
    ///
    /// What to do: export the plan again; do not treat from this file.
    ///
    /// Source: DICOM PS3.3 C.8.8.14, Cumulative Meterset Weight (300A,0134).
    "meterset-weights", Action,
    |input| from_notes(input, NoteKind::MetersetWeights),
    fires on || example::with_note(NoteKind::MetersetWeights),
    silent on || example::with_note(NoteKind::Remark)
}
