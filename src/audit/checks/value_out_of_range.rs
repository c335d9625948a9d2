//! A value nobody would believe.

use super::check::{CheckInput, Observation, check, from_notes_where};
#[cfg(test)]
use super::example;
use crate::plan::{Beam, NoteKind, NoteScope, ReadingNote};
#[cfg(test)]
use crate::{plan::DeliveryType, quantity::Given};

check! {
    /// What it looks at: distances, angles, energies, doses and metersets against the range that is credible for a linear accelerator.
    ///
    /// Why it matters: a value ten or a hundred times off is nearly always a unit slip (cm for mm, cGy for Gy). The value counts as absent here; nothing is rescaled.
    ///
    /// Silent when: every value of the plan and of its treatment beams is credible; imaging fields have kilovolts and distances of their own.
    ///
    /// What to do: find out which system wrote the value and in which unit; do not treat before it is explained.
    ///
    /// Source: the ranges are common practice; the message names them.
    "value-out-of-range", Action,
    look,
    fires on || example::with_note(NoteKind::IncredibleValue),
    silent on || {
        let mut example = example::with_note(NoteKind::IncredibleValue);
        example.plan.beams[0].delivery = Given::stated(DeliveryType::Setup);
        example
    }
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    let treats = |note: &ReadingNote| match note.scope {
        NoteScope::Beam(index) => input.plan.beams.get(index).is_none_or(Beam::is_treatment),
        NoteScope::Plan | NoteScope::FractionGroup(_) => true,
    };
    from_notes_where(input, NoteKind::IncredibleValue, treats)
}
