//! What an opening gives to the point: the primary fluence at it, blurred by
//! the penumbra, and the scatter integral, each through the opening and through
//! leaves and blocks. The fluence beside the point is the work of `beside`; head
//! scatter, distance and depth are others'.

use super::opening::{Opening, Patch};
use super::shared::Shared;
use crate::beam_model::Penumbra;
use crate::beam_model::scatter::{Place, ScatterAtDepth};
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

impl Exposure {
    /// Adds another one that stands for this share.
    pub(super) fn add(&mut self, other: &Self, weight: f64) {
        self.open_fluence += weight * other.open_fluence;
        self.leak_fluence += weight * other.leak_fluence;
        self.open_scatter += weight * other.open_scatter;
        self.leak_scatter += weight * other.leak_scatter;
    }
}

/// The exposure of the point on `ray`.
pub(super) fn expose(
    opening: &Opening,
    ray: RayPoint,
    kernel: &ScatterAtDepth<'_>,
    penumbra: &Penumbra,
) -> Exposure {
    let [open_scatter, leak_scatter] = scatter(&opening.patches, ray, kernel);
    let (open_fluence, leak_fluence) = fluence(&opening.patches, ray, penumbra);
    Exposure {
        open_fluence,
        leak_fluence,
        open_scatter,
        leak_scatter,
    }
}

fn scatter(patches: &[Patch], ray: RayPoint, kernel: &ScatterAtDepth<'_>) -> [f64; 2] {
    let scale = ray.scale();
    let [x_cm, y_cm] = ray.projected_cm;
    let mut along_y = Shared::new();
    let mut sum = kernel.sum();
    for patch in patches {
        let place = |at: f64| Place::of((at - x_cm) * scale);
        let x = [place(patch.x_cm[0]), place(patch.x_cm[1])];
        let y = along_y.pair(patch.y_cm, |at| Place::of((at - y_cm) * scale));
        sum.add(x, y, [patch.open, patch.leak]);
    }
    sum.totals()
}

fn fluence(patches: &[Patch], ray: RayPoint, penumbra: &Penumbra) -> (f64, f64) {
    let scale = ray.scale();
    let [x_cm, y_cm] = ray.projected_cm;
    let far_cm = FAR_SIGMAS * penumbra.tail_sigma_cm / scale;
    let is_near = |edges_cm: [f64; 2], travel_cm: [f64; 2], at_cm: f64| {
        edges_cm[0] - travel_cm[0] < at_cm + far_cm && edges_cm[1] + travel_cm[1] > at_cm - far_cm
    };
    let (mut open, mut leak) = (0.0, 0.0);
    for patch in patches {
        if !is_near(patch.y_cm, patch.y_travel_cm, y_cm)
            || !is_near(patch.x_cm, patch.x_travel_cm, x_cm)
        {
            continue;
        }
        let below = |at: f64, travel: f64| Below::of(at * scale, travel * scale, penumbra);
        let ([x1, x2], [x1_travel, x2_travel]) = (patch.x_cm, patch.x_travel_cm);
        let ([y1, y2], [y1_travel, y2_travel]) = (patch.y_cm, patch.y_travel_cm);
        let x = [below(x1 - x_cm, x1_travel), below(x2 - x_cm, x2_travel)];
        let y = [below(y1 - y_cm, y1_travel), below(y2 - y_cm, y2_travel)];
        let main = between(x[0].main, x[1].main) * between(y[0].main, y[1].main);
        let tail = between(x[0].tail, x[1].tail) * between(y[0].tail, y[1].tail);
        let fluence = main + (tail - main) * penumbra.tail_share;
        open += patch.open * fluence;
        leak += patch.leak * fluence;
    }
    (open, leak)
}

fn between(lower: f64, upper: f64) -> f64 {
    (upper - lower).max(0.0)
}

/// Shares of the penumbra's two Gaussians around the point that lie below an edge.
#[derive(Clone, Copy)]
struct Below {
    main: f64,
    tail: f64,
}

impl Below {
    /// An edge in the point's plane, cm from the point, that moves this far in the step, either way.
    #[inline]
    fn of(at_cm: f64, travel_cm: f64, penumbra: &Penumbra) -> Self {
        let main = mean_share(at_cm, travel_cm, penumbra.sigma_cm);
        Self {
            main,
            tail: if penumbra.tail_share == 0.0 {
                main
            } else {
                mean_share(at_cm, travel_cm, penumbra.tail_sigma_cm)
            },
        }
    }
}

/// Share of a Gaussian below an edge, its mean over the step: a sharp penumbra is finer than a step, so its passage is
/// integrated and not sampled.
#[inline]
fn mean_share(at_cm: f64, travel_cm: f64, sigma_cm: f64) -> f64 {
    if travel_cm < 1e-3 * sigma_cm {
        return normal_share(at_cm / sigma_cm);
    }
    let (low, high) = (
        (at_cm - travel_cm) / sigma_cm,
        (at_cm + travel_cm) / sigma_cm,
    );
    (normal_share_integral(high) - normal_share_integral(low)) / (high - low)
}
