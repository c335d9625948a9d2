//! Jaws and leaves at one control point: each device takes over its own last
//! position, one axis has one position, and an opening that is closed or
//! inverted is noted. Which devices a beam has is `device`'s matter.

use std::sync::Arc;

use dicom_dictionary_std::tags;

use super::device::pair_count;
use super::inherit::{BeamFrame, Before};
use super::node::{Node, Reading, Wanted, length};
use super::notes::Notes;
use crate::plan::{
    ControlPoint, DeviceKind, Effect, LeafAxis, LeafPositions, LimitingDevice, NoteKind,
};
use crate::quantity::{Given, Quantity, tolerance};

const POSITION: Wanted = length(Quantity::DevicePosition, Effect::BlocksScope);

/// Apertures that were already complained about, so that an arc gives one note and not hundreds.
#[derive(Default)]
pub(super) struct Told {
    jaws_x: bool,
    jaws_y: bool,
    leaves: bool,
}

/// Jaws and leaves of one control point.
pub(super) fn read_positions(
    item: &Node<'_, '_>,
    frame: &BeamFrame<'_>,
    before: &Before<'_>,
    point: &mut ControlPoint,
    scratch: &mut Vec<f64>,
    told: &mut Told,
    notes: &mut Notes,
) {
    let banks = || {
        frame
            .devices
            .iter()
            .filter(|device| device.kind.leaf_axis().is_some())
    };
    let mut jaws_x = Reading::Nothing;
    let mut jaws_y = Reading::Nothing;
    let mut leaves: Vec<Reading<Arc<[f64]>>> = banks().map(|_| Reading::Nothing).collect();
    let sequence = tags::BEAM_LIMITING_DEVICE_POSITION_SEQUENCE;
    for position in item.items(sequence, Effect::BlocksScope, notes) {
        let tag = tags::RT_BEAM_LIMITING_DEVICE_TYPE;
        let Some(term) = position.text(tag, Effect::BlocksScope, notes).get() else {
            position.note(
                notes,
                tag,
                NoteKind::MissingValue,
                Effect::BlocksScope,
                "positions of a device without a type",
            );
            continue;
        };
        let kind = DeviceKind::from_term(&term);
        match kind.jaw_axis() {
            Some(LeafAxis::X) => {
                let here = read_jaws(&position, &mut told.jaws_x, notes);
                merge(&position, &kind, &mut jaws_x, here, notes);
            }
            Some(LeafAxis::Y) => {
                let here = read_jaws(&position, &mut told.jaws_y, notes);
                merge(&position, &kind, &mut jaws_y, here, notes);
            }
            None => {
                let bank = banks().zip(&mut leaves).find(|(bank, _)| bank.kind == kind);
                if let Some((bank, held)) = bank {
                    let here = read_leaves(&position, bank, scratch, told, notes);
                    merge(&position, &kind, held, here, notes);
                }
            }
        }
    }
    point.jaws_x_cm = before.carry(jaws_x, &before.point.jaws_x_cm);
    point.jaws_y_cm = before.carry(jaws_y, &before.point.jaws_y_cm);
    point.leaves = banks()
        .zip(leaves)
        .enumerate()
        .map(|(index, (bank, here))| {
            let old = before.point.leaves.get(index);
            LeafPositions {
                kind: bank.kind.clone(),
                positions_cm: before
                    .carry(here, old.map_or(&Given::Absent, |old| &old.positions_cm)),
            }
        })
        .collect();
}

/// Puts a reading into its place; a second, different one makes both unusable.
fn merge<T: PartialEq>(
    position: &Node<'_, '_>,
    kind: &DeviceKind,
    held: &mut Reading<T>,
    here: Reading<T>,
    notes: &mut Notes,
) {
    match (&*held, &here) {
        (Reading::Nothing, _) => *held = here,
        (_, Reading::Nothing) => {}
        (one, other) => {
            let same = one == other && matches!(one, Reading::Value(_));
            let (effect, message) = if same {
                (Effect::None, "twice, at the same place")
            } else {
                (
                    Effect::BlocksScope,
                    "twice, at different places; neither is used",
                )
            };
            position.note(
                notes,
                tags::LEAF_JAW_POSITIONS,
                NoteKind::RepeatedAttribute,
                effect,
                format!("the axis of {} is positioned {message}", kind.term()),
            );
            if !same {
                *held = Reading::Unusable;
            }
        }
    }
}

fn read_jaws(position: &Node<'_, '_>, told: &mut bool, notes: &mut Notes) -> Reading<[f64; 2]> {
    let tag = tags::LEAF_JAW_POSITIONS;
    let reading = position.exactly::<2>(tag, POSITION, notes);
    if let Reading::Value([low, high]) = reading
        && low >= high
        && !*told
    {
        *told = true;
        let word = if low > high { "inverted" } else { "closed" };
        position.note_values(
            notes,
            tag,
            NoteKind::Aperture,
            Effect::BlocksScope,
            format!("the jaws are {word}"),
            (Some(format!("{low} to {high} cm")), None),
        );
    }
    reading
}

fn read_leaves(
    position: &Node<'_, '_>,
    bank: &LimitingDevice,
    scratch: &mut Vec<f64>,
    told: &mut Told,
    notes: &mut Notes,
) -> Reading<Arc<[f64]>> {
    let tag = tags::LEAF_JAW_POSITIONS;
    match position.numbers_into(tag, POSITION, scratch, notes) {
        Reading::Value(()) => {}
        Reading::Nothing => return Reading::Nothing,
        Reading::Unusable => return Reading::Unusable,
    }
    let Some(pairs) = pair_count(bank) else {
        return Reading::Unusable;
    };
    if Some(scratch.len()) != pairs.checked_mul(2) {
        let expected = pairs.saturating_mul(2);
        position.note_count(tag, Effect::BlocksScope, scratch.len(), expected, notes);
        return Reading::Unusable;
    }
    if let Some((low, high)) = scratch.split_at_checked(pairs)
        && !told.leaves
    {
        let crossed = low
            .iter()
            .zip(high)
            .position(|(low, high)| *low > *high + tolerance::POSITION_CM);
        if let Some(pair) = crossed {
            told.leaves = true;
            position.note_values(
                notes,
                tag,
                NoteKind::Aperture,
                Effect::BlocksScope,
                format!(
                    "the leaves of pair {} (from 1) of {} overlap: the opening is inverted",
                    pair + 1,
                    bank.kind.term()
                ),
                (Some((pair + 1).to_string()), None),
            );
        }
    }
    Reading::Value(Arc::from(scratch.as_slice()))
}
