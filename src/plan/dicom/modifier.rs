//! Wedges, blocks, compensators, applicators, accessories and bolus of a beam.

use std::sync::Arc;

use dicom_dictionary_std::tags;

use super::node::{Node, length, plain, quantity};
use super::notes::Notes;
use crate::plan::{
    Accessory, Applicator, Block, BlockType, Bolus, Compensator, Effect, NoteKind, Wedge, WedgeKind,
};
use crate::quantity::{Given, Quantity};

const DISTANCE: super::node::Wanted = length(Quantity::DeviceDistance, Effect::None);

pub(super) fn read_wedges(beam: &Node<'_, '_>, notes: &mut Notes) -> Vec<Wedge> {
    let wedges: Vec<Wedge> = beam
        .items(tags::WEDGE_SEQUENCE, Effect::BlocksScope, notes)
        .map(|item| Wedge {
            number: item.integer(tags::WEDGE_NUMBER, Effect::BlocksScope, notes),
            kind: item
                .text(tags::WEDGE_TYPE, Effect::BlocksScope, notes)
                .map(|term| match term.as_str() {
                    "STANDARD" => WedgeKind::Standard,
                    "DYNAMIC" => WedgeKind::Dynamic,
                    "MOTORIZED" => WedgeKind::Motorized,
                    "PARTIAL_STANDARD" => WedgeKind::PartialStandard,
                    "PARTIAL_MOTORIZ" => WedgeKind::PartialMotorized,
                    _ => WedgeKind::Other(term),
                }),
            id: item.text(tags::WEDGE_ID, Effect::BlocksScope, notes),
            accessory_code: item.text(tags::ACCESSORY_CODE, Effect::None, notes),
            angle_deg: item.number(
                tags::WEDGE_ANGLE,
                quantity(Quantity::Angle, Effect::BlocksScope),
                notes,
            ),
            factor: item.number(tags::WEDGE_FACTOR, plain(Effect::None), notes),
            orientation_deg: item.number(
                tags::WEDGE_ORIENTATION,
                quantity(Quantity::Angle, Effect::BlocksScope),
                notes,
            ),
            source_to_tray_cm: item.number(tags::SOURCE_TO_WEDGE_TRAY_DISTANCE, DISTANCE, notes),
        })
        .collect();
    check_count(beam, tags::NUMBER_OF_WEDGES, wedges.len(), notes);
    wedges
}

/// More modifiers stated than there are: something that stands in the beam may be missing.
fn check_count(beam: &Node<'_, '_>, tag: dicom_core::Tag, items: usize, notes: &mut Notes) {
    beam.check_count(tag, items, Effect::BlocksScope, notes);
}

pub(super) fn read_blocks(beam: &Node<'_, '_>, notes: &mut Notes) -> Vec<Block> {
    let blocks: Vec<Block> = beam
        .items(tags::BLOCK_SEQUENCE, Effect::BlocksScope, notes)
        .map(|item| read_block(&item, notes))
        .collect();
    check_count(beam, tags::NUMBER_OF_BLOCKS, blocks.len(), notes);
    blocks
}

fn read_block(item: &Node<'_, '_>, notes: &mut Notes) -> Block {
    Block {
        number: item.integer(tags::BLOCK_NUMBER, Effect::None, notes),
        name: item.text(tags::BLOCK_NAME, Effect::None, notes),
        block_type: item
            .text(tags::BLOCK_TYPE, Effect::BlocksScope, notes)
            .map(|term| match term.as_str() {
                "SHIELDING" => BlockType::Shielding,
                "APERTURE" => BlockType::Aperture,
                _ => BlockType::Other(term),
            }),
        divergent: read_divergence(item, notes),
        mounting: item.text(tags::BLOCK_MOUNTING_POSITION, Effect::None, notes),
        tray_id: item.text(tags::BLOCK_TRAY_ID, Effect::BlocksScope, notes),
        accessory_code: item.text(tags::ACCESSORY_CODE, Effect::None, notes),
        material: item.text(tags::MATERIAL_ID, Effect::None, notes),
        thickness_cm: item.number(
            tags::BLOCK_THICKNESS,
            length(Quantity::DevicePosition, Effect::None),
            notes,
        ),
        transmission: item.number(
            tags::BLOCK_TRANSMISSION,
            quantity(Quantity::Transmission, Effect::BlocksScope),
            notes,
        ),
        source_to_tray_cm: item.number(tags::SOURCE_TO_BLOCK_TRAY_DISTANCE, DISTANCE, notes),
        outline_cm: read_outline(item, notes),
    }
}

fn read_divergence(item: &Node<'_, '_>, notes: &mut Notes) -> Given<bool> {
    let tag = tags::BLOCK_DIVERGENCE;
    let Some(term) = item.text(tag, Effect::None, notes).get() else {
        return Given::Absent;
    };
    match term.as_str() {
        "PRESENT" => Given::stated(true),
        "ABSENT" => Given::stated(false),
        _ => {
            item.note(
                notes,
                tag,
                NoteKind::MalformedValue,
                Effect::None,
                format!("'{term}' is neither PRESENT nor ABSENT; it counts as absent"),
            );
            Given::Absent
        }
    }
}

