//! Control points: each reads what its item states and takes over, attribute
//! by attribute and device by device, what earlier ones stated. An unusable
//! value is never bridged by an earlier one.

use std::sync::Arc;

use dicom_core::Tag;
use dicom_dictionary_std::tags;

use super::device::pair_count;
use super::fraction::read_depth_set;
use super::node::{Node, Reading, Wanted, length, normalised_deg, plain, quantity};
use super::notes::Notes;
use crate::plan::{
    ControlPoint, DeviceKind, Effect, LeafAxis, LeafPositions, LimitingDevice, NoteKind,
    PointDepthPlace, RadiationType, ReferencedDose, Wedge, WedgePosition,
};
use crate::quantity::{Given, Quantity, tolerance};

/// What control points need of their beam.
pub(super) struct BeamFrame<'b> {
    pub(super) radiation: Option<&'b RadiationType>,
    pub(super) devices: &'b [LimitingDevice],
    pub(super) wedges: &'b [Wedge],
}

/// Apertures that were already complained about, so that an arc gives one note and not hundreds.
#[derive(Default)]
struct Told {
    jaws_x: bool,
    jaws_y: bool,
    leaves: bool,
}

/// All control points of a beam item.
pub(super) fn read_control_points(
    beam: &Node<'_, '_>,
    frame: &BeamFrame<'_>,
    notes: &mut Notes,
) -> Vec<ControlPoint> {
    let items = beam.items(tags::CONTROL_POINT_SEQUENCE, Effect::None, notes);
    let mut points: Vec<ControlPoint> = Vec::with_capacity(items.size_hint().0);
    let mut told = Told::default();
    let mut scratch = Vec::new();
    let first = ControlPoint::default();
    for item in items {
        let before = Before {
            point: points.last().unwrap_or(&first),
            index: points.len().wrapping_sub(1),
        };
        let point = read_point(&item, frame, &before, &mut scratch, &mut told, notes);
        points.push(point);
    }
    points
}

/// The control point before this one.
struct Before<'p> {
    point: &'p ControlPoint,
    index: usize,
}

impl Before<'_> {
    /// What stands here, or what stood before when nothing does.
    fn carry<T: Clone>(&self, here: Reading<T>, before: &Given<T>) -> Given<T> {
        match here {
            Reading::Value(value) => Given::stated(value),
            Reading::Unusable => Given::Absent,
            Reading::Nothing => match before {
                Given::Stated { value } => Given::Inherited {
                    value: value.clone(),
                    from_control_point: self.index,
                },
                other => other.clone(),
            },
        }
    }
}

const ANGLE: Wanted = quantity(Quantity::Angle, Effect::BlocksScope);
const COUCH: Wanted = length(Quantity::Coordinate, Effect::None);
const SSD: Wanted = length(Quantity::SourceSurfaceDistance, Effect::BlocksScope);
const POSITION: Wanted = length(Quantity::DevicePosition, Effect::BlocksScope);

