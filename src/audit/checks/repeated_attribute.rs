//! An attribute that stands twice.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: an attribute that stands twice in one data set, or one axis that two devices limit differently.
    ///
    /// Why it matters: readers differ in which of the two they take, so two systems may treat two different plans.
    ///
    /// Silent when: every attribute stands once.
    ///
    /// What to do: export the plan again; if it repeats, compare both values with the planning system and report it to its maker.
    ///
    /// Source: DICOM PS3.5 section 7.1: an element occurs at most once in a data set.
    "repeated-attribute", Tolerance,
    |input| from_notes(input, NoteKind::RepeatedAttribute),
    fires on || example::with_note(NoteKind::RepeatedAttribute),
    silent on || example::with_note(NoteKind::Remark)
}
