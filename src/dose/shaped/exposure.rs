//! What an opening gives to the point: the primary fluence at it, blurred by
//! the penumbra, and the scatter integral, each through the opening and through
//! leaves and blocks. Head scatter, distance and depth are others' work.

use super::opening::{Opening, Patch};
use crate::beam_model::scatter::ScatterAtDepth;
use crate::dose::RayPoint;
use crate::quantity::normal_between;

/// Beyond this many sigmas an edge does not reach the point.
const FAR_SIGMAS: f64 = 6.0;

/// Fluence and scatter at the point.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Exposure {
    /// Phi_p through the opening.
    pub(super) open_fluence: f64,
    /// Phi_p through leaves and blocks.
    pub(super) leak_fluence: f64,
    /// Integral of Phi k_d through the opening.
    pub(super) open_scatter: f64,
    /// Integral of Phi k_d through leaves and blocks.
    pub(super) leak_scatter: f64,
}

/// The exposure of the point on `ray`; `sigma_cm` is the penumbra's in the point's plane.
pub(super) fn expose(
    opening: &Opening,
    ray: RayPoint,
    kernel: &ScatterAtDepth<'_>,
    sigma_cm: f64,
) -> Exposure {
    let mut sum = Exposure::default();
    for patch in &opening.patches {
        let (x_cm, y_cm) = seen_from(patch, ray);
        let scatter = kernel.rectangle(x_cm, y_cm);
        sum.open_scatter += patch.open * scatter;
        sum.leak_scatter += patch.leak * scatter;
        let fluence = blurred(x_cm, y_cm, sigma_cm);
        if fluence > 0.0 {
            sum.open_fluence += patch.open * fluence;
            sum.leak_fluence += patch.leak * fluence;
        }
    }
    sum
}

/// Open primary fluence, blurred, at places this far from the point, cm in the point's plane; none of them is
/// further than `reach_cm`.
pub(super) fn open_fluence_beside<const PLACES: usize>(
    opening: &Opening,
    ray: RayPoint,
    (shifts_cm, reach_cm): (&[[f64; 2]; PLACES], f64),
    sigma_cm: f64,
) -> [f64; PLACES] {
    let mut sums = [0.0; PLACES];
    let far_cm = FAR_SIGMAS * sigma_cm + reach_cm;
    for patch in opening.patches.iter().filter(|patch| patch.open != 0.0) {
        let (x_cm, y_cm) = seen_from(patch, ray);
        if y_cm[0] > far_cm || y_cm[1] < -far_cm || x_cm[0] > far_cm || x_cm[1] < -far_cm {
            continue;
        }
        for (sum, shift_cm) in sums.iter_mut().zip(shifts_cm) {
            let x_cm = x_cm.map(|edge| edge - shift_cm[0]);
            let y_cm = y_cm.map(|edge| edge - shift_cm[1]);
            *sum += patch.open * blurred(x_cm, y_cm, sigma_cm);
        }
    }
    sums
}

/// A rectangle's edges from the point, in the point's plane.
#[inline]
fn seen_from(patch: &Patch, ray: RayPoint) -> ([f64; 2], [f64; 2]) {
    let scale = ray.scale();
    let [x, y] = ray.projected_cm;
    (
        patch.x_cm.map(|edge| (edge - x) * scale),
        patch.y_cm.map(|edge| (edge - y) * scale),
    )
}

/// Share of a Gaussian around the point that lies on the rectangle.
#[inline]
fn blurred(x_cm: [f64; 2], y_cm: [f64; 2], sigma_cm: f64) -> f64 {
    let far_cm = FAR_SIGMAS * sigma_cm;
    if y_cm[0] > far_cm || y_cm[1] < -far_cm || x_cm[0] > far_cm || x_cm[1] < -far_cm {
        return 0.0;
    }
    normal_between(x_cm, sigma_cm) * normal_between(y_cm, sigma_cm)
}
