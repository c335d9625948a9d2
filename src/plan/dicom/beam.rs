//! Beams: what does not change from control point to control point, and what
//! a treatment beam must have to be calculated at all.

use dicom_core::Tag;
use dicom_dictionary_std::tags;

use super::control_point::read_control_points;
use super::device::{Devices, read_devices};
use super::inherit::BeamFrame;
use super::modifier::{
    read_accessories, read_applicators, read_blocks, read_boluses, read_compensators, read_wedges,
};
use super::node::{Node, length, plain};
use super::notes::Notes;
use crate::plan::{
    Beam, BeamEnergy, ControlPoint, DeliveryType, Effect, NoteKind, NoteScope, RadiationType,
};
use crate::quantity::{Given, Quantity, tolerance};

/// Beams, by item order.
pub(super) fn read_beams(root: &Node<'_, '_>, notes: &mut Notes) -> Vec<Beam> {
    root.items(tags::BEAM_SEQUENCE, Effect::BlocksPlan, notes)
        .enumerate()
        .map(|(index, item)| {
            let item = item.about(NoteScope::Beam(index));
            let beam = read_beam(&item, notes);
            if beam.is_treatment() {
                super::complete::check_beam(&item, &beam, notes);
            }
            beam
        })
        .collect()
}

fn read_beam(item: &Node<'_, '_>, notes: &mut Notes) -> Beam {
    let radiation = item
        .text(tags::RADIATION_TYPE, Effect::BlocksScope, notes)
        .map(|term| match term.as_str() {
            "PHOTON" => RadiationType::Photon,
            "ELECTRON" => RadiationType::Electron,
            _ => RadiationType::Other(term),
        });
    let Devices { used, unused } = read_devices(item, notes);
    let wedges = read_wedges(item, notes);
    let frame = BeamFrame {
        radiation: radiation.value(),
        devices: &used,
        wedges: &wedges,
    };
    let control_points = read_control_points(item, &frame, notes);
    item.check_count(
        tags::NUMBER_OF_CONTROL_POINTS,
        control_points.len(),
        Effect::None,
        notes,
    );
    let energy = read_energy(item, &control_points, notes);
    let mut text = |tag: Tag, effect| item.text(tag, effect, notes);
    Beam {
        name: text(tags::BEAM_NAME, Effect::None),
        description: text(tags::BEAM_DESCRIPTION, Effect::None),
        beam_type: text(tags::BEAM_TYPE, Effect::None),
        high_dose_technique: text(tags::HIGH_DOSE_TECHNIQUE_TYPE, Effect::None),
        machine: text(tags::TREATMENT_MACHINE_NAME, Effect::BlocksScope),
        machine_manufacturer: text(tags::MANUFACTURER, Effect::None),
        machine_model: text(tags::MANUFACTURER_MODEL_NAME, Effect::None),
        dosimeter_unit: text(tags::PRIMARY_DOSIMETER_UNIT, Effect::BlocksScope),
        delivery: text(tags::TREATMENT_DELIVERY_TYPE, Effect::BlocksScope)
            .map(|term| DeliveryType::from_term(&term)),
        number: item.integer(tags::BEAM_NUMBER, Effect::BlocksScope, notes),
        radiation,
        sad_cm: item.number(
            tags::SOURCE_AXIS_DISTANCE,
            length(Quantity::SourceAxisDistance, Effect::BlocksScope),
            notes,
        ),
        energy,
        devices: used,
        unused_devices: unused,
        wedges,
        blocks: read_blocks(item, notes),
        total_block_tray_factor: item.number(
            tags::TOTAL_BLOCK_TRAY_FACTOR,
            plain(Effect::None),
            notes,
        ),
        compensators: read_compensators(item, notes),
        applicators: read_applicators(item, notes),
        accessories: read_accessories(item, notes),
        boluses: read_boluses(item, notes),
        final_cumulative_weight: item.number(
            tags::FINAL_CUMULATIVE_METERSET_WEIGHT,
            plain(Effect::BlocksScope),
            notes,
        ),
        patient_setup_number: item.integer(
            tags::REFERENCED_PATIENT_SETUP_NUMBER,
            Effect::BlocksScope,
            notes,
        ),
        tolerance_table_number: item.integer(
            tags::REFERENCED_TOLERANCE_TABLE_NUMBER,
            Effect::None,
            notes,
        ),
        control_points,
    }
}

/// Energy of the first control point, and the fluence mode.
fn read_energy(item: &Node<'_, '_>, points: &[ControlPoint], notes: &mut Notes) -> BeamEnergy {
    let nominal = points
        .first()
        .map_or(Given::Absent, |point| point.energy.clone());
    let changes = points
        .iter()
        .any(|point| match (point.energy.value(), nominal.value()) {
            (Some(here), Some(first)) => (here - first).abs() > tolerance::ENERGY,
            (None, None) => false,
            _ => true,
        });
    let mut modes = Vec::new();
    for mode in item.items(
        tags::PRIMARY_FLUENCE_MODE_SEQUENCE,
        Effect::BlocksScope,
        notes,
    ) {
        modes.push((
            mode.text(tags::FLUENCE_MODE, Effect::BlocksScope, notes),
            mode.text(tags::FLUENCE_MODE_ID, Effect::BlocksScope, notes),
        ));
    }
    if modes.iter().any(|mode| Some(mode) != modes.first()) {
        item.note(
            notes,
            tags::PRIMARY_FLUENCE_MODE_SEQUENCE,
            NoteKind::Unsupported,
            Effect::BlocksScope,
            "the beam states several fluence modes",
        );
    }
    let (fluence_mode, fluence_mode_id) = modes.into_iter().next().unwrap_or_default();
    BeamEnergy {
        nominal,
        fluence_mode,
        fluence_mode_id,
        changes,
    }
}
