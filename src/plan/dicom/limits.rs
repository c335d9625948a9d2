//! Counts that no plan reaches: most are checked before the parts of a plan are
//! built, the product of groups and beams as soon as both are read. They keep a
//! damaged or hostile file from growing many times its size in memory, and from
//! costing work that grows with the square of its size.

use std::collections::HashMap;

use dicom_core::Tag;
use dicom_dictionary_std::tags;

use super::error::ReadError;
use super::name::named;
use super::tree::{DataSet, Value};
use crate::plan::{Beam, ControlPoint, FractionGroup};

/// Beams of a plan.
const MAX_BEAMS: usize = 1_000;
/// Control points of all beams together. Ten arcs have some 2,000.
const MAX_CONTROL_POINTS: usize = 20_000;
/// Items of one modifier sequence or device list.
const MAX_DEVICES: usize = 50;
/// Leaf positions, leaf boundaries and coordinates of outlines of all beams
/// together. Ten arcs of two banks of 80 pairs have some 600,000.
const MAX_POSITIONS: usize = 3_000_000;
/// Beams as all fraction groups refer to them: each makes a row of the report.
const MAX_REFERRED_BEAMS: usize = 2_000;
/// Control points and point depths of all of those.
const MAX_REFERRED_POINTS: usize = 100_000;
/// Leaf positions and coordinates of outlines of all of those, inherited ones too.
const MAX_REFERRED_POSITIONS: usize = 5_000_000;

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
    )?;
    check(
        "leaf positions and coordinates of outlines",
        tags::BEAM_SEQUENCE,
        items(set, tags::BEAM_SEQUENCE).iter().map(positions).sum(),
        MAX_POSITIONS,
    )
}

/// What one row of the report has to go through.
#[derive(Clone, Copy, Debug, Default)]
struct Load {
    rows: usize,
    points: usize,
    positions: usize,
}

impl Load {
    fn of_beam(beam: &Beam) -> Self {
        let of_leaves = |point: &ControlPoint| -> usize {
            let banks = point.leaves.iter();
            banks
                .filter_map(|bank| bank.positions_cm.value())
                .map(|positions_cm| positions_cm.len())
                .sum()
        };
        let outlines = beam.blocks.iter().filter_map(|block| {
            let outline_cm = block.outline_cm.value()?;
            Some(2 * outline_cm.len())
        });
        let points = &beam.control_points;
        Self {
            rows: 1,
            points: points
                .iter()
                .map(|point| 1 + point.referenced_doses.len())
                .sum(),
            positions: points.iter().map(of_leaves).sum::<usize>() + outlines.sum::<usize>(),
        }
    }

    fn add(&mut self, other: Self) {
        self.rows += other.rows;
        self.points += other.points;
        self.positions += other.positions;
    }
}

/// Refuses fraction groups that refer to beams so often that the work would
/// have no end: a number that stands twice counts for every beam that bears it.
pub(super) fn check_references(groups: &[FractionGroup], beams: &[Beam]) -> Result<(), ReadError> {
    let mut of_number: HashMap<i32, Load> = HashMap::new();
    for beam in beams {
        if let Some(&number) = beam.number.value() {
            let of_beam = Load::of_beam(beam);
            of_number.entry(number).or_default().add(of_beam);
        }
    }
    let mut all = Load::default();
    for reference in groups.iter().flat_map(|group| &group.beams) {
        let number = reference.beam_number.value();
        let mut load = number
            .and_then(|number| of_number.get(number).copied())
            .unwrap_or_default();
        // A reference that leads to no beam is a row of the findings.
        load.rows = load.rows.max(1);
        load.points += load.rows * reference.point_depths.len();
        all.add(load);
    }
    let tag = tags::REFERENCED_BEAM_SEQUENCE;
    for (what, found, limit) in [
        ("references to beams", all.rows, MAX_REFERRED_BEAMS),
        (
            "control points and point depths of beams as referred to",
            all.points,
            MAX_REFERRED_POINTS,
        ),
        (
            "leaf positions and coordinates of outlines of beams as referred to",
            all.positions,
            MAX_REFERRED_POSITIONS,
        ),
    ] {
        check(what, tag, found, limit)?;
    }
    Ok(())
}

/// Values of a beam's leaf and outline attributes, by their separators.
fn positions(beam: &DataSet<'_>) -> usize {
    beam.elements
        .iter()
        .map(|element| match &element.value {
            Value::Items(items) => items.iter().map(positions).sum(),
            Value::Bytes(bytes) => match element.tag {
                tags::LEAF_POSITION_BOUNDARIES | tags::LEAF_JAW_POSITIONS | tags::BLOCK_DATA => {
                    1 + bytes.iter().filter(|&&byte| byte == b'\\').count()
                }
                _ => 0,
            },
        })
        .sum()
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
