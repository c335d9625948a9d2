//! K(d, r) at one depth: made so that its integral over the tabulated squares
//! gives the table back. The zero-field end is the work of `zero_field`.

use std::f64::consts::{FRAC_PI_4, PI};

use super::zero_field::{ZeroField, fit};
use crate::beam_model::Penumbra;
use crate::beam_model::table::monotone_slopes;

/// Mean radius of a square of unit side, (2/pi) asinh(1) (Bjarngard & Siddon 1982): where a square's
/// dose is put at first.
const MEAN_RADIUS: f64 = 0.561_099_852_339_18;

/// Rounds of making the squares agree; the residual falls by a factor of about 10 in each.
const ROUNDS: usize = 12;

/// Relative residual at which the squares agree: far below the digits of any table.
const CLOSE: f64 = 1e-7;

/// Step of the finely tabulated curve, cm, and its length: beyond the corner of any square.
const STEP_CM: f64 = 0.05;

/// K(d, r): dose on the axis of a circular field of radius r per unit in-air fluence.
#[derive(Clone, Debug)]
pub struct RadialDose {
    /// The form that holds towards zero field.
    pub zero_field: ZeroField,
    /// Beyond this radius nothing was measured, cm: the corners of the largest square. K stays as it is there.
    pub reach_cm: f64,
    /// K at 0, `STEP_CM`, 2 `STEP_CM` ... to the reach.
    values: Vec<f64>,
    /// Largest relative difference between the integral over a tabulated square and the table.
    pub residual: f64,
    /// The primary of a square is blurred by it.
    penumbra: Option<Penumbra>,
}

impl RadialDose {
    /// From squares: sides in cm, rising, at least two, and their doses.
    pub(super) fn from_squares(
        sides_cm: &[f64],
        doses: &[f64],
        penumbra: Option<Penumbra>,
    ) -> Self {
        let radii_cm: Vec<f64> = sides_cm
            .iter()
            .map(|side_cm| MEAN_RADIUS * side_cm)
            .collect();
        let mut nodes = doses.to_vec();
        let mut radial = Self::through(&radii_cm, &nodes, sides_cm, penumbra);
        for _ in 0..ROUNDS {
            radial.residual = 0.0;
            for ((node, &side_cm), &dose) in nodes.iter_mut().zip(sides_cm).zip(doses) {
                let missing = dose - radial.square(side_cm);
                *node += missing;
                radial.residual = radial.residual.max((missing / dose).abs());
            }
            if radial.residual < CLOSE {
                break;
            }
            let residual = radial.residual;
            radial = Self::through(&radii_cm, &nodes, sides_cm, penumbra);
            radial.residual = residual;
        }
        radial
    }

    /// The curve through (radius, K) nodes: monotone cubic in r/(r + B), in which a saturating curve is
    /// nearly straight; from zero field to the first node the bounded form; beyond the last node straight
    /// in r/(r + B), so bounded too.
    fn through(
        radii_cm: &[f64],
        nodes: &[f64],
        sides_cm: &[f64],
        penumbra: Option<Penumbra>,
    ) -> Self {
        let zero_field = fit(radii_cm, nodes);
        let b_cm = zero_field.half_radius_cm;
        let curved = |radius_cm: f64| radius_cm / (radius_cm + b_cm);
        let mut shares = vec![0.0];
        shares.extend(radii_cm.iter().map(|&radius_cm| curved(radius_cm)));
        let mut doses = vec![zero_field.dose];
        doses.extend_from_slice(nodes);
        let slopes = monotone_slopes(&shares, &doses);
        let reach_cm = sides_cm.last().copied().unwrap_or_default() / 2.0_f64.sqrt();
        let count = (reach_cm / STEP_CM).ceil() as usize + 1;
        let last = shares.len() - 1;
        let mut high = 1;
        let values = (0..=count)
            .map(|index| {
                let share = curved(index as f64 * STEP_CM);
                while high < last && shares[high] < share {
                    high += 1;
                }
                if share > shares[last] {
                    return doses[last] + slopes[last] * (share - shares[last]);
                }
                hermite(
                    (shares[high - 1], shares[high]),
                    (doses[high - 1], doses[high]),
                    (slopes[high - 1], slopes[high]),
                    share,
                )
            })
            .collect();
        Self {
            zero_field,
            reach_cm,
            values,
            residual: 0.0,
            penumbra,
        }
    }

    /// Radius of the circle at whose K a square's dose lies but for a little, cm.
    #[must_use]
    pub fn radius_of_square_cm(side_cm: f64) -> f64 {
        MEAN_RADIUS * side_cm
    }

    /// K at a radius, cm; beyond the reach it stays at its last value.
    #[must_use]
    pub fn at(&self, radius_cm: f64) -> f64 {
        let place = (radius_cm.min(self.reach_cm) / STEP_CM).max(0.0);
        let low = (place as usize).min(self.values.len() - 2);
        let share = place - low as f64;
        self.values[low] + (self.values[low + 1] - self.values[low]) * share
    }

    /// Dose on the axis of a square of this side, cm.
    #[must_use]
    pub fn square(&self, side_cm: f64) -> f64 {
        // Gauss-Legendre over 0 .. 45 degrees, 8 points: K is smooth, the edge a straight line.
        const NODES: [(f64, f64); 4] = [
            (0.183_434_642_495_65, 0.362_683_783_378_362),
            (0.525_532_409_916_329, 0.313_706_645_877_887),
            (0.796_666_477_413_627, 0.222_381_034_453_374),
            (0.960_289_856_497_536, 0.101_228_536_290_376),
        ];
        let half = FRAC_PI_4 / 2.0;
        let sum: f64 = NODES
            .iter()
            .flat_map(|&(node, weight)| [(node, weight), (-node, weight)])
            .map(|(node, weight)| {
                let angle = half * (1.0 + node);
                weight * self.at(side_cm / 2.0 / angle.cos())
            })
            .sum();
        // A measured square has lost what the penumbra takes from its middle: little, but for a tail.
        let lost = self
            .penumbra
            .map_or(0.0, |penumbra| 1.0 - penumbra.on_axis_of_square(side_cm));
        sum * half * 4.0 / PI - self.at(0.0) * lost
    }
}

/// The cubic between two nodes.
fn hermite(x: (f64, f64), y: (f64, f64), slope: (f64, f64), at: f64) -> f64 {
    let step = x.1 - x.0;
    let t = (at - x.0) / step;
    let (t2, t3) = (t * t, t * t * t);
    y.0 * (2.0 * t3 - 3.0 * t2 + 1.0)
        + slope.0 * step * (t3 - 2.0 * t2 + t)
        + y.1 * (3.0 * t2 - 2.0 * t3)
        + slope.1 * step * (t3 - t2)
}
