//! Head scatter as two sources: the focal one, and an extra-focal Gaussian at
//! the flattening filter's height of which a point sees what jaws and leaves leave
//! open, with a term linear in the jaw opening for the scatter back into the
//! monitor chamber (two-source models: M. B. Sharpe, D. A. Jaffray, J. J. Battista, P. Munro,
//! Med Phys 22:2065, 1995; H. H. Liu, T. R. Mackie, E. C. McCullough, Med Phys 24:1960, 1997; both from
//! memory). Fitted to the beam's Sc table. It is used as a ratio only, aperture over jaws, so that
//! a jaw opening gives the table itself. Which openings there are is the work of `dose`.

use serde::Serialize;

use super::{BeamModel, Collimation, JawAxis};
use crate::quantity::{normal_between, normal_share};

/// Widths of the extra-focal Gaussian that are tried, cm at its own plane.
const SIGMAS_CM: (f64, f64) = (0.3, 6.0);

/// Steps of that search.
const SIGMA_STEPS: u32 = 80;

/// The fitted sources of one beam.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct HeadScatter {
    /// Source-axis distance, cm.
    pub sad_cm: f64,
    /// Source to the extra-focal plane, cm.
    pub plane_cm: f64,
    /// Sigma of the extra-focal Gaussian in its plane, cm.
    pub sigma_cm: f64,
    /// Extra-focal dose with the whole source in view, as a share of the focal dose.
    pub extra_focal: f64,
    /// Rise by backscatter to the monitor, per cm of the equivalent square of the jaws.
    pub backscatter_per_cm: f64,
    /// Largest difference between the fit and the Sc table, per cent.
    pub residual_percent: f64,
}

/// A cell of the Sc table beside the fit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HeadScatterCell {
    /// Side of the square at the isocentre plane, cm.
    pub side_cm: f64,
    /// Sc of the table.
    pub sc: f64,
    /// Sc of the fit.
    pub fitted: f64,
}

impl HeadScatterCell {
    /// By how much the fit misses the table, per cent.
    #[must_use]
    pub fn residual_percent(&self) -> f64 {
        100.0 * (self.fitted / self.sc - 1.0)
    }
}

/// An opening as the extra-focal plane sees it through one device at its height.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HeadWindow {
    /// Lower and upper bound in the extra-focal plane along one axis, cm.
    pub bounds_cm: [f64; 2],
}

impl HeadScatter {
    /// Fits the sources to a beam's Sc table; `None` when the model does not give the extra-focal plane or the
    /// distances of the jaws.
    #[must_use]
    pub fn fit(sad_cm: f64, collimation: &Collimation, beam: &BeamModel) -> Option<Self> {
        let plane_cm = beam.extra_focal_distance_cm?;
        let jaw_cm = |axis: JawAxis| collimation.jaw(axis)?.source_distance_cm;
        let (jaw_x_cm, jaw_y_cm) = (jaw_cm(JawAxis::X)?, jaw_cm(JawAxis::Y)?);
        if plane_cm >= jaw_x_cm.min(jaw_y_cm) {
            return None;
        }
        let table = &beam.output_factors.sc;
        let cells: Vec<(f64, f64)> = table
            .rows()
            .iter()
            .enumerate()
            .filter_map(|(row, &side_cm)| Some((side_cm, table.cell_value(row, 0)?)))
            .collect();
        let mut best: Option<(f64, Self)> = None;
        for step in 0..=SIGMA_STEPS {
            let share = f64::from(step) / f64::from(SIGMA_STEPS);
            let sigma_cm = SIGMAS_CM.0 * (SIGMAS_CM.1 / SIGMAS_CM.0).powf(share);
            let mut trial = Self {
                sad_cm,
                plane_cm,
                sigma_cm,
                extra_focal: 0.0,
                backscatter_per_cm: 0.0,
                residual_percent: 0.0,
            };
            let seen = |side_cm: f64| {
                let jaw = [-side_cm / 2.0, side_cm / 2.0];
                let x = trial.window(jaw, 0.0, jaw_x_cm);
                let y = trial.window(jaw, 0.0, jaw_y_cm);
                trial.visible(x, y)
            };
            let rows: Vec<[f64; 3]> = cells
                .iter()
                .map(|&(side_cm, sc)| [seen(side_cm), side_cm, sc])
                .collect();
            let (norm, extra_focal, backscatter) = least_squares(&rows);
            let residuals = rows.iter().map(|[seen, side_cm, sc]| {
                100.0 * (norm * (1.0 + extra_focal * seen + backscatter * side_cm) / sc - 1.0)
            });
            let (sum, greatest) = residuals.fold((0.0, 0.0_f64), |(sum, greatest), residual| {
                (sum + residual * residual, greatest.max(residual.abs()))
            });
            trial.extra_focal = extra_focal;
            trial.backscatter_per_cm = backscatter;
            trial.residual_percent = greatest;
            if best.as_ref().is_none_or(|(least, _)| sum < *least) {
                best = Some((sum, trial));
            }
        }
        best.map(|(_, fitted)| fitted)
    }

