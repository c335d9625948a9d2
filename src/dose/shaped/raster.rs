//! Rectangles added up on a square raster. Rectangles of the same leaf pair lie
//! between the same two lines: along such a strip only differences are kept, so
//! that a rectangle costs a few additions, whatever its size.

/// A raster in the making. `ROOM` is its number of cells along a side and two more.
#[derive(Clone, Debug)]
pub(super) struct Raster<const ROOM: usize> {
    from_cm: f64,
    cells_per_cm: f64,
    strips: Vec<Strip<ROOM>>,
    /// The strip that the last rectangle was added to.
    at: usize,
    /// What found no strip, row by row; empty as long as there is room for more.
    rows: Vec<[f32; ROOM]>,
    /// First and last row, first and last column in which something was added.
    used_rows: (usize, usize),
    used_columns: (usize, usize),
}

/// So many strips at most: leaves of one bank, and jaws that move a little. Leaves that move along y make many more.
const MOST_STRIPS: usize = 128;

/// What lies between two lines along x.
#[derive(Clone, Debug)]
struct Strip<const ROOM: usize> {
    y_cm: [f64; 2],
    /// From each cell on the strip holds more by this. Single precision: hundreds of additions leave 1e-5.
    differences: [f32; ROOM],
}

/// A place on the raster: the cell that holds it, and how far into the cell it is, 0 to 1.
#[derive(Clone, Copy)]
struct Place {
    cell: usize,
    share: f32,
}

impl Place {
    /// The last cell of what ends here: an end on a cell's own edge does not open the next one.
    const fn last(self) -> usize {
        if self.share > 0.0 {
            self.cell
        } else {
            self.cell.saturating_sub(1)
        }
    }
}

impl<const ROOM: usize> Raster<ROOM> {
    /// Cells along a side.
    pub(super) const CELLS: usize = ROOM - 2;

    /// An empty raster, `half_cm` to either side of the origin.
    pub(super) fn new(half_cm: f64) -> Self {
        Self {
            from_cm: -half_cm,
            cells_per_cm: Self::CELLS as f64 / (2.0 * half_cm),
            strips: Vec::new(),
            at: 0,
            rows: Vec::new(),
            used_rows: (Self::CELLS, 0),
            used_columns: (Self::CELLS, 0),
        }
    }

    /// Lower edge of a row or column, cm.
    pub(super) fn edge_cm(&self, cell: usize) -> f64 {
        self.from_cm + cell as f64 / self.cells_per_cm
    }

    /// First and last row, first and last column in which something was added.
    pub(super) const fn used(&self) -> [(usize, usize); 2] {
        [self.used_rows, self.used_columns]
    }

    #[inline]
    fn place(&self, coordinate_cm: f64) -> Place {
        let place = ((coordinate_cm - self.from_cm) * self.cells_per_cm) as f32;
        let cell = (place as i32).clamp(0, Self::CELLS as i32);
        let share = place - cell as f32;
        Place {
            cell: cell as usize,
            // Places outside lie on the border: there is no cell after the last to be part of.
            share: if share > 0.0 && cell < Self::CELLS as i32 {
                share
            } else {
                0.0
            },
        }
    }

    /// Adds a rectangle, lower and upper edges in cm; what lies outside the raster is lost.
    #[inline]
    pub(super) fn add(&mut self, x_cm: [f64; 2], y_cm: [f64; 2], fluence: f64) {
        let (x1, x2) = (self.place(x_cm[0]), self.place(x_cm[1]));
        self.used_columns = used(self.used_columns, x1, x2);
        let fluence = fluence as f32;
        if let Some(strip) = self.strip(y_cm) {
            add_edge(&mut strip.differences, x1, fluence);
            add_edge(&mut strip.differences, x2, -fluence);
            return;
        }
        self.rows.resize(Self::CELLS, [0.0; ROOM]);
        let y = y_cm.map(|edge_cm| self.place(edge_cm));
        for (row, covered) in covered_rows(y) {
            if let Some(differences) = self.rows.get_mut(row) {
                add_edge(differences, x1, covered * fluence);
                add_edge(differences, x2, -covered * fluence);
            }
        }
    }

    /// The strip between these lines: most often that of the last rectangle, or the next one, or the first.
    /// `None` when there are too many already.
    #[inline]
    fn strip(&mut self, y_cm: [f64; 2]) -> Option<&mut Strip<ROOM>> {
        let is_at = |at: usize| self.strips.get(at).is_some_and(|strip| strip.y_cm == y_cm);
        if !is_at(self.at) {
            self.at = if is_at(self.at + 1) {
                self.at + 1
            } else {
                self.find_strip(y_cm)?
            };
        }
        self.strips.get_mut(self.at)
    }

    fn find_strip(&mut self, y_cm: [f64; 2]) -> Option<usize> {
        let known = self.strips.iter().position(|strip| strip.y_cm == y_cm);
        if known.is_some() {
            return known;
        }
        let [y1, y2] = y_cm.map(|edge_cm| self.place(edge_cm));
        self.used_rows = used(self.used_rows, y1, y2);
        if self.strips.len() == MOST_STRIPS {
            return None;
        }
        self.strips.push(Strip {
            y_cm,
            differences: [0.0; ROOM],
        });
        Some(self.strips.len() - 1)
    }

