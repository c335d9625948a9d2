//! The opening of a beam: jaws, leaves, whether the leaves cut into the jaw
//! opening, the equivalent squares, and what the beam's-eye view draws. How an
//! irregular opening changes the dose is not worked out here.

use std::sync::Arc;

use super::delivery::Interval;
use super::{BeamView, BlockOutline, LastAperture, LeafOpening, RayPoint};
use crate::beam_model::JawAxis;
use crate::plan::{Beam, BlockType, ControlPoint, LeafAxis, LeafPositions};
use crate::quantity::{PointSquare, sterling_side_cm, tolerance};

/// What the leaves do to the jaw opening.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Leaves {
    /// There are none, or all of them stand outside the jaw opening.
    Outside,
    /// They cut into it, or close an axis that has no jaws.
    Cut,
    /// Their positions or boundaries are not known.
    Unknown,
}

/// What the leaves do at one control point.
pub(super) fn leaves_at(beam: &Beam, point: &ControlPoint) -> Leaves {
    let unplaced = beam.devices.iter().any(|device| {
        device.kind.leaf_axis().is_some()
            && !point.leaves.iter().any(|bank| bank.kind == device.kind)
    });
    if unplaced {
        return Leaves::Unknown;
    }
    let mut answer = Leaves::Outside;
    for bank in &point.leaves {
        let Some(pairs) = leaf_pairs(beam, bank) else {
            return Leaves::Unknown;
        };
        let (Some(jaws_x), Some(jaws_y)) = (point.jaws_x_cm.get(), point.jaws_y_cm.get()) else {
            answer = Leaves::Cut;
            continue;
        };
        if cuts(&pairs, bank.kind.leaf_axis(), jaws_x, jaws_y) {
            answer = Leaves::Cut;
        }
    }
    answer
}

fn cuts(pairs: &[LeafOpening], axis: Option<LeafAxis>, jaws_x: [f64; 2], jaws_y: [f64; 2]) -> bool {
    let tol = tolerance::POSITION_CM;
    // Seen along the leaves: the opening between a pair, and the pair's own width.
    let (along, across) = match axis {
        Some(LeafAxis::Y) => (jaws_y, jaws_x),
        _ => (jaws_x, jaws_y),
    };
    let ends = |pair: &LeafOpening| match axis {
        Some(LeafAxis::Y) => ([pair.y1_cm, pair.y2_cm], [pair.x1_cm, pair.x2_cm]),
        _ => ([pair.x1_cm, pair.x2_cm], [pair.y1_cm, pair.y2_cm]),
    };
    let least = pairs
        .iter()
        .map(|pair| ends(pair).1[0])
        .fold(f64::INFINITY, f64::min);
    let greatest = pairs
        .iter()
        .map(|pair| ends(pair).1[1])
        .fold(f64::NEG_INFINITY, f64::max);
    // Beyond the outermost leaves it is not known what shields.
    if across[0] < least - tol || across[1] > greatest + tol {
        return true;
    }
    pairs.iter().any(|pair| {
        let (gap, width) = ends(pair);
        let in_opening = width[0] < across[1] - tol && width[1] > across[0] + tol;
        in_opening && (gap[0] > along[0] + tol || gap[1] < along[1] - tol)
    })
}

/// The pairs of a bank, closed ones too (with no or negative opening); `None`
/// when positions and boundaries are not there or do not fit together.
fn leaf_pairs(beam: &Beam, bank: &LeafPositions) -> Option<Vec<LeafOpening>> {
    let axis = bank.kind.leaf_axis()?;
    let device = beam
        .devices
        .iter()
        .find(|device| device.kind == bank.kind)?;
    let boundaries = device.boundaries_cm.value()?;
    let positions: &Arc<[f64]> = bank.positions_cm.value()?;
    let count = boundaries.len().checked_sub(1)?;
    if count == 0 || positions.len() != 2 * count {
        return None;
    }
    let (lower, upper) = positions.split_at_checked(count)?;
    let widths = boundaries.iter().zip(boundaries.iter().skip(1));
    Some(
        widths
            .zip(lower.iter().zip(upper))
            .map(|((&b1, &b2), (&p1, &p2))| match axis {
                LeafAxis::X => LeafOpening {
                    x1_cm: p1,
                    x2_cm: p2,
                    y1_cm: b1,
                    y2_cm: b2,
                },
                LeafAxis::Y => LeafOpening {
                    x1_cm: b1,
                    x2_cm: b2,
                    y1_cm: p1,
                    y2_cm: p2,
                },
            })
            .collect(),
    )
}

fn open_pairs(beam: &Beam, bank: &LeafPositions) -> Vec<LeafOpening> {
    let mut pairs = leaf_pairs(beam, bank).unwrap_or_default();
    pairs.retain(|pair| {
        pair.x2_cm - pair.x1_cm > tolerance::POSITION_CM
            && pair.y2_cm - pair.y1_cm > tolerance::POSITION_CM
    });
    pairs
}

