//! Counts that no plan reaches, checked before the parts of a plan are built:
//! they keep a damaged or hostile file from growing many times its size in
//! memory.

use dicom_core::Tag;
use dicom_dictionary_std::tags;

use super::error::ReadError;
use super::name::named;
use super::tree::{DataSet, Value};

/// Beams of a plan.
const MAX_BEAMS: usize = 1_000;
/// Control points of all beams together. Ten arcs have some 2,000.
const MAX_CONTROL_POINTS: usize = 20_000;
/// Items of one modifier sequence or device list.
const MAX_DEVICES: usize = 50;

/// Refuses a data set with more of something than any plan has.
pub(super) fn check_limits(set: &DataSet<'_>) -> Result<(), ReadError> {
    check(
        "beams",
        tags::BEAM_SEQUENCE,
        items(set, tags::BEAM_SEQUENCE).len(),
        MAX_BEAMS,
    )?;
    let mut points = 0;
    for beam in items(set, tags::BEAM_SEQUENCE) {
        for tag in [
            tags::BEAM_LIMITING_DEVICE_SEQUENCE,
            tags::WEDGE_SEQUENCE,
            tags::BLOCK_SEQUENCE,
        ] {
            check(
                "devices in one beam",
                tag,
                items(beam, tag).len(),
                MAX_DEVICES,
            )?;
        }
        points += items(beam, tags::CONTROL_POINT_SEQUENCE).len();
    }
    check(
        "control points",
        tags::CONTROL_POINT_SEQUENCE,
        points,
        MAX_CONTROL_POINTS,
    )
}

fn items<'n, 'a>(set: &'n DataSet<'a>, tag: Tag) -> &'n [DataSet<'a>] {
    match set.first(tag).map(|element| &element.value) {
        Some(Value::Items(items)) => items,
        _ => &[],
    }
}

fn check(what: &'static str, tag: Tag, found: usize, limit: usize) -> Result<(), ReadError> {
    if found <= limit {
        return Ok(());
    }
    Err(ReadError::TooManyParts {
        what,
        place: named(tag),
        limit,
    })
}