    /// The cells of the rows in which something was added, from the lowest: number of the row, and its cells.
    pub(super) fn used_rows(&self) -> Vec<(usize, Vec<f64>)> {
        let (low, high) = self.used_rows;
        let count = (high + 1).saturating_sub(low);
        let mut rows: Vec<[f32; ROOM]> = vec![[0.0; ROOM]; count];
        for (row, known) in rows.iter_mut().zip(self.rows.iter().skip(low)) {
            *row = *known;
        }
        for strip in &self.strips {
            for (row, covered) in covered_rows(strip.y_cm.map(|edge_cm| self.place(edge_cm))) {
                let row = row.checked_sub(low).and_then(|row| rows.get_mut(row));
                for (sum, difference) in row.into_iter().flatten().zip(strip.differences) {
                    *sum += covered * difference;
                }
            }
        }
        let filled = |differences: [f32; ROOM]| {
            let mut sum = 0.0;
            let cells = differences.iter().take(Self::CELLS).map(|&difference| {
                sum += f64::from(difference);
                sum
            });
            cells.collect()
        };
        rows.into_iter()
            .enumerate()
            .map(|(row, differences)| (low + row, filled(differences)))
            .collect()
    }
}

/// The rows between two places along y, each with the share of it that is covered.
fn covered_rows([low, high]: [Place; 2]) -> impl Iterator<Item = (usize, f32)> {
    (low.cell..=high.last()).map(move |row| {
        let below = if row == low.cell { low.share } else { 0.0 };
        let above = if row == high.cell {
            1.0 - high.share
        } else {
            0.0
        };
        (row, 1.0 - below - above)
    })
}

fn used((first, last): (usize, usize), low: Place, high: Place) -> (usize, usize) {
    (first.min(low.cell), last.max(high.last()))
}

/// From this place on the row holds more by `value`: a running sum of the row then gives each cell its share.
#[inline]
fn add_edge<const ROOM: usize>(row: &mut [f32; ROOM], at: Place, value: f32) {
    let next = value * at.share;
    if let Some([here, after]) = row.get_mut(at.cell..at.cell + 2) {
        *here += value - next;
        *after += next;
    }
}

#[cfg(test)]
mod tests {
    use super::Raster;

    /// Ten cells of 1 cm from -5: a rectangle from (-1.5, 0.25) to (2, 2.5) covers half a cell, three whole ones, and
    /// three quarters, a whole and half a row.
    #[test]
    fn verify_cells_hold_their_share_of_a_rectangle() {
        let mut raster = Raster::<12>::new(5.0);
        raster.add([-1.5, 2.0], [0.25, 2.5], 2.0);
        assert_eq!(raster.used(), [(5, 7), (3, 6)]);
        let rows = raster.used_rows();
        assert_eq!(rows.len(), 3);
        for ((row, cells), (number, share)) in rows.iter().zip([(5, 0.75), (6, 1.0), (7, 0.5)]) {
            assert_eq!(*row, number);
            for (cell, wanted) in [(2, 0.0), (3, 0.5), (4, 1.0), (6, 1.0), (7, 0.0)] {
                assert!(
                    (cells[cell] - 2.0 * share * wanted).abs() < 1e-6,
                    "{row} {cell}"
                );
            }
        }
    }

    /// Leaves may stand a little beyond the raster: what is used stays within its cells, or a picture's rows and columns
    /// would not be those of its values.
    #[test]
    fn verify_what_reaches_beyond_the_raster_ends_at_its_border() {
        let mut raster = Raster::<12>::new(5.0);
        raster.add([-5.3, 5.4], [4.5, 5.6], 1.0);
        raster.add([-9.0, -8.0], [0.0, 1.0], 1.0);
        assert_eq!(raster.used(), [(5, 9), (0, 9)]);
        let rows = raster.used_rows();
        assert_eq!(rows.len(), 5);
        assert!(rows.iter().all(|(_, cells)| cells.len() == 10));
        let (row, cells) = &rows[4];
        assert_eq!(*row, 9);
        assert!(cells.iter().all(|cell| (cell - 0.5).abs() < 1e-6));
        assert!(rows[0].1.iter().all(|cell| cell.abs() < 1e-6));
    }

    /// As many strips as rectangles, and more than there is room for: the same sums.
    #[test]
    fn property_strips_and_rows_hold_the_same() {
        let mut raster = Raster::<42>::new(2.0);
        for index in 0..300 {
            let y_cm = f64::from(index) * 0.01 - 1.5;
            raster.add([-1.0, 0.5], [y_cm, y_cm + 0.33], 1.0);
        }
        let sum: f64 = raster
            .used_rows()
            .into_iter()
            .flat_map(|(_, cells)| cells)
            .sum();
        assert!((sum * 0.01 - 300.0 * 1.5 * 0.33).abs() < 1e-2, "{sum}");
    }

    /// The sum over the cells times their area is fluence times area; what is outside is lost.
    #[test]
    fn property_a_rectangle_keeps_its_area() {
        let mut raster = Raster::<42>::new(2.0);
        raster.add([-0.83, 1.117], [-9.0, 0.0], 1.0);
        let sum: f64 = raster
            .used_rows()
            .into_iter()
            .flat_map(|(_, cells)| cells)
            .sum();
        assert!((sum * 0.01 - 1.947 * 2.0).abs() < 1e-5, "{sum}");
    }
}
