//! What a treatment beam must have before anything can be calculated: the
//! values without which there is no calculation, and meterset weights that
//! make sense. Whether the calculation covers the beam is not asked here.

use dicom_core::Tag;
use dicom_dictionary_std::tags;

use super::node::Node;
use super::notes::Notes;
use crate::plan::{Beam, DeliveryType, Effect, NoteKind, RadiationType};
use crate::quantity::tolerance;

/// Notes what a treatment beam lacks or contradicts.
pub(super) fn check_beam(item: &Node<'_, '_>, beam: &Beam, notes: &mut Notes) {
    let photon = beam.radiation.value() == Some(&RadiationType::Photon);
    let blocking: [(bool, Tag, &str); 4] = [
        (
            beam.number.is_absent(),
            tags::BEAM_NUMBER,
            "the beam has no usable number, so no meterset can be joined to it",
        ),
        (
            beam.machine.is_absent(),
            tags::TREATMENT_MACHINE_NAME,
            "no treatment machine is named, so no beam model can be chosen",
        ),
        (
            beam.radiation.is_absent(),
            tags::RADIATION_TYPE,
            "the radiation type is not stated",
        ),
        (
            photon && beam.sad_cm.is_absent(),
            tags::SOURCE_AXIS_DISTANCE,
            "the source-axis distance is not stated",
        ),
    ];
    for (missing, tag, message) in blocking {
        if missing {
            item.note(
                notes,
                tag,
                NoteKind::MissingValue,
                Effect::BlocksScope,
                message,
            );
        }
    }
    check_terms(item, beam, notes);
    check_points(item, beam, notes);
    check_indices(item, beam, notes);
    check_wedge_numbers(item, beam, notes);
    check_weights(item, beam, notes);
}

fn check_terms(item: &Node<'_, '_>, beam: &Beam, notes: &mut Notes) {
    let tag = tags::PRIMARY_DOSIMETER_UNIT;
    match beam.dosimeter_unit.value().map(String::as_str) {
        Some("MU") => {}
        Some(unit) => item.note_values(
            notes,
            tag,
            NoteKind::Unsupported,
            Effect::BlocksScope,
            format!("the meterset is in {unit}, not in MU"),
            (Some(unit.to_owned()), Some("MU".to_owned())),
        ),
        None => item.note(
            notes,
            tag,
            NoteKind::MissingValue,
            Effect::None,
            "the unit of the meterset is not stated; it is read as MU",
        ),
    }
    if let Some(DeliveryType::Other(term)) = beam.delivery.value() {
        item.note_values(
            notes,
            tags::TREATMENT_DELIVERY_TYPE,
            NoteKind::Remark,
            Effect::None,
            format!("unknown delivery type '{term}'; the beam counts as treatment"),
            (Some(term.clone()), None),
        );
    }
    let photon = beam.radiation.value() == Some(&RadiationType::Photon);
    if photon && beam.energy.fluence_mode.is_absent() {
        item.note(
            notes,
            tags::PRIMARY_FLUENCE_MODE_SEQUENCE,
            NoteKind::Remark,
            Effect::None,
            "the fluence mode is not stated; the beam is taken as one with a flattening filter",
        );
    }
    let unplaced: Vec<&str> = beam
        .devices
        .iter()
        .filter(|device| device.source_distance_cm.is_absent())
        .map(|device| device.kind.term())
        .collect();
    if !unplaced.is_empty() {
        item.note(
            notes,
            tags::BEAM_LIMITING_DEVICE_SEQUENCE,
            NoteKind::Remark,
            Effect::None,
            format!(
                "the distance from the source is not stated for {}",
                unplaced.join(", ")
            ),
        );
    }
    if beam.energy.changes {
        item.note(
            notes,
            tags::CONTROL_POINT_SEQUENCE,
            NoteKind::Unsupported,
            Effect::BlocksScope,
            "the energy changes between control points",
        );
    }
}

