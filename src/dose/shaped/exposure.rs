//! What an opening gives to the point: the primary fluence at it, blurred by
//! the penumbra, and the scatter integral, each through the opening and through
//! leaves and blocks. Head scatter, distance and depth are others' work.

use super::opening::{Opening, Patch};
use crate::beam_model::Penumbra;
use crate::beam_model::scatter::ScatterAtDepth;
use crate::dose::RayPoint;
use crate::quantity::{normal_share, normal_share_integral};

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

/// The exposure of the point on `ray`.
pub(super) fn expose(
    opening: &Opening,
    ray: RayPoint,
    kernel: &ScatterAtDepth<'_>,
    penumbra: &Penumbra,
) -> Exposure {
    let mut sum = Exposure::default();
    for patch in &opening.patches {
        let (x, y) = seen_from(patch, ray);
        let scatter = kernel.rectangle(x.at_cm, y.at_cm);
        sum.open_scatter += patch.open * scatter;
        sum.leak_scatter += patch.leak * scatter;
        let fluence = blurred(x, y, penumbra);
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
    penumbra: &Penumbra,
) -> [f64; PLACES] {
    let mut sums = [0.0; PLACES];
    let far_cm = FAR_SIGMAS * penumbra.tail_sigma_cm + reach_cm;
    for patch in opening.patches.iter().filter(|patch| patch.open != 0.0) {
        let (x, y) = seen_from(patch, ray);
        if x.is_beyond(far_cm) || y.is_beyond(far_cm) {
            continue;
        }
        for (sum, shift_cm) in sums.iter_mut().zip(shifts_cm) {
            let (x, y) = (x.seen_from(shift_cm[0]), y.seen_from(shift_cm[1]));
            *sum += patch.open * blurred(x, y, penumbra);
        }
    }
    sums
}

/// Two edges of a rectangle from the point, in the point's plane, and how far each moves in the step, either way.
#[derive(Clone, Copy)]
struct Sides {
    at_cm: [f64; 2],
    travel_cm: [f64; 2],
}

impl Sides {
    /// Whether all of it lies further than this from the point, cm.
    #[inline]
    fn is_beyond(self, far_cm: f64) -> bool {
        self.at_cm[0] - self.travel_cm[0] > far_cm || self.at_cm[1] + self.travel_cm[1] < -far_cm
    }

    /// The same edges from a place this far from the point, cm.
    #[inline]
    fn seen_from(self, shift_cm: f64) -> Self {
        Self {
            at_cm: self.at_cm.map(|edge_cm| edge_cm - shift_cm),
            // How fluence changes around the point is looked at, not summed: the middle of the step will do.
            travel_cm: [0.0; 2],
        }
    }
}

#[inline]
fn seen_from(patch: &Patch, ray: RayPoint) -> (Sides, Sides) {
    let scale = ray.scale();
    let [x_cm, y_cm] = ray.projected_cm;
    let sides = |edges_cm: [f64; 2], travel_cm: [f64; 2], at_cm: f64| Sides {
        at_cm: edges_cm.map(|edge_cm| (edge_cm - at_cm) * scale),
        travel_cm: travel_cm.map(|travel_cm| travel_cm * scale),
    };
    (
        sides(patch.x_cm, patch.x_travel_cm, x_cm),
        sides(patch.y_cm, patch.y_travel_cm, y_cm),
    )
}

/// Share of the penumbra's Gaussians around the point that lies on the rectangle.
#[inline]
fn blurred(x: Sides, y: Sides, penumbra: &Penumbra) -> f64 {
    let far_cm = FAR_SIGMAS * penumbra.tail_sigma_cm;
    if x.is_beyond(far_cm) || y.is_beyond(far_cm) {
        return 0.0;
    }
    let gaussian = |sigma_cm| between(x, sigma_cm) * between(y, sigma_cm);
    let main = gaussian(penumbra.sigma_cm);
    if penumbra.tail_share == 0.0 {
        return main;
    }
    main + (gaussian(penumbra.tail_sigma_cm) - main) * penumbra.tail_share
}

/// Share of a Gaussian between two edges, its mean over the step: a sharp penumbra is finer than a step, so its
/// passage is integrated and not sampled.
#[inline]
fn between(side: Sides, sigma_cm: f64) -> f64 {
    let below = |index: usize| {
        let (at_cm, travel_cm) = (side.at_cm[index], side.travel_cm[index]);
        if travel_cm < 1e-3 * sigma_cm {
            return normal_share(at_cm / sigma_cm);
        }
        let (low, high) = (
            (at_cm - travel_cm) / sigma_cm,
            (at_cm + travel_cm) / sigma_cm,
        );
        (normal_share_integral(high) - normal_share_integral(low)) / (high - low)
    };
    (below(1) - below(0)).max(0.0)
}
