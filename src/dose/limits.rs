//! Where a factor calculation can be multiplied out and still means nothing:
//! the build-up, a point under a jaw or too near a field edge. The range of the
//! tables is their own matter.

use super::wedge_factor::wedge_limit;
use super::{FieldInput, Obstacle, ObstacleKind};
use crate::quantity::tolerance;

/// Why the field is outside the method's range, one sentence each; empty when it is inside.
/// `d_max_cm` is the depth of dose maximum, when known; `edge_margin_cm` the least distance
/// of the point from a field edge, in the point's plane.
#[must_use]
pub fn outside_method(
    field: &FieldInput<'_>,
    d_max_cm: Option<f64>,
    edge_margin_cm: f64,
) -> Vec<Obstacle> {
    let mut reasons = Vec::new();
    let mut outside = |kind: ObstacleKind, why: String| {
        reasons.push(Obstacle {
            kind,
            message: format!("outside the method's range: {why}"),
        });
    };
    let shallower_cm = field
        .depth
        .perpendicular_cm
        .map_or(field.tpr_depth_cm(), |depth_cm| {
            depth_cm.min(field.tpr_depth_cm())
        });
    if let Some(d_max_cm) = d_max_cm
        && shallower_cm < d_max_cm - tolerance::TABLE_EDGE_CM
    {
        outside(
            ObstacleKind::BuildUp,
            format!(
                "the point lies in the build-up: depth {shallower_cm:.2} cm, dose maximum at {d_max_cm:.2} cm"
            ),
        );
    }
    for (axis, jaws_cm, at_cm) in [
        ("x", field.jaws_x_cm, field.ray.projected_cm[0]),
        ("y", field.jaws_y_cm, field.ray.projected_cm[1]),
    ] {
        let inside_cm = (at_cm - jaws_cm[0]).min(jaws_cm[1] - at_cm) * field.ray.scale();
        if inside_cm < 0.0 {
            outside(
                ObstacleKind::UnderDevice,
                format!(
                    "the point lies under a jaw: {axis} {at_cm:.2} cm in the isocentre plane, opening {:.2} to {:.2} cm",
                    jaws_cm[0], jaws_cm[1]
                ),
            );
        } else if inside_cm < edge_margin_cm - tolerance::TABLE_EDGE_CM {
            outside(
                ObstacleKind::FieldEdge,
                format!(
                    "the point lies {inside_cm:.2} cm from a field edge along {axis}, in its own plane; the method needs {edge_margin_cm:.2} cm"
                ),
            );
        }
    }
    let beam = field.model.map(|model| model.beam);
    reasons.extend(beam.and_then(|beam| wedge_limit(field, beam)));
    reasons
}
