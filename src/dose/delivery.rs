//! Where meterset accrues: the intervals between control points that deliver
//! dose, and what stays the same over them. Moves without dose (repeated
//! weights) are not motion. What the motion is called is the work of `technique`.

use std::sync::Arc;

use crate::plan::{Beam, ControlPoint};
use crate::quantity::{Given, Point, tolerance};

/// An interval between two successive control points in which meterset accrues.
#[derive(Clone, Copy)]
pub(super) struct Interval<'a> {
    /// Item index of the control point at its start.
    pub(super) start_index: usize,
    /// At its start.
    pub(super) start: &'a ControlPoint,
    /// At its end.
    pub(super) end: &'a ControlPoint,
    /// Weight that accrues, in the units of the final weight; 1 when not stated.
    pub(super) weight: f64,
}

/// The intervals that deliver dose. One whose weights are not stated counts as
/// delivering: motion in it must not be overlooked.
pub(super) fn intervals(beam: &Beam) -> Vec<Interval<'_>> {
    let last = beam
        .control_points
        .last()
        .and_then(|point| point.cumulative_weight.get());
    let final_weight = beam
        .final_cumulative_weight
        .get()
        .or(last)
        .map_or(1.0, f64::abs);
    let starts = beam.control_points.iter();
    let ends = beam.control_points.iter().skip(1);
    starts
        .zip(ends)
        .enumerate()
        .filter_map(|(start_index, (start, end))| {
            let weights = (start.cumulative_weight.get(), end.cumulative_weight.get());
            let weight = match weights {
                (Some(before), Some(after)) => (after - before).abs(),
                _ => 1.0,
            };
            let accrues = weights_missing(weights)
                || weight > tolerance::METERSET_WEIGHT_RELATIVE * final_weight;
            accrues.then_some(Interval {
                start_index,
                start,
                end,
                weight,
            })
        })
        .collect()
}

const fn weights_missing(weights: (Option<f64>, Option<f64>)) -> bool {
    !matches!(weights, (Some(_), Some(_)))
}

/// The control points at which dose is delivered: both ends of every interval, in order.
pub(super) fn delivering_points<'a>(intervals: &[Interval<'a>]) -> Vec<&'a ControlPoint> {
    intervals
        .iter()
        .flat_map(|interval| [interval.start, interval.end])
        .collect()
}

/// Whether two angles (any turn) are the same, an absent one equal to an absent one only.
pub(super) fn same_angle(a: &Given<f64>, b: &Given<f64>) -> bool {
    match (a.value(), b.value()) {
        (Some(a), Some(b)) => turn_between_deg(*a, *b) <= tolerance::ANGLE_DEG,
        (None, None) => true,
        _ => false,
    }
}

/// The smaller turn between two angles, degrees, 0 to 180.
pub(super) fn turn_between_deg(a_deg: f64, b_deg: f64) -> f64 {
    let turn = (a_deg - b_deg).rem_euclid(360.0);
    turn.min(360.0 - turn)
}

/// Whether two points are the same.
pub(super) fn same_point(
    a: &Given<Point<crate::quantity::Patient>>,
    b: &Given<Point<crate::quantity::Patient>>,
) -> bool {
    match (a.value(), b.value()) {
        (Some(a), Some(b)) => a.distance_cm(*b) <= tolerance::POSITION_CM,
        (None, None) => true,
        _ => false,
    }
}

/// Whether jaws and leaves stand the same.
pub(super) fn same_aperture(a: &ControlPoint, b: &ControlPoint) -> bool {
    same_jaws(&a.jaws_x_cm, &b.jaws_x_cm)
        && same_jaws(&a.jaws_y_cm, &b.jaws_y_cm)
        && a.leaves.len() == b.leaves.len()
        && a.leaves.iter().zip(&b.leaves).all(|(a, b)| {
            match (a.positions_cm.value(), b.positions_cm.value()) {
                (Some(a), Some(b)) => {
                    Arc::ptr_eq(a, b)
                        || (a.len() == b.len()
                            && a.iter().zip(b.iter()).all(|(a, b)| same_place(*a, *b)))
                }
                (None, None) => true,
                _ => false,
            }
        })
}

fn same_jaws(a: &Given<[f64; 2]>, b: &Given<[f64; 2]>) -> bool {
    match (a.value(), b.value()) {
        (Some([a1, a2]), Some([b1, b2])) => same_place(*a1, *b1) && same_place(*a2, *b2),
        (None, None) => true,
        _ => false,
    }
}

fn same_place(a_cm: f64, b_cm: f64) -> bool {
    (a_cm - b_cm).abs() <= tolerance::POSITION_CM
}

#[cfg(test)]
mod tests {
    use super::{intervals, turn_between_deg};
    use crate::plan::{Beam, ControlPoint};
    use crate::quantity::Given;

    fn beam(weights: &[Option<f64>]) -> Beam {
        Beam {
            control_points: weights
                .iter()
                .map(|weight| ControlPoint {
                    cumulative_weight: weight.map_or(Given::Absent, Given::stated),
                    ..ControlPoint::default()
                })
                .collect(),
            ..Beam::default()
        }
    }

    #[test]
    fn verify_turns_go_the_short_way() {
        assert!((turn_between_deg(359.0, 1.0) - 2.0).abs() < 1e-12);
        assert!((turn_between_deg(-90.0, 270.0)).abs() < 1e-12);
        assert!((turn_between_deg(0.0, 180.0) - 180.0).abs() < 1e-12);
    }

    #[test]
    fn verify_intervals_that_deliver() {
        let count = |weights: &[Option<f64>]| intervals(&beam(weights)).len();
        assert_eq!(
            count(&[Some(0.0), Some(0.0), Some(50.0), Some(50.0), Some(100.0)]),
            2
        );
        assert_eq!(count(&[Some(0.0), Some(0.0)]), 0);
        assert_eq!(count(&[Some(0.0)]), 0);
        // Not stated: counts as delivering.
        assert_eq!(count(&[None, None, None]), 2);
    }
}
