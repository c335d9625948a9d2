//! A value that cannot be read.

use super::check::{check, from_notes};
#[cfg(test)]
use super::example;
use crate::plan::NoteKind;

check! {
    /// What it looks at: values that cannot be read as what the standard says they are: text where a number belongs, a comma as decimal sign, too few or too many values.
    ///
    /// Why it matters: a value that one system reads and another drops is a plan that two systems see differently. The value counts as absent here.
    ///
    /// Silent when: every value reads as its type, or is empty.
    ///
    /// What to do: look up the attribute in the planning system and export the plan again.
    ///
    /// Source: DICOM PS3.5 section 6.2, value representations DS and IS.
    "malformed-value", Tolerance,
    |input| from_notes(input, NoteKind::MalformedValue),
    fires on || example::with_note(NoteKind::MalformedValue),
    silent on || example::with_note(NoteKind::Remark)
}
