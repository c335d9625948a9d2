//! A value nobody would believe.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: distances, angles, energies, doses and metersets against the range that is credible for a linear accelerator.
    ///
    /// Why it matters: a value ten or a hundred times off is nearly always a unit slip (cm for mm, cGy for Gy). The value counts as absent here; nothing is rescaled.
    ///
    /// Silent when: every value is credible.
    ///
    /// What to do: find out which system wrote the value and in which unit; do not treat before it is explained.
    ///
    /// Source: the ranges are common practice; the message names them.
    "value-out-of-range", Action,
    |input| from_notes(input, NoteKind::IncredibleValue),
    fires on || example::with_note(NoteKind::IncredibleValue),
    silent on || example::with_note(NoteKind::Remark)
}
