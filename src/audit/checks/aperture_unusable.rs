//! An aperture that cannot be what was meant.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: jaw and leaf positions: closed or inverted openings, positions that do not match the number of leaves, boundaries out of order.
    ///
    /// Why it matters: such an aperture cannot be delivered as planned, or was corrupted on the way.
    ///
    /// Silent when: the openings are open and complete.
    ///
    /// What to do: compare jaws and leaves with the planning system and export the plan again.
    ///
    /// Source: DICOM PS3.3 C.8.8.14, Leaf/Jaw Positions (300A,011C).
    "aperture-unusable", Action,
    |input| from_notes(input, NoteKind::Aperture),
    fires on || example::with_note(NoteKind::Aperture),
    silent on || example::with_note(NoteKind::Remark)
}
