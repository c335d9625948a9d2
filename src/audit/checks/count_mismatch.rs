//! A count that the items contradict.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: the stated numbers of control points, beams, wedges, blocks, compensators, boli and block points against the items that are there.
    ///
    /// Why it matters: the items are what is used; a wrong count can mean that an item was lost on the way.
    ///
    /// Silent when: counts and items agree, or no count is stated.
    ///
    /// What to do: compare the number of beams and modifiers with the planning system.
    ///
    /// Source: DICOM PS3.3 C.8.8.14.
    "count-mismatch", Note,
    |input| from_notes(input, NoteKind::CountMismatch),
    fires on || example::with_note(NoteKind::CountMismatch),
    silent on || example::with_note(NoteKind::Remark)
}
