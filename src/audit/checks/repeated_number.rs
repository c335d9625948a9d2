//! A number that stands twice.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: beam, fraction group, dose reference and wedge numbers that stand twice.
    ///
    /// Why it matters: references go by number: with two beams of one number nobody can tell which meterset belongs to which.
    ///
    /// Silent when: every number is unique within its plan.
    ///
    /// What to do: correct the plan in the planning system and export it again; do not treat from this file.
    ///
    /// Source: DICOM PS3.3 C.8.8.14: the number is unique within the plan in which it is created.
    "repeated-number", Action,
    |input| from_notes(input, NoteKind::RepeatedNumber),
    fires on || example::with_note(NoteKind::RepeatedNumber),
    silent on || example::with_note(NoteKind::Remark)
}
