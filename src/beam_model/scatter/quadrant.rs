//! Q(x, y), the integral of the differential scatter kernel over a rectangle
//! with one corner at the point, tabulated once for a depth. Q is odd in x and in
//! y, so any rectangle is four look-ups.

use std::f64::consts::TAU;

use super::RadialDose;

/// Grid lines, the same along x and y: fine near the point, where the kernel is steep (with these
/// steps bilinear interpolation errs by less than 0.01 % of the dose). Start, step and number of cells of each part.
const PARTS: [(f64, f64, usize); 3] = [(0.0, 0.1, 40), (4.0, 0.25, 32), (12.0, 1.0, 48)];

/// Number of grid lines.
const LINES: usize = 121;

/// Gauss-Legendre, 3 points on -1 .. 1.
const GAUSS: [(f64, f64); 3] = [
    (-0.774_596_669_241_483, 0.555_555_555_555_556),
    (0.0, 0.888_888_888_888_889),
    (0.774_596_669_241_483, 0.555_555_555_555_556),
];

/// The table of one depth.
#[derive(Clone, Debug)]
pub(super) struct Quadrants {
    /// Row-major, `LINES` by `LINES`; single precision, so that two depths stay in a core's cache.
    values: Vec<f32>,
}

/// A coordinate's place between two grid lines, with its sign.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Place {
    line: usize,
    share: f64,
    sign: f64,
}

/// The place of a coordinate, cm; beyond the last line it stays there (nothing was measured so far out).
#[inline]
pub(crate) fn place(coordinate_cm: f64) -> Place {
    let sign = if coordinate_cm < 0.0 { -1.0 } else { 1.0 };
    let size_cm = coordinate_cm.abs();
    let (start_cm, per_cm, first, count) = if size_cm < 4.0 {
        (0.0, 10.0, 0, 40)
    } else if size_cm < 12.0 {
        (4.0, 4.0, 40, 32)
    } else {
        (12.0, 1.0, 72, 48)
    };
    let place = ((size_cm - start_cm) * per_cm).min(f64::from(count));
    let cell = (place as usize).min(count as usize - 1);
    Place {
        line: first + cell,
        share: place - cell as f64,
        sign,
    }
}

fn lines_cm() -> Vec<f64> {
    let mut lines = Vec::with_capacity(LINES);
    for (start_cm, step_cm, cells) in PARTS {
        lines.extend((0..cells).map(|cell| start_cm + step_cm * cell as f64));
    }
    lines.push(60.0);
    lines
}

impl Quadrants {
    /// By the sectors seen from the corner: with V(x, y) the integral over v from 0 to y of
    /// (K(sqrt(x^2 + v^2)) - K(0)) x / (x^2 + v^2), Q(x, y) = (V(x, y) + V(y, x)) / (2 pi).
    pub(super) fn new(radial: &RadialDose) -> Self {
        let lines = lines_cm();
        let primary = radial.at(0.0);
        let mut along = vec![0.0; LINES * LINES];
        for (row, &x_cm) in lines.iter().enumerate().skip(1) {
            let mut sum = 0.0;
            for column in 1..LINES {
                let (low, high) = (lines[column - 1], lines[column]);
                let half = (high - low) / 2.0;
                for (node, weight) in GAUSS {
                    let v_cm = low + half * (1.0 + node);
                    let r2 = x_cm * x_cm + v_cm * v_cm;
                    sum += weight * half * (radial.at(r2.sqrt()) - primary) * x_cm / r2;
                }
                along[row * LINES + column] = sum;
            }
        }
        let values = (0..LINES * LINES)
            .map(|index| {
                let (row, column) = (index / LINES, index % LINES);
                ((along[index] + along[column * LINES + row]) / TAU) as f32
            })
            .collect();
        Self { values }
    }

    /// Q at two places.
    #[inline]
    pub(super) fn at(&self, x: Place, y: Place) -> f64 {
        let corner = x.line * LINES + y.line;
        let (Some(near), Some(far)) = (
            self.values.get(corner..corner + 2),
            self.values.get(corner + LINES..corner + LINES + 2),
        ) else {
            return 0.0;
        };
        let near = f64::from(near[0]) + f64::from(near[1] - near[0]) * y.share;
        let far = f64::from(far[0]) + f64::from(far[1] - far[0]) * y.share;
        x.sign * y.sign * (near + (far - near) * x.share)
    }
}

#[cfg(test)]
mod tests {
    use super::{LINES, PARTS, lines_cm, place};

    #[test]
    fn verify_places_name_the_cell_that_holds_the_coordinate() {
        let lines = lines_cm();
        assert_eq!(lines.len(), LINES);
        assert_eq!(PARTS.iter().map(|part| part.2).sum::<usize>() + 1, LINES);
        for coordinate in [0.0, 0.05, 3.999, 4.0, 7.3, 11.99, 12.0, 33.3, 59.9] {
            let found = place(coordinate);
            let back =
                lines[found.line] + found.share * (lines[found.line + 1] - lines[found.line]);
            assert!((back - coordinate).abs() < 1e-9, "{coordinate} {back}");
        }
        assert_eq!(place(80.0).line + 1, LINES - 1);
        assert!(place(-2.0).sign < 0.0);
    }
}
