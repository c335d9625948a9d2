//! Rectangular tables with interpolation that never extrapolates and says
//! which cells it used.

use std::fmt;
use std::sync::Arc;

use serde::{Deserialize, Serialize};
use thiserror::Error;

use crate::quantity::tolerance;

/// Interpolation down the rows; across the columns it is always linear.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum DepthInterpolation {
    /// Linear.
    #[default]
    Linear,
    /// Monotone cubic (Fritsch & Carlson 1980).
    MonotoneCubic,
}

/// A rectangular table: rows down, columns across. A single column means that
/// the value does not depend on the column coordinate.
#[derive(Clone, Debug)]
pub struct Grid {
    name: Arc<str>,
    row_name: &'static str,
    column_name: &'static str,
    rows: Vec<f64>,
    columns: Vec<f64>,
    /// Row-major.
    values: Vec<f64>,
    /// Fritsch-Carlson slopes, same shape; empty for linear interpolation.
    slopes: Vec<f64>,
}

/// Why a table was refused.
#[derive(Clone, Debug, Error, PartialEq)]
pub enum GridError {
    /// No rows or no columns.
    #[error("{table}: the table is empty")]
    Empty {
        /// Table name.
        table: String,
    },
    /// Values do not fill the rectangle.
    #[error("{table}: {found} values do not fill {rows} rows of {columns} columns")]
    Shape {
        /// Table name.
        table: String,
        /// Values there are.
        found: usize,
        /// Rows.
        rows: usize,
        /// Columns.
        columns: usize,
    },
    /// Row or column coordinates do not rise.
    #[error("{table}: {axis} must rise, but {after} follows {before}")]
    NotRising {
        /// Table name.
        table: String,
        /// `depth_cm`, `side_cm` ...
        axis: &'static str,
        /// Earlier coordinate.
        before: f64,
        /// Later coordinate.
        after: f64,
    },
    /// A coordinate or value that is not a finite number.
    #[error("{table}: a value is not a finite number")]
    NotFinite {
        /// Table name.
        table: String,
    },
}

/// A look-up beyond the measured range.
#[derive(Clone, Debug, Error, PartialEq, Serialize)]
#[error("{axis} {value:.2} is outside the measured range {least} to {greatest} of {table}")]
pub struct OutOfRange {
    /// Table name.
    pub table: Arc<str>,
    /// `depth_cm`, `side_cm` ...
    pub axis: &'static str,
    /// What was asked for.
    pub value: f64,
    /// Least measured coordinate.
    pub least: f64,
    /// Greatest measured coordinate.
    pub greatest: f64,
}

/// The part of a table that a look-up used.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Cell {
    /// Table name, such as `6/tpr.csv`.
    pub table: Arc<str>,
    /// Name of the row coordinate.
    pub row_name: &'static str,
    /// Neighbouring row coordinates; equal when on a row.
    pub rows: (f64, f64),
    /// Name of the column coordinate.
    pub column_name: &'static str,
    /// Neighbouring column coordinates; `None` for a table of one column.
    pub columns: Option<(f64, f64)>,
    /// The table's own values there: for the lower and the upper row, each in
    /// the lower and the upper column. On a row or a column both are equal.
    pub corners: [[f64; 2]; 2],
    /// Slopes of the monotone cubic down the rows at the same places, per unit of the row
    /// coordinate; `None` where the rows are interpolated linearly.
    pub slopes: Option<[[f64; 2]; 2]>,
}

/// A value and the cells it came from.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Lookup {
    /// The value.
    pub value: f64,
    /// Cells used; several when the value was converted from other quantities.
    pub cells: Vec<Cell>,
}

impl Lookup {
    /// A value worked out from other look-ups.
    #[must_use]
    pub fn converted(value: f64, from: impl IntoIterator<Item = Self>) -> Self {
        Self {
            value,
            cells: from.into_iter().flat_map(|lookup| lookup.cells).collect(),
        }
    }

    /// Where the value comes from, for people; a cell used twice is named once.
    #[must_use]
    pub fn source(&self) -> String {
        let mut cells: Vec<String> = Vec::new();
        for cell in &self.cells {
            let text = cell.to_string();
            if !cells.contains(&text) {
                cells.push(text);
            }
        }
        cells.join("; ")
    }
}

