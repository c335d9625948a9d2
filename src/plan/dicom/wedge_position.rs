//! Wedge positions at one control point, joined to the beam's wedges by
//! number; each wedge takes over its own last position.

use dicom_dictionary_std::tags;

use super::inherit::Before;
use super::node::{Node, Reading};
use super::notes::Notes;
use crate::plan::{Effect, NoteKind, Wedge, WedgePosition};
use crate::quantity::Given;

pub(super) fn read_wedge_positions(
    item: &Node<'_, '_>,
    wedges: &[Wedge],
    before: &Before<'_>,
    notes: &mut Notes,
) -> Vec<WedgePosition> {
    let mut here: Vec<Reading<bool>> = wedges.iter().map(|_| Reading::Nothing).collect();
    for position in item.items(tags::WEDGE_POSITION_SEQUENCE, Effect::BlocksScope, notes) {
        let tag = tags::REFERENCED_WEDGE_NUMBER;
        let number = position.integer(tag, Effect::BlocksScope, notes);
        let held = wedges
            .iter()
            .zip(&mut here)
            .find(|(wedge, _)| !number.is_absent() && wedge.number == number);
        let Some((_, held)) = held else {
            position.note(
                notes,
                tag,
                NoteKind::DanglingReference,
                Effect::BlocksScope,
                "the position of a wedge that the beam does not have",
            );
            continue;
        };
        let stands = read_wedge_position(&position, notes);
        match (&*held, &stands) {
            (Reading::Nothing, _) => *held = stands,
            (one, other) if one == other => {}
            _ => {
                position.note(
                    notes,
                    tags::WEDGE_POSITION,
                    NoteKind::RepeatedAttribute,
                    Effect::BlocksScope,
                    "one wedge has two positions at one control point; neither is used",
                );
                *held = Reading::Unusable;
            }
        }
    }
    wedges
        .iter()
        .zip(here)
        .enumerate()
        .map(|(index, (wedge, here))| {
            let old = before.point.wedges.get(index);
            WedgePosition {
                wedge_number: wedge.number.clone(),
                in_beam: before.carry(here, old.map_or(&Given::Absent, |old| &old.in_beam)),
            }
        })
        .collect()
}

fn read_wedge_position(position: &Node<'_, '_>, notes: &mut Notes) -> Reading<bool> {
    let tag = tags::WEDGE_POSITION;
    let term = match position.text_reading(tag, Effect::BlocksScope, notes) {
        Reading::Value(term) => term,
        Reading::Nothing => return Reading::Nothing,
        Reading::Unusable => return Reading::Unusable,
    };
    match term.as_str() {
        "IN" => Reading::Value(true),
        "OUT" => Reading::Value(false),
        _ => {
            position.note(
                notes,
                tag,
                NoteKind::MalformedValue,
                Effect::BlocksScope,
                format!("wedge position '{term}' is neither IN nor OUT"),
            );
            Reading::Unusable
        }
    }
}