/// The outline, pairs of x and y.
fn read_outline(item: &Node<'_, '_>, notes: &mut Notes) -> Given<Arc<[[f64; 2]]>> {
    let tag = tags::BLOCK_DATA;
    let wanted = length(Quantity::DevicePosition, Effect::BlocksScope);
    let mut values = Vec::new();
    let reading = item.numbers_into(tag, wanted, &mut values, notes);
    let (points, rest) = values.as_chunks::<2>();
    if !rest.is_empty() {
        item.note(
            notes,
            tag,
            NoteKind::MalformedValue,
            Effect::BlocksScope,
            format!("{} numbers are no pairs of x and y", values.len()),
        );
        return Given::Absent;
    }
    let outline = reading.map(|()| Arc::from(points)).given();
    if !outline.is_absent() {
        item.check_count(
            tags::BLOCK_NUMBER_OF_POINTS,
            points.len(),
            Effect::BlocksScope,
            notes,
        );
    }
    outline
}

pub(super) fn read_compensators(beam: &Node<'_, '_>, notes: &mut Notes) -> Vec<Compensator> {
    let compensators: Vec<Compensator> = beam
        .items(tags::COMPENSATOR_SEQUENCE, Effect::BlocksScope, notes)
        .map(|item| Compensator {
            number: item.integer(tags::COMPENSATOR_NUMBER, Effect::None, notes),
            id: item.text(tags::COMPENSATOR_ID, Effect::None, notes),
            kind: item.text(tags::COMPENSATOR_TYPE, Effect::None, notes),
            material: item.text(tags::MATERIAL_ID, Effect::None, notes),
            tray_id: item.text(tags::COMPENSATOR_TRAY_ID, Effect::None, notes),
            has_transmission: item
                .set
                .first(tags::COMPENSATOR_TRANSMISSION_DATA)
                .is_some(),
            has_thickness: item.set.first(tags::COMPENSATOR_THICKNESS_DATA).is_some(),
        })
        .collect();
    check_count(
        beam,
        tags::NUMBER_OF_COMPENSATORS,
        compensators.len(),
        notes,
    );
    compensators
}

pub(super) fn read_applicators(beam: &Node<'_, '_>, notes: &mut Notes) -> Vec<Applicator> {
    beam.items(tags::APPLICATOR_SEQUENCE, Effect::BlocksScope, notes)
        .map(|item| Applicator {
            id: item.text(tags::APPLICATOR_ID, Effect::BlocksScope, notes),
            kind: item.text(tags::APPLICATOR_TYPE, Effect::BlocksScope, notes),
            description: item.text(tags::APPLICATOR_DESCRIPTION, Effect::None, notes),
            accessory_code: item.text(tags::ACCESSORY_CODE, Effect::None, notes),
            source_to_mounting_cm: item.number(
                tags::SOURCE_TO_APPLICATOR_MOUNTING_POSITION_DISTANCE,
                DISTANCE,
                notes,
            ),
        })
        .collect()
}

pub(super) fn read_accessories(beam: &Node<'_, '_>, notes: &mut Notes) -> Vec<Accessory> {
    beam.items(tags::GENERAL_ACCESSORY_SEQUENCE, Effect::BlocksScope, notes)
        .map(|item| Accessory {
            number: item.integer(tags::GENERAL_ACCESSORY_NUMBER, Effect::None, notes),
            id: item.text(tags::GENERAL_ACCESSORY_ID, Effect::BlocksScope, notes),
            kind: item.text(tags::GENERAL_ACCESSORY_TYPE, Effect::BlocksScope, notes),
            description: item.text(tags::GENERAL_ACCESSORY_DESCRIPTION, Effect::None, notes),
            accessory_code: item.text(tags::ACCESSORY_CODE, Effect::None, notes),
        })
        .collect()
}

pub(super) fn read_boluses(beam: &Node<'_, '_>, notes: &mut Notes) -> Vec<Bolus> {
    let boluses: Vec<Bolus> = beam
        .items(tags::REFERENCED_BOLUS_SEQUENCE, Effect::BlocksScope, notes)
        .map(|item| Bolus {
            roi_number: item.integer(tags::REFERENCED_ROI_NUMBER, Effect::None, notes),
            id: item.text(tags::BOLUS_ID, Effect::None, notes),
            description: item.text(tags::BOLUS_DESCRIPTION, Effect::None, notes),
            accessory_code: item.text(tags::ACCESSORY_CODE, Effect::None, notes),
        })
        .collect();
    check_count(beam, tags::NUMBER_OF_BOLI, boluses.len(), notes);
    boluses
}
