//! The meterset-weighted open fluence in the beam's-eye view, as an image: what
//! a moving field delivers on the whole. Dose is not worked out from it, but for
//! the off-axis weight of the scatter.

use std::fmt::Write as _;
use std::sync::Arc;

use serde::{Serialize, Serializer};

use super::opening::Opening;
use super::raster::Raster;

/// Side of a cell, cm at the isocentre plane.
const CELL_CM: f64 = 0.25;

/// Half of the imaged square, cm.
const HALF_CM: f64 = 20.0;

/// Cells along a side.
const CELLS: usize = 160;

/// Room for them.
const ROOM: usize = CELLS + 2;

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

/// An image in the making.
#[derive(Clone, Debug)]
pub(super) struct FluenceSum(Raster<ROOM>);

impl FluenceSum {
    pub(super) fn new() -> Self {
        Self(Raster::new(HALF_CM))
    }

    /// Adds an opening that stands for this share of the meterset.
    pub(super) fn add(&mut self, opening: &Opening, weight: f64) {
        for patch in opening.patches.iter().filter(|patch| patch.open != 0.0) {
            self.0.add(patch.x_cm, patch.y_cm, weight * patch.open);
        }
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
        for (row, cells) in self.0.used_rows() {
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
        let [(low, high), (left, right)] = self.0.used();
        if left > right || low > high {
            return FluenceImage {
                cell_cm: CELL_CM,
                ..FluenceImage::default()
            };
        }
        let values = self
            .0
            .used_rows()
            .into_iter()
            .flat_map(|(_, cells)| {
                let open = cells.into_iter().skip(left).take(right - left + 1);
                open.map(|fluence| (fluence.clamp(0.0, 1.0) * 255.0).round() as u8)
            })
            .collect();
        FluenceImage {
            x_from_cm: self.0.edge_cm(left),
            y_from_cm: self.0.edge_cm(low),
            cell_cm: CELL_CM,
            columns: right - left + 1,
            rows: high - low + 1,
            values,
        }
    }
}