    /// The fit beside the Sc table that it was made from, square by square; empty when the model does not give
    /// the distances of the jaws.
    #[must_use]
    pub fn beside_table(
        &self,
        collimation: &Collimation,
        beam: &BeamModel,
    ) -> Vec<HeadScatterCell> {
        let jaw_cm = |axis: JawAxis| collimation.jaw(axis)?.source_distance_cm;
        let (Some(jaw_x_cm), Some(jaw_y_cm)) = (jaw_cm(JawAxis::X), jaw_cm(JawAxis::Y)) else {
            return Vec::new();
        };
        let table = &beam.output_factors.sc;
        let rows: Vec<[f64; 3]> = table
            .rows()
            .iter()
            .enumerate()
            .filter_map(|(row, &side_cm)| {
                let jaw = [-side_cm / 2.0, side_cm / 2.0];
                let x = self.window(jaw, 0.0, jaw_x_cm);
                let y = self.window(jaw, 0.0, jaw_y_cm);
                let output = self.output(self.visible(x, y), side_cm);
                Some([side_cm, table.cell_value(row, 0)?, output])
            })
            .collect();
        // The scale of least squares, as in the fit.
        let [across, square] = rows.iter().fold([0.0, 0.0], |[across, square], row| {
            [across + row[1] * row[2], square + row[2] * row[2]]
        });
        rows.into_iter()
            .map(|[side_cm, sc, output]| HeadScatterCell {
                side_cm,
                sc,
                fitted: output * across / square,
            })
            .collect()
    }

    /// What of the extra-focal plane a point sees along one axis between two edges: edges and point in
    /// cm at the isocentre plane, the device's distance from the source in cm.
    #[must_use]
    #[inline]
    pub fn window(&self, edges_cm: [f64; 2], point_cm: f64, device_cm: f64) -> HeadWindow {
        let lever = self.lever(device_cm);
        HeadWindow {
            bounds_cm: edges_cm
                .map(|edge_cm| point_cm + (edge_cm * device_cm / self.sad_cm - point_cm) * lever),
        }
    }

    /// Share of the extra-focal source between two windows, 0 to 1.
    #[must_use]
    #[inline]
    pub fn visible(&self, x: HeadWindow, y: HeadWindow) -> f64 {
        normal_between(x.bounds_cm, self.sigma_cm) * normal_between(y.bounds_cm, self.sigma_cm)
    }

    /// How much further from the point the extra-focal plane is than a device.
    fn lever(&self, device_cm: f64) -> f64 {
        (self.sad_cm - self.plane_cm) / (self.sad_cm - device_cm)
    }

