//! The depth of the point while the gantry turns: at every control point that
//! delivers dose, from the plan's point depths there or from an SSD that is stated
//! there. One depth or one SSD for a whole arc is never used. What lies between
//! two control points is interpolated.

use super::super::delivery::Interval;
use super::super::depth_question::{DepthFindings, DepthQuestion};
use super::super::placement::BeamGeometry;
use super::super::plan_depth::belongs;
use super::super::{DepthBasis, DepthCandidate, RayPoint};
use super::moments::{Moment, signed_turn_deg};
use crate::plan::ControlPoint;
use crate::quantity::Given;

/// A depth that is stated at two control points is interpolated over no more than this, degrees (an own choice: on a
/// cylinder of 15 cm around a point 5 cm from its middle the error is below 2 mm).
const GREATEST_TURN_DEG: f64 = 15.0;

/// Depth at one place of the beam, cm.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(in crate::dose) struct DepthAt {
    /// Radiological, along the ray.
    pub(in crate::dose) effective_cm: f64,
    /// Geometric, perpendicular to a flat surface.
    pub(in crate::dose) perpendicular_cm: Option<f64>,
}

/// The depth all through a beam.
#[derive(Clone, Debug, PartialEq)]
pub(in crate::dose) enum DepthTrack {
    /// The same for the whole beam.
    Same(DepthAt),
    /// At control points, by item index; `None` where no dose is delivered.
    AtPoints(Vec<Option<DepthAt>>),
}

impl DepthTrack {
    /// One depth for the whole beam.
    pub(in crate::dose) const fn of(candidate: &DepthCandidate) -> Self {
        Self::Same(DepthAt {
            effective_cm: candidate.effective_cm,
            perpendicular_cm: candidate.perpendicular_cm,
        })
    }

    /// The depth at a moment.
    pub(super) fn at(&self, moment: &Moment<'_>) -> Option<DepthAt> {
        match self {
            Self::Same(depth) => Some(*depth),
            Self::AtPoints(depths) => {
                let at = |index: usize| depths.get(index).copied().flatten();
                let (start, end) = (at(moment.start_index)?, at(moment.start_index + 1)?);
                let share = moment.between.share;
                let mix = |a: f64, b: f64| a + (b - a) * share;
                Some(DepthAt {
                    effective_cm: mix(start.effective_cm, end.effective_cm),
                    perpendicular_cm: start
                        .perpendicular_cm
                        .zip(end.perpendicular_cm)
                        .map(|(a, b)| mix(a, b)),
                })
            }
        }
    }
}

/// A depth with the SSD that goes with it, cm.
type WithSsd = (DepthAt, Option<f64>);

/// By control point.
type Found = Vec<Option<WithSsd>>;

