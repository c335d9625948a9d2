//! The meterset-weighted open fluence in the beam's-eye view, as an image: what
//! a moving field delivers on the whole. Dose is not worked out from it, but for
//! the off-axis weight of the scatter.

use std::fmt::Write as _;
use std::sync::Arc;

use serde::{Serialize, Serializer};

use super::opening::Opening;

/// Side of a cell, cm at the isocentre plane.
const CELL_CM: f64 = 0.25;

/// Half of the imaged square, cm.
const HALF_CM: f64 = 20.0;

/// Cells along a side.
const CELLS: usize = 160;

/// Cells along a side of a block of 1 cm: fine enough for a horn.
const BLOCK_CELLS: usize = 4;

/// The image, cropped to where something is open; row by row from the lowest y.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct FluenceImage {
    /// Lower edge of the first cell along x, cm at the isocentre plane in the collimator system.
    pub x_from_cm: f64,
    /// Lower edge of the first row along y, cm.
    pub y_from_cm: f64,
    /// Side of a cell, cm.
    pub cell_cm: f64,
    /// Cells along x.
    pub columns: usize,
    /// Cells along y.
    pub rows: usize,
    /// Share of the meterset for which a cell is open, 0 to 255 for 0 to 1; two hexadecimal digits each in JSON.
    #[serde(serialize_with = "as_hex")]
    pub values: Arc<[u8]>,
}

fn as_hex<S: Serializer>(values: &[u8], serializer: S) -> Result<S::Ok, S::Error> {
    let mut text = String::with_capacity(2 * values.len());
    for value in values {
        // Writing to a string cannot fail.
        let _ = write!(text, "{value:02x}");
    }
    serializer.serialize_str(&text)
}

/// An image in the making: rows of differences, so that a rectangle costs a few additions a row.
#[derive(Clone, Debug)]
pub(super) struct FluenceSum {
    differences: Vec<f64>,
    /// First and last row, first and last column in which something was open.
    rows: (usize, usize),
    columns: (usize, usize),
}

impl FluenceSum {
    pub(super) fn new() -> Self {
        Self {
            differences: vec![0.0; CELLS * (CELLS + 2)],
            rows: (CELLS, 0),
            columns: (CELLS, 0),
        }
    }

    /// Adds an opening that stands for this share of the meterset.
    pub(super) fn add(&mut self, opening: &Opening, weight: f64) {
        let place = |cm: f64| ((cm + HALF_CM) / CELL_CM).clamp(0.0, CELLS as f64);
        for patch in opening.patches.iter().filter(|patch| patch.open != 0.0) {
            let (x, y) = (patch.x_cm.map(place), patch.y_cm.map(place));
            // An edge on a cell's own edge does not open the next one.
            let last = |place: f64| (place.ceil() as usize).saturating_sub(1).min(CELLS - 1);
            let mut row = y[0] as usize;
            self.rows = (self.rows.0.min(row), self.rows.1.max(last(y[1])));
            let (first, end) = (x[0] as usize, last(x[1]));
            self.columns = (self.columns.0.min(first), self.columns.1.max(end));
            while (row as f64) < y[1] && row < CELLS {
                let covered =
                    (y[1].min(row as f64 + 1.0) - y[0].max(row as f64)) * weight * patch.open;
                self.add_edge(row, x[0], covered);
                self.add_edge(row, x[1], -covered);
                row += 1;
            }
        }
    }

    /// From this place on the row holds more by `value`: a running sum of the row then gives each cell its share.
    fn add_edge(&mut self, row: usize, place: f64, value: f64) {
        let cell = place as usize;
        let share = place - cell as f64;
        let at = row * (CELLS + 2) + cell;
        if let Some([here, next]) = self.differences.get_mut(at..at + 2) {
            *here += value * (1.0 - share);
            *next += value * share;
        }
    }

    /// Rows in which something was open, from the lowest y: number of the row and the fluence of all its cells.
    fn open_rows(&self) -> impl Iterator<Item = (usize, Vec<f64>)> {
        let (low, high) = self.rows;
        let rows = self.differences.chunks(CELLS + 2).enumerate();
        rows.skip(low)
            .take((high + 1).saturating_sub(low))
            .map(|(row, differences)| {
                let mut sum = 0.0;
                let cells = differences.iter().take(CELLS).map(|difference| {
                    sum += difference;
                    sum
                });
                (row, cells.collect())
            })
    }

    /// Blocks of cells in which something is open: their edges along x and y, cm at the isocentre plane, and their mean
    /// fluence.
    pub(super) fn open_blocks(&self) -> Vec<([f64; 2], [f64; 2], f64)> {
        let edges = |block: usize| {
            let low_cm = (block * BLOCK_CELLS) as f64 * CELL_CM - HALF_CM;
            [low_cm, low_cm + BLOCK_CELLS as f64 * CELL_CM]
        };
        let count = CELLS / BLOCK_CELLS;
        let mut blocks = vec![0.0; count * count];
        for (row, cells) in self.open_rows() {
            for (column, fluence) in cells.into_iter().enumerate() {
                let block = row / BLOCK_CELLS * count + column / BLOCK_CELLS;
                blocks[block] += fluence / (BLOCK_CELLS * BLOCK_CELLS) as f64;
            }
        }
        blocks
            .into_iter()
            .enumerate()
            .filter(|(_, fluence)| *fluence > 1e-6)
            .map(|(index, fluence)| (edges(index % count), edges(index / count), fluence))
            .collect()
    }

    /// The image.
    pub(super) fn image(&self) -> FluenceImage {
        let (left, right) = self.columns;
        let (low, high) = self.rows;
        if left > right || low > high {
            return FluenceImage {
                cell_cm: CELL_CM,
                ..FluenceImage::default()
            };
        }
        let values = self
            .open_rows()
            .flat_map(|(_, cells)| {
                let open = cells.into_iter().skip(left).take(right - left + 1);
                open.map(|fluence| (fluence.clamp(0.0, 1.0) * 255.0).round() as u8)
            })
            .collect();
        FluenceImage {
            x_from_cm: left as f64 * CELL_CM - HALF_CM,
            y_from_cm: low as f64 * CELL_CM - HALF_CM,
            cell_cm: CELL_CM,
            columns: right - left + 1,
            rows: high - low + 1,
            values,
        }
    }
}