/// `6/tpr.csv, depth_cm 8 to 10, side_cm 10 to 12 (1.074 1.069 | 1 1)`: the values of the
/// lower row in both columns, after the bar those of the upper row; with a monotone cubic
/// its slopes in the same order.
impl fmt::Display for Cell {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let span = |(low, high): (f64, f64)| {
            if low == high {
                format!("{low}")
            } else {
                format!("{low} to {high}")
            }
        };
        write!(out, "{}, {} {}", self.table, self.row_name, span(self.rows))?;
        if let Some(columns) = self.columns {
            write!(out, ", {} {}", self.column_name, span(columns))?;
        }
        let across = self.columns.is_some_and(|(low, high)| low != high);
        let row = |[low, high]: [f64; 2]| {
            if across {
                format!("{low} {high}")
            } else {
                format!("{low}")
            }
        };
        let [lower, upper] = self.corners;
        if self.rows.0 == self.rows.1 {
            return write!(out, " ({})", row(lower));
        }
        write!(out, " ({} | {}", row(lower), row(upper))?;
        if let Some([lower, upper]) = self.slopes {
            let row = |slopes: [f64; 2]| row(slopes.map(to_slope_decimals));
            write!(out, "; slopes {} | {}", row(lower), row(upper))?;
        }
        write!(out, ")")
    }
}

/// Six decimals: over a step of some centimetres the sixth does not move a TPR's fifth.
fn to_slope_decimals(slope: f64) -> f64 {
    (slope * 1e6).round() / 1e6
}

/// A position between two grid lines.
#[derive(Clone, Copy)]
struct Between {
    low: usize,
    high: usize,
    /// Share of the way from low to high.
    share: f64,
}

impl Grid {
    /// A table. `values` are row-major.
    ///
    /// # Errors
    /// When the shape is wrong, coordinates do not rise, or a number is not finite.
    pub fn new(
        name: impl Into<Arc<str>>,
        (row_name, rows): (&'static str, Vec<f64>),
        (column_name, columns): (&'static str, Vec<f64>),
        values: Vec<f64>,
        interpolation: DepthInterpolation,
    ) -> Result<Self, GridError> {
        let name = name.into();
        let table = || name.to_string();
        if rows.is_empty() || columns.is_empty() {
            return Err(GridError::Empty { table: table() });
        }
        if values.len() != rows.len() * columns.len() {
            return Err(GridError::Shape {
                table: table(),
                found: values.len(),
                rows: rows.len(),
                columns: columns.len(),
            });
        }
        let mut numbers = rows.iter().chain(&columns).chain(&values);
        if !numbers.all(|number| number.is_finite()) {
            return Err(GridError::NotFinite { table: table() });
        }
        for (axis, coordinates) in [(row_name, &rows), (column_name, &columns)] {
            if let Some(pair) = coordinates.windows(2).find(|pair| pair[0] >= pair[1]) {
                return Err(GridError::NotRising {
                    table: table(),
                    axis,
                    before: pair[0],
                    after: pair[1],
                });
            }
        }
        let slopes = match interpolation {
            DepthInterpolation::Linear => Vec::new(),
            DepthInterpolation::MonotoneCubic => column_slopes(&rows, columns.len(), &values),
        };
        Ok(Self {
            name,
            row_name,
            column_name,
            rows,
            columns,
            values,
            slopes,
        })
    }

    /// The table's name.
    #[must_use]
    pub fn name(&self) -> &str {
        &self.name
    }

    /// Name of the row coordinate.
    #[must_use]
    pub const fn row_name(&self) -> &'static str {
        self.row_name
    }

    /// Name of the column coordinate.
    #[must_use]
    pub const fn column_name(&self) -> &'static str {
        self.column_name
    }

    /// Row coordinates.
    #[must_use]
    pub fn rows(&self) -> &[f64] {
        &self.rows
    }

    /// Column coordinates.
    #[must_use]
    pub fn columns(&self) -> &[f64] {
        &self.columns
    }

    /// The value in row `row` and column `column`, by index.
    #[must_use]
    pub fn cell_value(&self, row: usize, column: usize) -> Option<f64> {
        if column >= self.columns.len() {
            return None;
        }
        self.values.get(row * self.columns.len() + column).copied()
    }

    /// The interpolated value and the cells used. With one column the column coordinate is not looked at.
    ///
    /// # Errors
    /// When a coordinate is outside the table or not a number.
    pub fn at(&self, row: f64, column: f64) -> Result<Lookup, OutOfRange> {
        let rows = self.between(self.row_name, &self.rows, row)?;
        let columns = if self.columns.len() == 1 {
            Between {
                low: 0,
                high: 0,
                share: 0.0,
            }
        } else {
            self.between(self.column_name, &self.columns, column)?
        };
        let low = self.down_column(columns.low, rows);
        let high = self.down_column(columns.high, rows);
        let four = |numbers: &[f64]| {
            [rows.low, rows.high].map(|row| {
                [columns.low, columns.high].map(|column| numbers[row * self.columns.len() + column])
            })
        };
        let cell = Cell {
            corners: four(&self.values),
            slopes: (!self.slopes.is_empty() && rows.low != rows.high).then(|| four(&self.slopes)),
            table: Arc::clone(&self.name),
            row_name: self.row_name,
            rows: (self.rows[rows.low], self.rows[rows.high]),
            column_name: self.column_name,
            columns: (self.columns.len() > 1)
                .then(|| (self.columns[columns.low], self.columns[columns.high])),
        };
        Ok(Lookup {
            value: low + (high - low) * columns.share,
            cells: vec![cell],
        })
    }

