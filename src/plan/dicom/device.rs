//! Beam limiting devices: which are declared, which are positioned anywhere,
//! and whether the leaf banks among them are described consistently. Their
//! positions are read with the control points.

use dicom_dictionary_std::tags;

use super::node::{Node, length};
use super::notes::Notes;
use super::tree::Value;
use crate::plan::{DeviceKind, Effect, LimitingDevice, NoteKind};
use crate::quantity::{Given, Quantity};

/// Kinds of positioned devices that are told apart in one beam.
const MAX_KINDS: usize = 64;

/// Devices of a beam: those that count and those that are never positioned.
pub(super) struct Devices {
    pub(super) used: Vec<LimitingDevice>,
    pub(super) unused: Vec<LimitingDevice>,
}

/// Reads the devices of a beam item.
pub(super) fn read_devices(beam: &Node<'_, '_>, notes: &mut Notes) -> Devices {
    let positioned = positioned_kinds(beam, notes);
    let mut used: Vec<LimitingDevice> = Vec::new();
    let mut unused: Vec<LimitingDevice> = Vec::new();
    let declared: Vec<(LimitingDevice, Node<'_, '_>)> = beam
        .items(
            tags::BEAM_LIMITING_DEVICE_SEQUENCE,
            Effect::BlocksScope,
            notes,
        )
        .map(|item| (read_device(&item, notes), item))
        .collect();
    let kinds: Vec<DeviceKind> = declared
        .iter()
        .map(|(device, _)| device.kind.clone())
        .collect();
    for (device, item) in declared {
        let counts = positioned.iter().any(|kind| {
            *kind == device.kind || (!kinds.contains(kind) && same_jaw_axis(kind, &device.kind))
        });
        if let Some(other) = used.iter().find(|other| other.kind == device.kind) {
            let effect = if *other == device {
                Effect::None
            } else {
                Effect::BlocksScope
            };
            item.note(
                notes,
                tags::RT_BEAM_LIMITING_DEVICE_TYPE,
                NoteKind::RepeatedAttribute,
                effect,
                format!("the device {} is declared twice", device.kind.term()),
            );
            unused.push(device);
        } else if counts {
            check_bank(&device, &item, notes);
            used.push(device);
        } else {
            unused.push(device);
        }
    }
    for kind in positioned {
        let known = used
            .iter()
            .any(|device| device.kind == kind || same_jaw_axis(&device.kind, &kind));
        if !known {
            let effect = if kind.jaw_axis().is_some() {
                Effect::None
            } else {
                Effect::BlocksScope
            };
            beam.note(
                notes,
                tags::BEAM_LIMITING_DEVICE_SEQUENCE,
                NoteKind::DanglingReference,
                effect,
                format!("the device {} is positioned but not declared", kind.term()),
            );
            used.push(LimitingDevice {
                kind,
                pairs: Given::Absent,
                source_distance_cm: Given::Absent,
                boundaries_cm: Given::Absent,
            });
        }
    }
    Devices { used, unused }
}

/// Whether both are jaws of one axis.
pub(super) fn same_jaw_axis(one: &DeviceKind, other: &DeviceKind) -> bool {
    one.jaw_axis().is_some() && one.jaw_axis() == other.jaw_axis()
}

/// Number of leaf pairs that a bank's boundaries or stated pairs give.
pub(super) fn pair_count(device: &LimitingDevice) -> Option<usize> {
    match device.boundaries_cm.value() {
        Some(boundaries) => boundaries.len().checked_sub(1),
        None => device
            .pairs
            .value()
            .and_then(|&pairs| usize::try_from(pairs).ok()),
    }
}

/// Every kind of device that some control point positions, in order of appearance.
fn positioned_kinds(beam: &Node<'_, '_>, notes: &mut Notes) -> Vec<DeviceKind> {
    let mut kinds: Vec<DeviceKind> = Vec::new();
    for point in beam.items(tags::CONTROL_POINT_SEQUENCE, Effect::BlocksScope, notes) {
        let Some(Value::Items(items)) = point
            .set
            .first(tags::BEAM_LIMITING_DEVICE_POSITION_SEQUENCE)
            .map(|element| &element.value)
        else {
            continue;
        };
        for item in items {
            let bytes = |tag| match item.first(tag).map(|element| &element.value) {
                Some(Value::Bytes(bytes)) => *bytes,
                _ => &[],
            };
            let blank = |byte: &u8| matches!(byte, b' ' | 0);
            if bytes(tags::LEAF_JAW_POSITIONS).iter().all(blank) {
                continue;
            }
            let term = beam.charset.decode(
                dicom_core::VR::CS,
                bytes(tags::RT_BEAM_LIMITING_DEVICE_TYPE),
            );
            let known = kinds.iter().any(|kind| kind.term() == term);
            if !known && kinds.len() < MAX_KINDS {
                kinds.push(DeviceKind::from_term(&term));
            }
        }
    }
    kinds
}

fn read_device(item: &Node<'_, '_>, notes: &mut Notes) -> LimitingDevice {
    let tag = tags::RT_BEAM_LIMITING_DEVICE_TYPE;
    let kind = item.text(tag, Effect::BlocksScope, notes).get();
    if kind.is_none() {
        item.note(
            notes,
            tag,
            NoteKind::MissingValue,
            Effect::BlocksScope,
            "a beam limiting device without a type",
        );
    }
    let mut boundaries = Vec::new();
    let boundaries_cm = item
        .numbers_into(
            tags::LEAF_POSITION_BOUNDARIES,
            length(Quantity::DevicePosition, Effect::BlocksScope),
            &mut boundaries,
            notes,
        )
        .map(|()| boundaries)
        .given();
    LimitingDevice {
        kind: DeviceKind::from_term(&kind.unwrap_or_default()),
        pairs: item.integer(tags::NUMBER_OF_LEAF_JAW_PAIRS, Effect::None, notes),
        source_distance_cm: item.number(
            tags::SOURCE_TO_BEAM_LIMITING_DEVICE_DISTANCE,
            length(Quantity::DeviceDistance, Effect::None),
            notes,
        ),
        boundaries_cm,
    }
}

/// A leaf bank needs one boundary more than pairs, and rising ones.
fn check_bank(device: &LimitingDevice, item: &Node<'_, '_>, notes: &mut Notes) {
    if device.kind.leaf_axis().is_none() {
        return;
    }
    let tag = tags::LEAF_POSITION_BOUNDARIES;
    let Some(boundaries) = device.boundaries_cm.value() else {
        item.note(
            notes,
            tag,
            NoteKind::MissingValue,
            Effect::BlocksScope,
            "a leaf bank without usable leaf boundaries",
        );
        return;
    };
    if let Some(&pairs) = device.pairs.value()
        && usize::try_from(pairs).ok() != boundaries.len().checked_sub(1)
    {
        item.note_values(
            notes,
            tag,
            NoteKind::CountMismatch,
            Effect::BlocksScope,
            format!(
                "{pairs} leaf pairs need {} boundaries, {} are there",
                i64::from(pairs) + 1,
                boundaries.len()
            ),
            (
                Some(boundaries.len().to_string()),
                Some((i64::from(pairs) + 1).to_string()),
            ),
        );
    }
    if boundaries.len() < 2 || !boundaries.is_sorted_by(|a, b| a < b) {
        item.note(
            notes,
            tag,
            NoteKind::Aperture,
            Effect::BlocksScope,
            "leaf boundaries do not rise from each to the next",
        );
    }
}
