//! How deep the point lies, on every basis there is, best first: the user's
//! table, the plan's point depth, the plan's SSD with a flat surface
//! perpendicular to the axis. Nothing is guessed: a basis that contradicts
//! itself or puts the point above the surface is an obstacle. Whether two
//! bases agree is judged in `audit`.
//!
//! Conventions. The plan's Beam Dose Point Depth, Equivalent Depth and SSD and
//! the user's table hold along the ray from the source to the point; Source to
//! Surface Distance (300A,0130) holds on the axis. With a flat surface
//! perpendicular to the axis, depth perpendicular = depth along the ray * cos(ray, axis).

use super::plan_depth::from_plan;
use super::{DepthBasis, DepthCandidate, DosePoint, Obstacle, ObstacleKind, RayPoint};
use crate::plan::{Beam, ControlPoint, Plan, ReferencedBeam};
use crate::quantity::tolerance;

/// One row of the user's depth table, already read and found to be about this beam.
#[derive(Clone, Debug, PartialEq)]
pub struct DepthRow {
    /// SOP Instance UID of the plan.
    pub sop_instance_uid: String,
    /// Beam Number.
    pub beam_number: i32,
    /// Geometric depth along the ray from the source to the point, cm.
    pub depth_cm: f64,
    /// Radiological depth along the same ray, cm.
    pub effective_depth_cm: Option<f64>,
    /// Source-surface distance on the axis, cm.
    pub ssd_cm: Option<f64>,
    /// Whether the user says that the row does not come from the planning system.
    pub independent: bool,
}

/// Depths found, and what was found on the way.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct DepthFindings {
    /// Best basis first.
    pub(super) candidates: Vec<DepthCandidate>,
    /// Bases that state a radiological depth of their own.
    pub(super) radiological: Vec<DepthBasis>,
    /// Contradictions and impossible depths.
    pub(super) obstacles: Vec<Obstacle>,
    /// Worth telling.
    pub(super) remarks: Vec<String>,
}

/// What depths are sought for.
#[derive(Clone, Copy, Debug)]
pub(super) struct DepthQuestion<'a> {
    /// The plan.
    pub(super) plan: &'a Plan,
    /// The beam.
    pub(super) beam: &'a Beam,
    /// Its reference in the fraction group.
    pub(super) reference: Option<&'a ReferencedBeam>,
    /// The point.
    pub(super) point: Option<&'a DosePoint>,
    /// Its ray, when the beam stands still and its geometry is known.
    pub(super) ray: Option<RayPoint>,
    /// Control points that deliver dose.
    pub(super) delivering: &'a [&'a ControlPoint],
    /// The user's row.
    pub(super) row: Option<&'a DepthRow>,
    /// Two statements of one depth or SSD may differ by this, cm.
    pub(super) limit_cm: f64,
}

impl DepthFindings {
    pub(super) fn object(&mut self, message: String) {
        self.obstacles.push(Obstacle {
            kind: ObstacleKind::Depth,
            message,
        });
    }

    /// Takes a candidate unless it puts the point above the surface.
    pub(super) fn take(&mut self, candidate: DepthCandidate) {
        let negative = [candidate.perpendicular_cm, candidate.along_ray_cm]
            .into_iter()
            .flatten()
            .chain([candidate.effective_cm])
            .find(|&depth_cm| depth_cm.is_nan() || depth_cm < 0.0);
        match negative {
            Some(depth_cm) => self.object(format!(
                "the depth is {depth_cm:.2} cm, the point above the surface, by {}: check point and SSD",
                candidate.source
            )),
            None => self.candidates.push(candidate),
        }
    }
}

/// Every depth of the point, best basis first.
#[must_use]
pub(super) fn find_depths(question: &DepthQuestion<'_>) -> DepthFindings {
    let mut found = DepthFindings::default();
    if let Some(row) = question.row {
        from_row(row, question, &mut found);
    }
    from_plan(question, &mut found);
    from_ssd(question, &mut found);
    // Without a ray something else is missing already, and the caller says what.
    if found.candidates.is_empty() && question.ray.is_some() {
        found.object(
            "the depth of the point is not known: the plan gives neither a point depth nor a usable SSD; a row in the depth table would give it"
                .to_owned(),
        );
    }
    found
}

fn from_row(row: &DepthRow, question: &DepthQuestion<'_>, found: &mut DepthFindings) {
    let perpendicular_cm = question.ray.map(|ray| row.depth_cm * ray.cosine());
    let axis_ssd_cm = question
        .ray
        .zip(perpendicular_cm)
        .map(|(ray, depth_cm)| ray.spd_cm - depth_cm);
    if let (Some(stated_cm), Some(worked_cm)) = (row.ssd_cm, axis_ssd_cm)
        && (stated_cm - worked_cm).abs() > question.limit_cm
    {
        found.object(format!(
            "the depth table contradicts itself: SSD {stated_cm:.2} cm, but depth {:.2} cm of a point at this distance from the source makes it {worked_cm:.2} cm",
            row.depth_cm
        ));
    }
    if row.effective_depth_cm.is_some() {
        found.radiological.push(DepthBasis::Table);
    }
    found.take(DepthCandidate {
        basis: DepthBasis::Table,
        independent: row.independent,
        perpendicular_cm,
        along_ray_cm: Some(row.depth_cm),
        effective_cm: row.effective_depth_cm.unwrap_or(row.depth_cm),
        ssd_cm: axis_ssd_cm.or(row.ssd_cm),
        source: format!(
            "depth table, beam {}: depth {:.2} cm{}",
            row.beam_number,
            row.depth_cm,
            row.effective_depth_cm
                .map_or_else(String::new, |depth_cm| format!(
                    ", effective {depth_cm:.2} cm"
                ))
        ),
    });
}

fn from_ssd(question: &DepthQuestion<'_>, found: &mut DepthFindings) {
    let Some(ray) = question.ray else {
        return;
    };
    let mut ssds = question
        .delivering
        .iter()
        .filter_map(|point| point.ssd_cm.get());
    let Some(ssd_cm) = ssds.next() else {
        return;
    };
    if let Some(other_cm) = ssds.find(|other_cm| (other_cm - ssd_cm).abs() > tolerance::POSITION_CM)
    {
        found.object(format!(
            "Source to Surface Distance (300A,0130) is {ssd_cm:.2} cm at one control point and {other_cm:.2} cm at another, though the beam stands still"
        ));
    }
    let perpendicular_cm = ray.spd_cm - ssd_cm;
    let along_ray_cm = perpendicular_cm / ray.cosine();
    found.take(DepthCandidate {
        basis: DepthBasis::Ssd,
        independent: false,
        perpendicular_cm: Some(perpendicular_cm),
        along_ray_cm: Some(along_ray_cm),
        effective_cm: along_ray_cm,
        ssd_cm: Some(ssd_cm),
        source: format!(
            "SSD (300A,0130) {ssd_cm:.2} cm and a flat surface: {:.2} - {ssd_cm:.2} = {perpendicular_cm:.2} cm",
            ray.spd_cm
        ),
    });
}
