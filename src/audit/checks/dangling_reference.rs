//! A reference that leads nowhere.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: references to a beam, dose reference, patient setup, tolerance table or wedge that is not in the plan.
    ///
    /// Why it matters: something that was meant to be treated, or its prescription, is missing from the file.
    ///
    /// Silent when: every reference finds its item.
    ///
    /// What to do: compare the beam list with the planning system and export the plan again.
    ///
    /// Source: DICOM PS3.3 C.8.8.13 and C.8.8.14.
    "dangling-reference", Action,
    |input| from_notes(input, NoteKind::DanglingReference),
    fires on || example::with_note(NoteKind::DanglingReference),
    silent on || example::with_note(NoteKind::Remark)
}