    /// How edges of a device at its height, cm from the source, are seen from a point, its coordinate along the same axis,
    /// cm, at the isocentre plane.
    #[must_use]
    pub fn view(&self, point_cm: f64, device_cm: f64) -> HeadView {
        let lever = self.lever(device_cm);
        HeadView {
            at_axis: point_cm * (1.0 - lever) / self.sigma_cm,
            per_cm: device_cm / self.sad_cm * lever / self.sigma_cm,
        }
    }

    /// Relative in-air output with this share of the extra-focal source in view and this equivalent square of the jaws, cm.
    #[must_use]
    #[inline]
    pub fn output(&self, visible: f64, jaw_side_cm: f64) -> f64 {
        1.0 + self.extra_focal * visible + self.backscatter_per_cm * jaw_side_cm
    }
}

/// Edges of one device along one axis as the extra-focal source lies behind them: their places in sigmas are straight in
/// their coordinates.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HeadView {
    at_axis: f64,
    per_cm: f64,
}

impl HeadView {
    /// Share of the extra-focal source on the lower side of an edge, its coordinate in cm at the isocentre plane.
    #[must_use]
    #[inline]
    pub fn share_below(&self, edge_cm: f64) -> f64 {
        normal_share(edge_cm * self.per_cm + self.at_axis)
    }
}

impl HeadWindow {
    /// What is open through both of two devices.
    #[must_use]
    #[inline]
    pub fn and(self, other: Self) -> Self {
        Self {
            bounds_cm: [
                self.bounds_cm[0].max(other.bounds_cm[0]),
                self.bounds_cm[1].min(other.bounds_cm[1]),
            ],
        }
    }
}

/// n, a, b of Sc = n (1 + a E + b s) by least squares, a and b not negative; rows are [E, s, Sc].
fn least_squares(rows: &[[f64; 3]]) -> (f64, f64, f64) {
    let both = fit_terms(rows, [true, true]);
    let candidates = [
        both,
        fit_terms(rows, [true, false]),
        fit_terms(rows, [false, true]),
        fit_terms(rows, [false, false]),
    ];
    let allowed = candidates.into_iter().flatten().find(|terms| {
        // The first that is allowed: more terms never fit worse.
        terms[0] > 0.0 && terms[1] >= 0.0 && terms[2] >= 0.0
    });
    let [norm, extra_focal, backscatter] = allowed.unwrap_or([1.0, 0.0, 0.0]);
    (norm, extra_focal / norm, backscatter / norm)
}

/// Linear least squares for the constant and the wanted terms, by Gaussian elimination of the normal equations.
fn fit_terms(rows: &[[f64; 3]], wanted: [bool; 2]) -> Option<[f64; 3]> {
    let mut matrix = [[0.0; 4]; 3];
    for &[seen, side_cm, sc] in rows {
        let terms = [
            1.0,
            if wanted[0] { seen } else { 0.0 },
            // In units of 10 cm, so that the three terms are of one size.
            if wanted[1] { side_cm / 10.0 } else { 0.0 },
        ];
        for (line, &a) in matrix.iter_mut().zip(&terms) {
            for (cell, b) in line.iter_mut().zip(terms.iter().chain([&sc])) {
                *cell += a * b;
            }
        }
    }
    for (term, wanted) in wanted.into_iter().enumerate() {
        if !wanted {
            matrix[term + 1] = [0.0; 4];
            matrix[term + 1][term + 1] = 1.0;
        }
    }
    for pivot in 0..3 {
        if matrix[pivot][pivot].abs() < 1e-12 {
            return None;
        }
        for line in 0..3 {
            if line != pivot {
                let ratio = matrix[line][pivot] / matrix[pivot][pivot];
                let source = matrix[pivot];
                for (cell, value) in matrix[line].iter_mut().zip(source) {
                    *cell -= ratio * value;
                }
            }
        }
    }
    let solved = |term: usize| matrix[term][3] / matrix[term][term];
    Some([solved(0), solved(1), solved(2) / 10.0])
}