    /// The interpolated value alone, for sums that ask for it thousands of times.
    ///
    /// # Errors
    /// When a coordinate is outside the table or not a number.
    pub fn value(&self, row: f64, column: f64) -> Result<f64, OutOfRange> {
        let rows = self.between(self.row_name, &self.rows, row)?;
        if self.columns.len() == 1 {
            return Ok(self.down_column(0, rows));
        }
        let columns = self.between(self.column_name, &self.columns, column)?;
        let low = self.down_column(columns.low, rows);
        if columns.low == columns.high {
            return Ok(low);
        }
        let high = self.down_column(columns.high, rows);
        Ok(low + (high - low) * columns.share)
    }

    fn down_column(&self, column: usize, rows: Between) -> f64 {
        let width = self.columns.len();
        let low = self.values[rows.low * width + column];
        let high = self.values[rows.high * width + column];
        let t = rows.share;
        if self.slopes.is_empty() || rows.low == rows.high {
            return low + (high - low) * t;
        }
        let step = self.rows[rows.high] - self.rows[rows.low];
        let slope_low = self.slopes[rows.low * width + column] * step;
        let slope_high = self.slopes[rows.high * width + column] * step;
        let (t2, t3) = (t * t, t * t * t);
        low * (2.0 * t3 - 3.0 * t2 + 1.0)
            + slope_low * (t3 - 2.0 * t2 + t)
            + high * (3.0 * t2 - 2.0 * t3)
            + slope_high * (t3 - t2)
    }

    fn between(
        &self,
        axis: &'static str,
        coordinates: &[f64],
        value: f64,
    ) -> Result<Between, OutOfRange> {
        let (least, greatest) = (coordinates[0], coordinates[coordinates.len() - 1]);
        let edge = tolerance::TABLE_EDGE_CM;
        let inside = value >= least - edge && value <= greatest + edge;
        if !inside {
            return Err(OutOfRange {
                table: Arc::clone(&self.name),
                axis,
                value,
                least,
                greatest,
            });
        }
        let value = value.clamp(least, greatest);
        let high = coordinates.partition_point(|&line| line < value);
        let low = high.saturating_sub(1);
        if (coordinates[high] - value).abs() <= edge {
            return Ok(Between {
                low: high,
                high,
                share: 0.0,
            });
        }
        if (value - coordinates[low]).abs() <= edge {
            return Ok(Between {
                low,
                high: low,
                share: 0.0,
            });
        }
        let share = (value - coordinates[low]) / (coordinates[high] - coordinates[low]);
        Ok(Between { low, high, share })
    }
}

/// Slopes of the monotone cubic interpolant, column by column.
fn column_slopes(rows: &[f64], width: usize, values: &[f64]) -> Vec<f64> {
    let mut slopes = vec![0.0; values.len()];
    for column in 0..width {
        let values: Vec<f64> = values.iter().skip(column).step_by(width).copied().collect();
        for (row, slope) in monotone_slopes(rows, &values).into_iter().enumerate() {
            slopes[row * width + column] = slope;
        }
    }
    slopes
}

/// Slopes of the monotone cubic interpolant at its nodes (Fritsch & Carlson, SIAM J. Numer. Anal.
/// 17:238, 1980; interior slopes as the weighted harmonic mean, ends one-sided three-point, limited
/// to keep monotonicity). `places` rise; both slices are of one length.
pub(super) fn monotone_slopes(places: &[f64], values: &[f64]) -> Vec<f64> {
    let count = places.len();
    let mut slopes = vec![0.0; count];
    if count < 2 {
        return slopes;
    }
    let step = |node: usize| places[node + 1] - places[node];
    let secant = |node: usize| (values[node + 1] - values[node]) / step(node);
    if count == 2 {
        return vec![secant(0); 2];
    }
    for (node, slope) in slopes.iter_mut().enumerate().take(count - 1).skip(1) {
        let (before, after) = (secant(node - 1), secant(node));
        if before * after > 0.0 {
            let weight_before = 2.0 * step(node) + step(node - 1);
            let weight_after = step(node) + 2.0 * step(node - 1);
            *slope =
                (weight_before + weight_after) / (weight_before / before + weight_after / after);
        }
    }
    slopes[0] = end_slope(step(0), step(1), secant(0), secant(1));
    slopes[count - 1] = end_slope(
        step(count - 2),
        step(count - 3),
        secant(count - 2),
        secant(count - 3),
    );
    slopes
}

fn end_slope(step: f64, next_step: f64, secant: f64, next_secant: f64) -> f64 {
    let slope = ((2.0 * step + next_step) * secant - step * next_secant) / (step + next_step);
    if slope * secant <= 0.0 {
        0.0
    } else if secant * next_secant <= 0.0 && slope.abs() > 3.0 * secant.abs() {
        3.0 * secant
    } else {
        slope
    }
}
