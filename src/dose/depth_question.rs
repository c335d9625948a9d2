//! What is asked when a depth is sought, and what is found: shared by the
//! bases, each of which looks in its own place.

use super::{DepthBasis, DepthCandidate, DosePoint, Obstacle, ObstacleKind, RayPoint};
use crate::plan::{Beam, ControlPoint, Plan, ReferencedBeam};

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