fn read_point(
    item: &Node<'_, '_>,
    frame: &BeamFrame<'_>,
    before: &Before<'_>,
    scratch: &mut Vec<f64>,
    told: &mut Told,
    notes: &mut Notes,
) -> ControlPoint {
    let old = before.point;
    let energy = match frame.radiation {
        Some(RadiationType::Photon) => quantity(Quantity::PhotonEnergy, Effect::BlocksScope),
        Some(RadiationType::Electron) => quantity(Quantity::ElectronEnergy, Effect::BlocksScope),
        _ => plain(Effect::BlocksScope),
    };
    let mut number = |tag: Tag, wanted: Wanted, old: &Given<f64>| {
        before.carry(item.reading(tag, wanted, notes), old)
    };
    let eccentric_distance = length(Quantity::Coordinate, Effect::BlocksScope);
    let mut point = ControlPoint {
        energy: number(tags::NOMINAL_BEAM_ENERGY, energy, &old.energy),
        dose_rate_mu_per_min: number(
            tags::DOSE_RATE_SET,
            plain(Effect::None),
            &old.dose_rate_mu_per_min,
        ),
        gantry_pitch_deg: number(tags::GANTRY_PITCH_ANGLE, ANGLE, &old.gantry_pitch_deg),
        couch_deg: number(tags::PATIENT_SUPPORT_ANGLE, ANGLE, &old.couch_deg),
        eccentric_deg: number(tags::TABLE_TOP_ECCENTRIC_ANGLE, ANGLE, &old.eccentric_deg),
        eccentric_axis_distance_cm: number(
            tags::TABLE_TOP_ECCENTRIC_AXIS_DISTANCE,
            eccentric_distance,
            &old.eccentric_axis_distance_cm,
        ),
        couch_pitch_deg: number(tags::TABLE_TOP_PITCH_ANGLE, ANGLE, &old.couch_pitch_deg),
        couch_roll_deg: number(tags::TABLE_TOP_ROLL_ANGLE, ANGLE, &old.couch_roll_deg),
        couch_vertical_cm: number(
            tags::TABLE_TOP_VERTICAL_POSITION,
            COUCH,
            &old.couch_vertical_cm,
        ),
        couch_longitudinal_cm: number(
            tags::TABLE_TOP_LONGITUDINAL_POSITION,
            COUCH,
            &old.couch_longitudinal_cm,
        ),
        couch_lateral_cm: number(
            tags::TABLE_TOP_LATERAL_POSITION,
            COUCH,
            &old.couch_lateral_cm,
        ),
        ssd_cm: number(tags::SOURCE_TO_SURFACE_DISTANCE, SSD, &old.ssd_cm),
        source_to_external_contour_cm: number(
            tags::SOURCE_TO_EXTERNAL_CONTOUR_DISTANCE,
            length(Quantity::SourceSurfaceDistance, Effect::None),
            &old.source_to_external_contour_cm,
        ),
        ..ControlPoint::default()
    };
    let mut turned = |tag: Tag, old: &Given<f64>| {
        before.carry(item.reading(tag, ANGLE, notes).map(normalised_deg), old)
    };
    point.gantry_deg = turned(tags::GANTRY_ANGLE, &old.gantry_deg);
    point.collimator_deg = turned(tags::BEAM_LIMITING_DEVICE_ANGLE, &old.collimator_deg);
    let mut place = |tag: Tag, effect: Effect, old: &Given<_>| {
        before.carry(item.point_reading(tag, effect, notes), old)
    };
    point.isocentre = place(
        tags::ISOCENTER_POSITION,
        Effect::BlocksScope,
        &old.isocentre,
    );
    point.surface_entry = place(tags::SURFACE_ENTRY_POINT, Effect::None, &old.surface_entry);
    let mut term = |tag: Tag, old: &Given<String>| {
        let here = match item.text(tag, Effect::BlocksScope, notes).get() {
            Some(term) => Reading::Value(term),
            None => Reading::Nothing,
        };
        before.carry(here, old)
    };
    point.gantry_direction = term(tags::GANTRY_ROTATION_DIRECTION, &old.gantry_direction);
    point.collimator_direction = term(
        tags::BEAM_LIMITING_DEVICE_ROTATION_DIRECTION,
        &old.collimator_direction,
    );
    point.couch_direction = term(
        tags::PATIENT_SUPPORT_ROTATION_DIRECTION,
        &old.couch_direction,
    );
    point.index = item.integer(tags::CONTROL_POINT_INDEX, Effect::None, notes);
    point.cumulative_weight = item.number(
        tags::CUMULATIVE_METERSET_WEIGHT,
        plain(Effect::BlocksScope),
        notes,
    );
    read_positions(item, frame, before, &mut point, scratch, told, notes);
    point.wedges = read_wedge_positions(item, frame.wedges, before, notes);
    point.referenced_doses = read_referenced_doses(item, notes);
    point
}

/// Jaws and leaves of one control point.
fn read_positions(
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

fn read_wedge_positions(
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
    let Some(term) = position.text(tag, Effect::BlocksScope, notes).get() else {
        return Reading::Nothing;
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

fn read_referenced_doses(item: &Node<'_, '_>, notes: &mut Notes) -> Vec<ReferencedDose> {
    item.items(
        tags::REFERENCED_DOSE_REFERENCE_SEQUENCE,
        Effect::None,
        notes,
    )
    .map(|reference| ReferencedDose {
        number: reference.integer(tags::REFERENCED_DOSE_REFERENCE_NUMBER, Effect::None, notes),
        cumulative_coefficient: reference.number(
            tags::CUMULATIVE_DOSE_REFERENCE_COEFFICIENT,
            plain(Effect::None),
            notes,
        ),
        point_depth: read_depth_set(&reference, PointDepthPlace::ControlPoint, notes),
    })
    .collect()
}
