//! A dose in its four parts: primary and scatter, each through the opening and
//! through leaves and blocks.

use super::exposure::Exposure;

/// A dose in its four parts: primary through the opening and through leaves and blocks, scatter likewise.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Parts(pub(super) [f64; 4]);

impl Parts {
    pub(super) fn of(exposure: &Exposure, primary: f64) -> Self {
        Self([
            exposure.open_fluence * primary,
            exposure.leak_fluence * primary,
            exposure.open_scatter,
            exposure.leak_scatter,
        ])
    }

    pub(super) fn add(&mut self, other: Self, factor: f64) {
        for (sum, part) in self.0.iter_mut().zip(other.0) {
            *sum += part * factor;
        }
    }

    /// The whole, the scatter with its off-axis weight.
    pub(super) fn total(self, scatter_weight: f64) -> f64 {
        let [open, leak, open_scatter, leak_scatter] = self.0;
        open + leak + scatter_weight * (open_scatter + leak_scatter)
    }

    /// The four parts, the scatter with its off-axis weight.
    pub(super) fn weighted(self, scatter_weight: f64) -> [f64; 4] {
        let [open, leak, open_scatter, leak_scatter] = self.0;
        [
            open,
            leak,
            scatter_weight * open_scatter,
            scatter_weight * leak_scatter,
        ]
    }
}
