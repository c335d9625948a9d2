//! Where a scatter integration can be summed and still verifies nothing: the
//! build-up, a point under a leaf or block or near an edge, fluence that changes
//! too much around the point, openings smaller or wider than what was measured.

use super::opening::Opening;
use super::results::ShapedResult;
use super::sum::Sums;
use crate::beam_model::BeamModel;
use crate::beam_model::scatter::ScatterAtDepth;
use crate::dose::{Obstacle, ObstacleKind, RayPoint};
use crate::quantity::tolerance;
use crate::settings::Technical;

/// What is judged.
pub(super) struct RangeQuestion<'a> {
    pub(super) beam: &'a BeamModel,
    pub(super) sums: &'a Sums,
    pub(super) result: &'a ShapedResult,
    /// Kernel at the mean depth.
    pub(super) kernel: &'a ScatterAtDepth<'a>,
    /// Side of the square with the same scatter, cm in the plane of the point.
    pub(super) equivalent_side_cm: f64,
    pub(super) limits: &'a Technical,
    /// Whether jaws, leaves and gantry stand still and there is one aperture.
    pub(super) one_aperture: OneAperture,
    /// Off-axis weight of the scatter.
    pub(super) scatter_weight: f64,
}

/// Whether a beam has one aperture or several.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum OneAperture {
    /// One, standing still.
    Yes,
    /// Several, or a moving one.
    No,
}

fn outside(kind: ObstacleKind, why: &str) -> Obstacle {
    Obstacle {
        kind,
        message: format!("outside the method's range: {why}"),
    }
}

/// A square that scatters like an opening is known to this only, cm: a measured square itself comes back a hair smaller
/// when its corners are rounded by the penumbra.
const SMALLEST_SLACK_CM: f64 = 0.05;

/// Why the result is outside the method's range; empty when it is inside.
pub(super) fn outside_range(question: &RangeQuestion<'_>) -> Vec<Obstacle> {
    let mut found = Vec::new();
    let sums = question.sums;
    let d_max_cm = question.beam.d_max_cm;
    if sums.least_depth_cm < d_max_cm - tolerance::TABLE_EDGE_CM {
        found.push(outside(
            ObstacleKind::BuildUp,
            &format!(
                "the point lies in the build-up: depth {:.2} cm, dose maximum at {d_max_cm:.2} cm",
                sums.least_depth_cm
            ),
        ));
    }
    match question.one_aperture {
        OneAperture::Yes => found.extend(edge_obstacle(question)),
        OneAperture::No => found.extend(modulation_obstacles(question)),
    }
    let smallest_cm = question.kernel.sides_cm().0;
    if question.one_aperture == OneAperture::Yes
        && question.equivalent_side_cm < smallest_cm - SMALLEST_SLACK_CM
    {
        found.push(outside(
            ObstacleKind::TableRange,
            &format!(
                "the opening scatters like a square of {:.2} cm in the point's plane; the tables begin at {smallest_cm:.2} cm",
                question.equivalent_side_cm
            ),
        ));
    }
    found.extend(reach_obstacle(question));
    found.extend(small_jaws_obstacle(question));
    found
}

/// So much of the dose may rest on jaw openings below the Sc table, per cent (an own choice): the fit is off there by
/// a per cent or two at most.
const BELOW_TABLE_PERCENT: f64 = 25.0;

fn small_jaws_obstacle(question: &RangeQuestion<'_>) -> Option<Obstacle> {
    let sums = question.sums;
    let below = sums.below_table.total(question.scatter_weight);
    let percent = 100.0 * below / sums.couch.total(question.scatter_weight);
    (percent > BELOW_TABLE_PERCENT).then(|| {
        outside(
            ObstacleKind::TableRange,
            &format!(
                "{percent:.0} % of the dose is given through jaw openings smaller than the Sc table ({})",
                question.beam.output_factors.sc.name()
            ),
        )
    })
}

fn edge_obstacle(question: &RangeQuestion<'_>) -> Option<Obstacle> {
    let margin_cm = question.limits.edge_margin_cm;
    let inside_cm = distance_to_closed_cm(&question.sums.opening, question.sums.ray, margin_cm)?;
    if inside_cm <= 0.0 {
        let [x_cm, y_cm] = question.sums.ray.projected_cm;
        return Some(outside(
            ObstacleKind::UnderDevice,
            &format!(
                "the point lies under a jaw, leaf or block: x {x_cm:.2} cm, y {y_cm:.2} cm in the isocentre plane"
            ),
        ));
    }
    Some(outside(
        ObstacleKind::FieldEdge,
        &format!(
            "the point lies {inside_cm:.2} cm from a field edge, in its own plane; the method needs {margin_cm:.2} cm"
        ),
    ))
}