fn check_points(item: &Node<'_, '_>, beam: &Beam, notes: &mut Notes) {
    let sequence = tags::CONTROL_POINT_SEQUENCE;
    let mut missing = |tag: Tag, effect: Effect, message: &str| {
        item.note(notes, tag, NoteKind::MissingValue, effect, message);
    };
    let Some(first) = beam.control_points.first() else {
        missing(
            sequence,
            Effect::BlocksScope,
            "the beam has no control points",
        );
        return;
    };
    let angles = [
        (&first.energy, tags::NOMINAL_BEAM_ENERGY, "energy"),
        (&first.gantry_deg, tags::GANTRY_ANGLE, "gantry angle"),
        (
            &first.collimator_deg,
            tags::BEAM_LIMITING_DEVICE_ANGLE,
            "collimator angle",
        ),
        (&first.couch_deg, tags::PATIENT_SUPPORT_ANGLE, "couch angle"),
    ];
    for (value, tag, name) in angles {
        if value.is_absent() {
            let message = format!("the first control point states no usable {name}");
            missing(tag, Effect::BlocksScope, &message);
        }
    }
    if first.isocentre.is_absent() {
        missing(
            tags::ISOCENTER_POSITION,
            Effect::None,
            "the first control point states no usable isocentre",
        );
    }
    let photon = beam.radiation.value() == Some(&RadiationType::Photon);
    let open = first.jaws_x_cm.is_absent()
        && first.jaws_y_cm.is_absent()
        && first
            .leaves
            .iter()
            .all(|bank| bank.positions_cm.is_absent());
    if photon && open {
        missing(
            tags::BEAM_LIMITING_DEVICE_POSITION_SEQUENCE,
            Effect::BlocksScope,
            "the first control point positions neither jaws nor leaves",
        );
    }
}

/// Indices count the control points in the order of the items, which is the
/// order that inheritance goes by; a count from 1 changes nothing.
fn check_indices(item: &Node<'_, '_>, beam: &Beam, notes: &mut Notes) {
    let start = beam
        .control_points
        .first()
        .and_then(|point| point.index.get());
    let Some(start) = start else {
        return;
    };
    let odd = (i64::from(start)..)
        .zip(&beam.control_points)
        .enumerate()
        .find(|(_, (expected, point))| {
            point
                .index
                .get()
                .is_some_and(|index| i64::from(index) != *expected)
        });
    if let Some((position, (expected, point))) = odd {
        item.note_values(
            notes,
            tags::CONTROL_POINT_SEQUENCE,
            NoteKind::CountMismatch,
            Effect::BlocksScope,
            format!(
                "the indices of the control points do not follow the order of the items, first at item {position} (from 0): what each takes over from the one before is not certain"
            ),
            (
                point.index.get().map(|index| index.to_string()),
                Some(expected.to_string()),
            ),
        );
    }
}

/// Wedge positions refer to wedges by number.
fn check_wedge_numbers(item: &Node<'_, '_>, beam: &Beam, notes: &mut Notes) {
    let mut rest = beam.wedges.as_slice();
    while let [wedge, others @ ..] = rest {
        if let Some(number) = wedge.number.value()
            && others.iter().any(|other| other.number == wedge.number)
        {
            item.note_values(
                notes,
                tags::WEDGE_SEQUENCE,
                NoteKind::RepeatedNumber,
                Effect::BlocksScope,
                format!("wedge number {number} stands more than once in the beam"),
                (Some(number.to_string()), None),
            );
        }
        rest = others;
    }
}

/// Weights start at 0, never fall, and end at the final weight, which is above 0.
fn check_weights(item: &Node<'_, '_>, beam: &Beam, notes: &mut Notes) {
    let mut fault = |tag: Tag, message: String, measured: Option<f64>, limit: Option<f64>| {
        let values = (
            measured.map(|value| value.to_string()),
            limit.map(|value| value.to_string()),
        );
        let kind = NoteKind::MetersetWeights;
        item.note_values(notes, tag, kind, Effect::BlocksScope, message, values);
    };
    let final_tag = tags::FINAL_CUMULATIVE_METERSET_WEIGHT;
    let end = match beam.final_cumulative_weight.get() {
        Some(end) if end > 0.0 => end,
        other => {
            let message = "the final cumulative meterset weight is absent, zero or negative";
            fault(final_tag, message.to_owned(), other, None);
            return;
        }
    };
    let tag = tags::CUMULATIVE_METERSET_WEIGHT;
    let slack = tolerance::METERSET_WEIGHT_RELATIVE * end;
    let mut highest: Option<f64> = None;
    for (index, point) in beam.control_points.iter().enumerate() {
        let Some(weight) = point.cumulative_weight.get() else {
            let message = format!("control point {index} (from 0) has no meterset weight");
            fault(tag, message, None, None);
            return;
        };
        match highest {
            None if weight.abs() > slack => {
                let message = "the first meterset weight is not 0".to_owned();
                fault(tag, message, Some(weight), Some(0.0));
                return;
            }
            Some(before) if weight < before - slack => {
                let message =
                    format!("the meterset weights fall at control point {index} (from 0)");
                fault(tag, message, Some(weight), Some(before));
                return;
            }
            _ => highest = Some(highest.map_or(weight, |before| before.max(weight))),
        }
    }
    let last = beam
        .control_points
        .last()
        .and_then(|point| point.cumulative_weight.get());
    if let Some(last) = last
        && (last - end).abs() > slack
    {
        let message = "the last meterset weight is not the final one".to_owned();
        fault(tag, message, Some(last), Some(end));
    }
}
