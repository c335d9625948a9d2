//! The kernel at one depth of the table beside the squares that it was made
//! from, for people to look at: what was measured, what was carried on, and how
//! well the one meets the other. Doses are worked out from `at_depth`.

use super::{RadialDose, ZeroField};

/// One depth of the table.
#[derive(Clone, Debug)]
pub struct ScatterRow<'a> {
    /// Depth, cm.
    pub depth_cm: f64,
    /// Squares of the table: side in cm in the plane of the point, and T(d, s) = TPR(d, s) Sp(s).
    pub squares: Vec<(f64, f64)>,
    /// K(d, r).
    pub radial: &'a RadialDose,
}

impl ScatterRow<'_> {
    /// By how much the integral over each square misses the table, per cent, in the order of the squares.
    pub fn residuals_percent(&self) -> impl Iterator<Item = f64> {
        let of = |&(side_cm, dose): &(f64, f64)| 100.0 * (self.radial.square(side_cm) / dose - 1.0);
        self.squares.iter().map(of)
    }

    /// The largest of these, without its sign, per cent.
    #[must_use]
    pub fn worst_residual_percent(&self) -> f64 {
        self.residuals_percent()
            .fold(0.0, |worst, percent| percent.abs().max(worst))
    }

    /// The form that holds towards zero field.
    #[must_use]
    pub const fn zero_field(&self) -> ZeroField {
        self.radial.zero_field
    }

    /// The sides of the squares that the form was fitted to, cm.
    #[must_use]
    pub fn fitted_sides_cm(&self) -> Vec<f64> {
        let sides = self.squares.iter().map(|square| square.0);
        sides.take(ZeroField::FITTED).collect()
    }

    /// By how much the form misses K at the squares that it was fitted to, at most, without its sign, per cent.
    #[must_use]
    pub fn form_residual_percent(&self) -> f64 {
        self.fitted_sides_cm()
            .into_iter()
            .map(|side_cm| {
                let radius_cm = RadialDose::radius_of_square_cm(side_cm);
                100.0 * (self.zero_field().at(radius_cm) / self.radial.at(radius_cm) - 1.0)
            })
            .fold(0.0, |worst: f64, percent: f64| percent.abs().max(worst))
    }
}