/// Distance of the point from what is closed, cm in its plane, when that is below a margin; 0 when the point
/// itself is covered.
pub(super) fn distance_to_closed_cm(
    opening: &Opening,
    ray: RayPoint,
    margin_cm: f64,
) -> Option<f64> {
    let scale = ray.scale();
    let [x_cm, y_cm] = ray.projected_cm;
    let margin_cm = margin_cm - tolerance::TABLE_EDGE_CM;
    let open = || opening.patches.iter().filter(|patch| patch.open > 0.0);
    let mut levels: Vec<f64> = open().flat_map(|patch| patch.y_cm).collect();
    levels.sort_by(f64::total_cmp);
    levels.dedup_by(|after, before| *after - *before < 1e-9);
    let mut least_cm = f64::INFINITY;
    // Above the highest and below the lowest everything is closed.
    for beyond_cm in [
        levels.first().map_or(0.0, |low| y_cm - low),
        levels.last().map_or(0.0, |high| high - y_cm),
    ] {
        least_cm = least_cm.min(beyond_cm.max(0.0) * scale);
    }
    for pair in levels.windows(2) {
        let off_cm = (pair[0] - y_cm).max(y_cm - pair[1]).max(0.0);
        if off_cm * scale >= margin_cm {
            continue;
        }
        let middle_cm = f64::midpoint(pair[0], pair[1]);
        let mut spans: Vec<[f64; 2]> = open()
            .filter(|patch| patch.y_cm[0] < middle_cm && middle_cm < patch.y_cm[1])
            .map(|patch| patch.x_cm)
            .collect();
        spans.sort_by(|a, b| a[0].total_cmp(&b[0]));
        let mut closed_from_cm = f64::NEG_INFINITY;
        let mut nearest_cm = f64::INFINITY;
        for span in spans.iter().chain([&[f64::INFINITY; 2]]) {
            if span[0] - closed_from_cm > 1e-9 {
                nearest_cm = nearest_cm.min((closed_from_cm - x_cm).max(x_cm - span[0]).max(0.0));
            }
            closed_from_cm = closed_from_cm.max(span[1]);
        }
        least_cm = least_cm.min(nearest_cm.hypot(off_cm) * scale);
    }
    (least_cm < margin_cm).then_some(least_cm)
}

fn modulation_obstacles(question: &RangeQuestion<'_>) -> Vec<Obstacle> {
    let mut found = Vec::new();
    let limits = question.limits;
    let result = question.result;
    if result.fluence_change_percent > limits.modulated_fluence_change_percent {
        found.push(outside(
            ObstacleKind::FieldEdge,
            &format!(
                "the open fluence changes by {:.0} % within {:.1} cm of the point, the site allows {:.0} %",
                result.fluence_change_percent,
                limits.edge_margin_cm,
                limits.modulated_fluence_change_percent
            ),
        ));
    }
    let open_percent = result.shares.open_primary_percent;
    if open_percent.is_nan() || open_percent < limits.modulated_open_primary_percent {
        found.push(outside(
            ObstacleKind::UnderDevice,
            &format!(
                "only {open_percent:.0} % of the point's dose is open primary, the site wants {:.0} %",
                limits.modulated_open_primary_percent
            ),
        ));
    }
    found
}

/// What an opening that reaches beyond the measured squares could add at most, per cent of the dose: the kernel
/// falls with distance, so its slope at the reach bounds it.
const UNMEASURED_PERCENT: f64 = 0.5;

fn reach_obstacle(question: &RangeQuestion<'_>) -> Option<Obstacle> {
    let image = &question.result.fluence;
    let ray = question.sums.ray;
    let [x_cm, y_cm] = ray.projected_cm;
    let far = |from_cm: f64, cells: usize, at_cm: f64| {
        let to_cm = from_cm + image.cell_cm * cells as f64;
        (from_cm - at_cm).abs().max((to_cm - at_cm).abs())
    };
    let furthest_cm =
        far(image.x_from_cm, image.columns, x_cm).hypot(far(image.y_from_cm, image.rows, y_cm))
            * ray.scale();
    let reach_cm = question.kernel.reach_cm();
    if furthest_cm <= reach_cm {
        return None;
    }
    let kernel = question.kernel;
    let slope_per_cm = kernel.circle(reach_cm) - kernel.circle(reach_cm - 1.0);
    let percent = 100.0 * slope_per_cm * (furthest_cm - reach_cm) / kernel.circle(reach_cm);
    (percent > UNMEASURED_PERCENT).then(|| {
        outside(
            ObstacleKind::TableRange,
            &format!(
                "the opening reaches {furthest_cm:.1} cm from the point, the corners of the largest measured square {reach_cm:.1} cm: up to {percent:.1} % of the dose is not covered"
            ),
        )
    })
}
