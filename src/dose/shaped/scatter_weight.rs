//! The off-axis weight of the scatter. The kernel comes from fields around the
//! axis, so it holds the horn (and, through the wedge factor, the wedge) as they lie
//! around the axis. Around a point elsewhere they lie otherwise: fluence at a place
//! is h(place), while the kernel supposes h(distance from the point). Horn and wedge at
//! the point itself are factors of their own and are divided out.

use super::standing::Standing;
use super::sum::Sums;
use crate::beam_model::scatter::ScatterAtDepth;
use crate::dose::PlacedWedge;
use crate::quantity::tolerance;

/// G: mean over the open fluence, weighted with the scatter that it gives, of
///
/// ```text
/// h(|place|) / (h(|place - point|) h(|point|)) * w(point + s) / (w(point) (w(s) + w(-s)) / 2)
/// ```
///
/// with h the off-axis ratio, w the wedge's profile and s the distance along the wedge. Exactly 1 for a point
/// on the axis of an open field. Where a table does not reach, the place counts as the point itself does.
pub(super) fn scatter_weight(
    standing: &Standing<'_>,
    sums: &Sums,
    kernel: &ScatterAtDepth<'_>,
) -> f64 {
    let ray = sums.ray;
    let point_cm = ray.projected_cm;
    let wedge = standing.wedge.map(|(placed, _)| placed);
    if ray.off_axis_cm() < tolerance::POSITION_CM && wedge.is_none() {
        return 1.0;
    }
    let (mut weighted, mut whole) = (0.0, 0.0);
    for (x_cm, y_cm, fluence) in sums.fluence.open_blocks() {
        let from_point = |edges: [f64; 2], at: f64| edges.map(|edge| (edge - at) * ray.scale());
        let scatter = fluence
            * kernel.rectangle(from_point(x_cm, point_cm[0]), from_point(y_cm, point_cm[1]));
        let place_cm = [
            f64::midpoint(x_cm[0], x_cm[1]),
            f64::midpoint(y_cm[0], y_cm[1]),
        ];
        let weight = horn_weight(standing, sums.effective_cm, place_cm, point_cm)
            * wedge.map_or(1.0, |wedge| wedge_weight(&wedge, place_cm, point_cm));
        weighted += weight * scatter;
        whole += scatter;
    }
    if whole > 0.0 { weighted / whole } else { 1.0 }
}

fn horn_weight(
    standing: &Standing<'_>,
    depth_cm: f64,
    place_cm: [f64; 2],
    point_cm: [f64; 2],
) -> f64 {
    let beam = standing.model.beam;
    let ratio = |[x_cm, y_cm]: [f64; 2]| {
        let found = beam.off_axis_ratio(x_cm.hypot(y_cm), depth_cm);
        found.ok().map(|found| found.value)
    };
    let apart_cm = [place_cm[0] - point_cm[0], place_cm[1] - point_cm[1]];
    match (ratio(place_cm), ratio(apart_cm), ratio(point_cm)) {
        (Some(place), Some(apart), Some(point)) if apart * point > 0.0 => place / (apart * point),
        _ => 1.0,
    }
}

fn wedge_weight(wedge: &PlacedWedge<'_>, place_cm: [f64; 2], point_cm: [f64; 2]) -> f64 {
    let profile = |place_cm| wedge.profile_at(place_cm).ok().map(|found| found.value);
    let apart_cm = [place_cm[0] - point_cm[0], place_cm[1] - point_cm[1]];
    let back_cm = apart_cm.map(|cm| -cm);
    let found = (
        profile(place_cm),
        profile(point_cm),
        profile(apart_cm),
        profile(back_cm),
    );
    match found {
        (Some(place), Some(point), Some(ahead), Some(back)) => {
            place / (point * f64::midpoint(ahead, back))
        }
        _ => 1.0,
    }
}
