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
    /// The four corners of each cell side by side, by the line along x, then along y: a rectangle is then four loads and
    /// four products of four. Single precision holds it to 1e-7.
    cells: Vec<[f32; 4]>,
}

/// Cells along one axis.
const CELLS: usize = LINES - 1;

/// A coordinate's place between two grid lines: the weights of both, with the coordinate's sign.
#[derive(Clone, Copy, Debug)]
pub struct Place {
    line: usize,
    weights: [f32; 2],
}

impl Place {
    /// The place of a coordinate, cm from the point in its plane; beyond the last line it stays there (nothing was
    /// measured so far out).
    #[must_use]
    #[inline(always)]
    pub fn of(coordinate_cm: f64) -> Self {
        let size_cm = coordinate_cm.abs();
        let (start_cm, per_cm, first, count) = if size_cm < 4.0 {
            (0.0, 10.0, 0, 40)
        } else if size_cm < 12.0 {
            (4.0, 4.0, 40, 32)
        } else {
            (12.0, 1.0, 72, 48)
        };
        let place = (size_cm - start_cm) * per_cm;
        let cell = (place as i32).min(count - 1);
        let beyond = (place - f64::from(cell)) as f32;
        // Not `min`: NaN is to stay NaN.
        let share = if beyond > 1.0 { 1.0 } else { beyond };
        let sign = 1.0_f32.copysign(coordinate_cm as f32);
        Self {
            line: (first + cell) as usize,
            weights: [sign * (1.0 - share), sign * share],
        }
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
        let corner = |row: usize, column: usize| {
            ((along[row * LINES + column] + along[column * LINES + row]) / TAU) as f32
        };
        let cells = (0..CELLS * CELLS).map(|index| {
            let (row, column) = (index / CELLS, index % CELLS);
            [
                corner(row, column),
                corner(row, column + 1),
                corner(row + 1, column),
                corner(row + 1, column + 1),
            ]
        });
        Self {
            cells: cells.collect(),
        }
    }

    /// Each of the four values of a cell for the four corners of a rectangle, weighted and added: the sum of the four is the
    /// integral over the rectangle.
    #[inline(always)]
    pub(super) fn over(&self, rectangle: &Corners) -> [f64; 4] {
        let [a, b, c, d] = rectangle.cells;
        let cell = |index: usize| self.cells.get(index);
        let (Some(a), Some(b), Some(c), Some(d)) = (cell(a), cell(b), cell(c), cell(d)) else {
            return [0.0; 4];
        };
        let [wa, wb, wc, wd] = &rectangle.weights;
        let value =
            |cell: &[f32; 4], weights: &[f32; 4], at: usize| f64::from(cell[at] * weights[at]);
        // In double precision, so that the order of the corners does not count.
        std::array::from_fn(|at| {
            (value(a, wa, at) + value(b, wb, at)) + (value(c, wc, at) + value(d, wd, at))
        })
    }
}

/// The corners of a rectangle: their cells and the weights of the cells' own corners, the same for every depth.
pub(super) struct Corners {
    cells: [usize; 4],
    weights: [[f32; 4]; 4],
}

impl Corners {
    #[inline(always)]
    pub(super) fn of([x1, x2]: [Place; 2], [y1, y2]: [Place; 2]) -> Self {
        let cell = |x: Place, y: Place| x.line * CELLS + y.line;
        let product = |x: [f32; 4], y: [f32; 4]| std::array::from_fn(|at| x[at] * y[at]);
        let less = |weights: [f32; 4]| std::array::from_fn(|at| -weights[at]);
        let x = |place: Place| {
            let [near, far] = place.weights;
            [near, near, far, far]
        };
        let y = |place: Place| {
            let [near, far] = place.weights;
            [near, far, near, far]
        };
        let (x1_less, x2_full) = (less(x(x1)), x(x2));
        let (y1_full, y2_full) = (y(y1), y(y2));
        Self {
            cells: [cell(x1, y1), cell(x1, y2), cell(x2, y1), cell(x2, y2)],
            weights: [
                product(x(x1), y1_full),
                product(x1_less, y2_full),
                product(less(x2_full), y1_full),
                product(x2_full, y2_full),
            ],
        }
    }
}

#[cfg(test)]
mod tests {
    use super::{LINES, PARTS, Place, lines_cm};

    #[test]
    fn verify_places_name_the_cell_that_holds_the_coordinate() {
        let lines = lines_cm();
        assert_eq!(lines.len(), LINES);
        assert_eq!(PARTS.iter().map(|part| part.2).sum::<usize>() + 1, LINES);
        for coordinate in [0.0, 0.05, 3.999, 4.0, 7.3, 11.99, 12.0, 33.3, 59.9] {
            let found = Place::of(coordinate);
            let [low, high] = found.weights.map(f64::from);
            let back = low * lines[found.line] + high * lines[found.line + 1];
            assert!((back - coordinate).abs() < 1e-5, "{coordinate} {back}");
            assert!((low + high - 1.0).abs() < 1e-6);
        }
        assert_eq!(Place::of(80.0).line + 1, LINES - 1);
        let mirrored = Place::of(-2.0).weights;
        assert_eq!(mirrored, Place::of(2.0).weights.map(|weight| -weight));
    }
}
