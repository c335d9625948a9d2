//! Control points: each reads what its item states and takes over, attribute
//! by attribute, what earlier ones stated. An unusable value is never bridged
//! by an earlier one. Jaws, leaves and wedges, which inherit device by device,
//! are left to `aperture` and `wedge_position`.

use dicom_core::Tag;
use dicom_dictionary_std::tags;

use super::aperture::{Told, read_positions};
use super::fraction::read_depth_set;
use super::inherit::{BeamFrame, Before};
use super::node::{Node, Wanted, length, normalised_deg, plain, quantity};
use super::notes::Notes;
use super::wedge_position::read_wedge_positions;
use crate::plan::{ControlPoint, Effect, PointDepthPlace, RadiationType, ReferencedDose};
use crate::quantity::{Given, Quantity};

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

const ANGLE: Wanted = quantity(Quantity::Angle, Effect::BlocksScope);
const COUCH: Wanted = length(Quantity::Coordinate, Effect::None);
const SSD: Wanted = length(Quantity::SourceSurfaceDistance, Effect::BlocksScope);

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
        before.carry(item.text_reading(tag, Effect::BlocksScope, notes), old)
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