/// What the beam's-eye view draws, from the control point where dose begins and the one where it ends; the
/// dose point is added by the caller.
pub(super) fn view_between(beam: &Beam, first: &ControlPoint, last: &ControlPoint) -> BeamView {
    let begins = aperture_at(beam, first);
    let ends = aperture_at(beam, last);
    BeamView {
        last: differs(&begins, &ends).then_some(ends),
        jaws_x_cm: begins.jaws_x_cm,
        jaws_y_cm: begins.jaws_y_cm,
        leaf_banks: begins.leaf_banks,
        blocks: beam
            .blocks
            .iter()
            .filter_map(|block| {
                Some(BlockOutline {
                    outline_cm: block.outline_cm.get()?,
                    shields_inside: block.block_type.value() != Some(&BlockType::Aperture),
                })
            })
            .collect(),
        point_cm: None,
    }
}

fn aperture_at(beam: &Beam, point: &ControlPoint) -> LastAperture {
    LastAperture {
        jaws_x_cm: point.jaws_x_cm.get(),
        jaws_y_cm: point.jaws_y_cm.get(),
        leaf_banks: point
            .leaves
            .iter()
            .map(|bank| open_pairs(beam, bank))
            .collect(),
    }
}

/// Whether two apertures differ by more than the rounding of positions.
fn differs(one: &LastAperture, other: &LastAperture) -> bool {
    let apart = |a: f64, b: f64| (a - b).abs() > tolerance::POSITION_CM;
    let jaws = |a: Option<[f64; 2]>, b: Option<[f64; 2]>| match (a, b) {
        (Some(a), Some(b)) => a.into_iter().zip(b).any(|(a, b)| apart(a, b)),
        (None, None) => false,
        _ => true,
    };
    let leaf = |a: &LeafOpening, b: &LeafOpening| {
        apart(a.x1_cm, b.x1_cm)
            || apart(a.x2_cm, b.x2_cm)
            || apart(a.y1_cm, b.y1_cm)
            || apart(a.y2_cm, b.y2_cm)
    };
    let bank = |a: &Vec<LeafOpening>, b: &Vec<LeafOpening>| {
        a.len() != b.len() || a.iter().zip(b).any(|(a, b)| leaf(a, b))
    };
    let banks = one.leaf_banks.iter().zip(&other.leaf_banks);
    jaws(one.jaws_x_cm, other.jaws_x_cm)
        || jaws(one.jaws_y_cm, other.jaws_y_cm)
        || one.leaf_banks.len() != other.leaf_banks.len()
        || banks.into_iter().any(|(a, b)| bank(a, b))
}

/// Openings along x and y at the isocentre plane, cm: of the jaws, or of the
/// leaves on an axis that has no jaws; the mean over the meterset when they move.
pub(super) fn mean_openings(beam: &Beam, intervals: &[Interval<'_>]) -> [Option<f64>; 2] {
    [JawAxis::X, JawAxis::Y].map(|axis| {
        let mut sum = 0.0;
        let mut weights = 0.0;
        for interval in intervals {
            let start = opening_at(beam, interval.start, axis)?;
            let end = opening_at(beam, interval.end, axis)?;
            sum += interval.weight * 0.5 * (start + end);
            weights += interval.weight;
        }
        if weights > 0.0 {
            return Some(sum / weights);
        }
        opening_at(beam, beam.control_points.first()?, axis)
    })
}

fn opening_at(beam: &Beam, point: &ControlPoint, axis: JawAxis) -> Option<f64> {
    let jaws = match axis {
        JawAxis::X => &point.jaws_x_cm,
        JawAxis::Y => &point.jaws_y_cm,
    };
    if let Some([lower, upper]) = jaws.get() {
        return Some(upper - lower);
    }
    point
        .leaves
        .iter()
        .filter_map(|bank| {
            let pairs = open_pairs(beam, bank);
            let sides = pairs.iter().map(|pair| match axis {
                JawAxis::X => (pair.x1_cm, pair.x2_cm),
                JawAxis::Y => (pair.y1_cm, pair.y2_cm),
            });
            let (least, greatest) = sides.fold(
                (f64::INFINITY, f64::NEG_INFINITY),
                |(least, greatest), (lower, upper)| (least.min(lower), greatest.max(upper)),
            );
            (greatest > least).then_some(greatest - least)
        })
        .reduce(f64::min)
}

/// Square equivalent to a jaw opening for phantom scatter at the point's plane:
/// the opening projected there, then 2ab/(a+b) (Sterling, Perry & Katz 1964).
#[must_use]
pub fn point_square(x_cm: f64, y_cm: f64, ray: RayPoint) -> PointSquare {
    PointSquare::new(sterling_side_cm(x_cm * ray.scale(), y_cm * ray.scale()))
}