/// The depths of an arc on every basis that gives them at each control point that delivers dose, and the
/// track of the best one. The candidates hold means over the meterset.
pub(in crate::dose) fn track_depths(
    question: &DepthQuestion<'_>,
    geometry: Option<&BeamGeometry>,
    delivered: &[Interval<'_>],
) -> (DepthFindings, Option<DepthTrack>) {
    let mut findings = DepthFindings::default();
    let mut track = None;
    let Some(geometry) = geometry else {
        return (findings, track);
    };
    let weights = weights_of_points(question.beam.control_points.len(), delivered);
    let ray_at = |point: &ControlPoint| geometry.ray_at(point.gantry_deg.get()?);
    let by_plan = |point: &ControlPoint| plan_depth(question, point, ray_at(point)?);
    let by_ssd = |point: &ControlPoint| ssd_depth(point, ray_at(point)?);
    let mut missing = Vec::new();
    for (basis, depth_of, what) in [
        (
            DepthBasis::Plan,
            &by_plan as &dyn Fn(&ControlPoint) -> Option<WithSsd>,
            "point depths",
        ),
        (
            DepthBasis::Ssd,
            &by_ssd,
            "Source to Surface Distance (300A,0130)",
        ),
    ] {
        let points = question.beam.control_points.iter().zip(&weights);
        let found: Found = points
            .map(|(point, &weight)| depth_of(point).filter(|_| weight > 0.0))
            .collect();
        let delivering = weights.iter().filter(|&&weight| weight > 0.0).count();
        let there = found.iter().flatten().count();
        if there < delivering {
            missing.push(format!("{what} at {there} of {delivering}"));
            continue;
        }
        if findings.candidates.is_empty() {
            track = Some(DepthTrack::AtPoints(
                found
                    .iter()
                    .map(|depth| depth.map(|(depth, _)| depth))
                    .collect(),
            ));
        }
        findings.take(mean_candidate(basis, what, &found, &weights));
    }
    if findings.candidates.is_empty() {
        track = None;
        findings.object(format!(
            "the depth of the point is not known while the gantry turns: of the control points that deliver dose the plan states {}; one value does not hold for a whole arc",
            missing.join(" and ")
        ));
    }
    let turn_deg = delivered
        .iter()
        .map(|interval| signed_turn_deg(interval).abs())
        .fold(0.0, f64::max);
    if turn_deg > GREATEST_TURN_DEG && !findings.candidates.is_empty() {
        findings.object(format!(
            "the gantry turns by {turn_deg:.1} degrees between two control points: a depth interpolated over more than {GREATEST_TURN_DEG} degrees would be a guess"
        ));
    }
    if question.row.is_some() {
        findings
            .remarks
            .push("the depth table has one depth for the whole arc, which is not used".to_owned());
    }
    (findings, track)
}

/// Share of the meterset for which a control point stands: half of each interval that it bounds.
fn weights_of_points(count: usize, delivered: &[Interval<'_>]) -> Vec<f64> {
    let mut weights = vec![0.0; count];
    let total: f64 = delivered.iter().map(|interval| interval.weight).sum();
    for interval in delivered {
        for index in [interval.start_index, interval.start_index + 1] {
            if let Some(weight) = weights.get_mut(index) {
                *weight += 0.5 * interval.weight / total;
            }
        }
    }
    weights
}

/// From the point's depth attributes that stand at this control point.
fn plan_depth(
    question: &DepthQuestion<'_>,
    point: &ControlPoint,
    ray: RayPoint,
) -> Option<WithSsd> {
    let set = point
        .referenced_doses
        .iter()
        .filter(|dose| belongs(question, dose.number.get()))
        .find_map(|dose| dose.point_depth.as_ref())?;
    if set.averaged.get() == Some(true) {
        return None;
    }
    let by_ssd_cm = set
        .ssd_cm
        .get()
        .map(|ssd_cm| ray.slant_distance_cm() - ssd_cm);
    let along_cm = set.depth_cm.get().or(by_ssd_cm);
    let perpendicular_cm = along_cm.map(|depth_cm| depth_cm * ray.cosine());
    Some((
        DepthAt {
            effective_cm: set.equivalent_depth_cm.get().or(along_cm)?,
            perpendicular_cm,
        },
        perpendicular_cm.map(|depth_cm| ray.spd_cm - depth_cm),
    ))
}

/// From an SSD that this control point itself states, and a flat surface perpendicular to the axis.
fn ssd_depth(point: &ControlPoint, ray: RayPoint) -> Option<WithSsd> {
    let Given::Stated { value: ssd_cm } = point.ssd_cm else {
        return None;
    };
    let perpendicular_cm = ray.spd_cm - ssd_cm;
    Some((
        DepthAt {
            effective_cm: perpendicular_cm / ray.cosine(),
            perpendicular_cm: Some(perpendicular_cm),
        },
        Some(ssd_cm),
    ))
}

fn mean_candidate(basis: DepthBasis, what: &str, found: &Found, weights: &[f64]) -> DepthCandidate {
    let mean = |value: fn(&WithSsd) -> Option<f64>| -> Option<f64> {
        let mut sum = 0.0;
        for (depth, weight) in found.iter().zip(weights) {
            if let Some(depth) = depth {
                sum += weight * value(depth)?;
            }
        }
        Some(sum)
    };
    let effective = found.iter().flatten().map(|(depth, _)| depth.effective_cm);
    let (least, greatest) = effective.fold(
        (f64::INFINITY, f64::NEG_INFINITY),
        |(least, greatest), depth_cm| (least.min(depth_cm), greatest.max(depth_cm)),
    );
    let mean_cm = mean(|(depth, _)| Some(depth.effective_cm)).unwrap_or(f64::NAN);
    DepthCandidate {
        basis,
        independent: false,
        perpendicular_cm: mean(|(depth, _)| depth.perpendicular_cm),
        along_ray_cm: None,
        // The least one is what must not lie above the surface.
        effective_cm: if least < 0.0 { least } else { mean_cm },
        ssd_cm: mean(|(_, ssd_cm)| *ssd_cm),
        source: format!(
            "{what} at every control point that delivers dose: {least:.2} to {greatest:.2} cm, mean over the meterset {mean_cm:.2} cm"
        ),
    }
}
