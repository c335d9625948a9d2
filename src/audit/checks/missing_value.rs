//! A value that the calculation needs and the plan lacks.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: attributes without which a beam cannot be calculated.
    ///
    /// Why it matters: a missing value is never replaced by a usual one: the beams concerned are not verifiable until it is known.
    ///
    /// Silent when: nothing that the calculation needs is missing.
    ///
    /// What to do: complete the plan in the planning system, or verify the beam by other means.
    ///
    /// Source: DICOM PS3.3 C.8.8.14; what the calculation needs is listed in the README.
    "missing-value", Tolerance,
    |input| from_notes(input, NoteKind::MissingValue),
    fires on || example::with_note(NoteKind::MissingValue),
    silent on || example::with_note(NoteKind::Remark)
}
