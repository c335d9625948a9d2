//! The open fluence beside the point, its mean over the meterset: whether a
//! modulated field is even enough there for one point to stand for it.

use super::opening::Opening;
use super::raster::Raster;
use crate::beam_model::Penumbra;
use crate::dose::RayPoint;
use crate::quantity::normal_share;

/// Cells across the surroundings, and two more: with a margin of 1 cm they are a third of a sharp penumbra's sigma.
const ROOM: usize = 66;

/// How far out the surroundings go beyond the margin, in sigmas of the tail.
const REACH_SIGMAS: f64 = 4.0;

/// How far to either side of the point the fluence is looked at, as shares of the margin.
const SHIFTS: [f64; 5] = [-1.0, -0.53, 0.0, 0.53, 1.0];

/// Where it is looked at, by the shifts along x and y: half-way to the margin and at it along the axes, at three quarters
/// of it between them. Blurred by the penumbra, a leaf edge is half a centimetre wide.
const PLACES: [[usize; 2]; 12] = [
    [1, 2],
    [3, 2],
    [2, 1],
    [2, 3],
    [0, 2],
    [4, 2],
    [2, 0],
    [2, 4],
    [1, 1],
    [1, 3],
    [3, 1],
    [3, 3],
];

/// The surroundings of the point in its own plane, without blur.
#[derive(Clone, Debug)]
pub(super) struct Surroundings {
    raster: Raster<ROOM>,
    margin_cm: f64,
    half_cm: f64,
    penumbra: Penumbra,
}

impl Surroundings {
    /// Surroundings that reach as far as `margin_cm` in the point's plane.
    pub(super) fn new(margin_cm: f64, penumbra: Penumbra) -> Self {
        let half_cm = margin_cm + REACH_SIGMAS * penumbra.tail_sigma_cm;
        Self {
            raster: Raster::new(half_cm),
            margin_cm,
            half_cm,
            penumbra,
        }
    }

    /// Adds an opening that stands for this share of the meterset, in the middle of its step.
    pub(super) fn add(&mut self, opening: &Opening, ray: RayPoint, weight: f64) {
        let scale = ray.scale();
        let [x_cm, y_cm] = ray.projected_cm;
        let seen = |edges_cm: [f64; 2], at_cm: f64| edges_cm.map(|edge| (edge - at_cm) * scale);
        for patch in opening.patches.iter().filter(|patch| patch.open != 0.0) {
            let y = seen(patch.y_cm, y_cm);
            if y[0] >= self.half_cm || y[1] <= -self.half_cm {
                continue;
            }
            let x = seen(patch.x_cm, x_cm);
            if x[0] < self.half_cm && x[1] > -self.half_cm {
                self.raster.add(x, y, weight * patch.open);
            }
        }
    }

    /// The greatest difference between the blurred fluence at one of the places and `at_point`.
    pub(super) fn greatest_change(&self, at_point: f64) -> f64 {
        let rows = self.raster.used_rows();
        let main = self.blurred(&rows, self.penumbra.sigma_cm);
        let tail_share = self.penumbra.tail_share;
        let tail = if tail_share == 0.0 {
            main
        } else {
            self.blurred(&rows, self.penumbra.tail_sigma_cm)
        };
        main.iter()
            .zip(tail)
            .map(|(main, tail)| (main + (tail - main) * tail_share - at_point).abs())
            .fold(0.0, f64::max)
    }

    /// The fluence at the places, blurred by one Gaussian.
    fn blurred(&self, rows: &[(usize, Vec<f64>)], sigma_cm: f64) -> [f64; PLACES.len()] {
        let cells = Raster::<ROOM>::CELLS;
        let shares: [Vec<f64>; 5] = SHIFTS.map(|shift| {
            let at_cm = shift * self.margin_cm;
            (0..cells)
                .map(|cell| self.share_on(cell, at_cm, sigma_cm))
                .collect()
        });
        let mut sums = [0.0; PLACES.len()];
        for (row, cells) in rows {
            let along = shares.each_ref().map(|shares| {
                let products = cells.iter().zip(shares).map(|(cell, share)| cell * share);
                products.sum::<f64>()
            });
            for (sum, [x, y]) in sums.iter_mut().zip(PLACES) {
                *sum += along[x] * shares[y].get(*row).copied().unwrap_or_default();
            }
        }
        sums
    }

    /// Share of a Gaussian around `at_cm` that lies on a row or column; the outermost ones stand for what is beyond.
    fn share_on(&self, cell: usize, at_cm: f64, sigma_cm: f64) -> f64 {
        let below = |edge: usize| normal_share((self.raster.edge_cm(edge) - at_cm) / sigma_cm);
        let lower = if cell == 0 { 0.0 } else { below(cell) };
        let last = cell + 1 == Raster::<ROOM>::CELLS;
        (if last { 1.0 } else { below(cell + 1) }) - lower
    }
}
