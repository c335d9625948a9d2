//! The kernel of one beam at every depth of its table, worked out when a depth
//! is first asked for, and its value between two depths.

use std::sync::OnceLock;

use super::quadrant::{Corners, Place, Quadrants};
use super::{RadialDose, ScatterRow};
use crate::beam_model::{BeamModel, OutOfRange, TableKind};
use crate::quantity::PointSquare;

/// Side that the depth interpolation is held to, cm.
const REFERENCE_SIDE_CM: f64 = 10.0;

/// Fewer squares than this do not tell scatter from primary.
const LEAST_SQUARES: usize = 4;

/// The kernel of one beam.
#[derive(Debug, Default)]
pub struct ScatterKernel {
    rows: Vec<Row>,
}

#[derive(Debug)]
struct Row {
    depth_cm: f64,
    made: OnceLock<Option<MadeRow>>,
}

#[derive(Debug)]
struct MadeRow {
    radial: RadialDose,
    quadrants: Quadrants,
    /// Sides that the squares cover, cm.
    sides_cm: (f64, f64),
    /// The table's dose of the reference square.
    reference: f64,
}

/// Why a kernel cannot be had at a depth.
#[derive(Clone, Debug, PartialEq)]
pub enum NoKernel {
    /// The depth is outside the table.
    Range(OutOfRange),
    /// Too few squares of the table reach this depth, cm.
    Squares(f64),
}

impl ScatterKernel {
    /// A kernel whose depths are not yet worked out.
    pub(in crate::beam_model) fn new(depths_cm: &[f64]) -> Self {
        let rows = depths_cm.iter().map(|&depth_cm| Row {
            depth_cm,
            made: OnceLock::new(),
        });
        Self {
            rows: rows.collect(),
        }
    }

    /// The depths at which the kernel can be had, with the squares that it was made from.
    pub(in crate::beam_model) fn rows<'a>(
        &'a self,
        beam: &'a BeamModel,
    ) -> impl Iterator<Item = ScatterRow<'a>> {
        self.rows.iter().filter_map(move |row| {
            let made = row
                .made
                .get_or_init(|| MadeRow::new(beam, row.depth_cm))
                .as_ref()?;
            let squares = sides_at(beam, row.depth_cm).into_iter();
            Some(ScatterRow {
                depth_cm: row.depth_cm,
                squares: squares
                    .filter_map(|side_cm| {
                        Some((side_cm, square_dose(beam, row.depth_cm, side_cm).ok()?))
                    })
                    .collect(),
                radial: &made.radial,
            })
        })
    }

    /// The kernel at a depth, cm, for the beam that it belongs to.
    pub(in crate::beam_model) fn at<'a>(
        &'a self,
        beam: &BeamModel,
        depth_cm: f64,
    ) -> Result<ScatterAtDepth<'a>, NoKernel> {
        let reference = square_dose(beam, depth_cm, REFERENCE_SIDE_CM).map_err(NoKernel::Range)?;
        let above = self
            .rows
            .partition_point(|row| row.depth_cm < depth_cm)
            .min(self.rows.len().saturating_sub(1));
        let below = above.saturating_sub(1);
        let made = |index: usize| {
            let row = self.rows.get(index)?;
            row.made
                .get_or_init(|| MadeRow::new(beam, row.depth_cm))
                .as_ref()
        };
        let (Some(low), Some(high)) = (made(below), made(above)) else {
            return Err(NoKernel::Squares(depth_cm));
        };
        let (low_cm, high_cm) = (self.rows[below].depth_cm, self.rows[above].depth_cm);
        let share = if high_cm > low_cm {
            ((depth_cm - low_cm) / (high_cm - low_cm)).clamp(0.0, 1.0)
        } else {
            1.0
        };
        Ok(ScatterAtDepth {
            low,
            high,
            share,
            scale: reference / (low.reference + (high.reference - low.reference) * share),
        })
    }
}

/// T(d, s) = TPR(d, s) Sp(s): dose on the axis of a square per unit in-air fluence.
fn square_dose(beam: &BeamModel, depth_cm: f64, side_cm: f64) -> Result<f64, OutOfRange> {
    // A TPR table gives both at once; a depth dose goes by the conversion.
    if let TableKind::Tpr = beam.table_kind {
        let tpr = beam.depth_table.value(depth_cm, side_cm)?;
        return Ok(tpr * beam.output_factors.sp.value(side_cm, 0.0)?);
    }
    let square = PointSquare::new(side_cm);
    Ok(beam.tpr(depth_cm, square)?.value * beam.sp(square)?.value)
}

/// Sides at the point's plane that the depth table holds at a depth, cm.
fn sides_at(beam: &BeamModel, depth_cm: f64) -> Vec<f64> {
    let scale = match beam.table_kind {
        TableKind::Tpr => 1.0,
        TableKind::Pdd { ssd_cm } => (ssd_cm + depth_cm) / ssd_cm,
    };
    let columns = beam.depth_table.columns().iter();
    let mut sides_cm: Vec<f64> = columns.map(|side_cm| side_cm * scale).collect();
    // A depth dose widens with depth and may outgrow the output factors; their own ends are then reached too.
    let output = beam.output_factors.sp.rows();
    sides_cm.extend(output.first());
    sides_cm.extend(output.last());
    sides_cm.retain(|&side_cm| square_dose(beam, depth_cm, side_cm).is_ok());
    sides_cm.sort_by(f64::total_cmp);
    // Two nearly equal sides would turn rounding into slope.
    sides_cm.dedup_by(|after, before| *after < *before * 1.05);
    sides_cm
}

impl MadeRow {
    fn new(beam: &BeamModel, depth_cm: f64) -> Option<Self> {
        let sides_cm = sides_at(beam, depth_cm);
        if sides_cm.len() < LEAST_SQUARES {
            return None;
        }
        let doses: Vec<f64> = sides_cm
            .iter()
            .map(|&side_cm| square_dose(beam, depth_cm, side_cm))
            .collect::<Result<_, _>>()
            .ok()?;
        let radial = RadialDose::from_squares(&sides_cm, &doses, beam.penumbra);
        Some(Self {
            quadrants: Quadrants::new(&radial),
            radial,
            sides_cm: (*sides_cm.first()?, *sides_cm.last()?),
            reference: square_dose(beam, depth_cm, REFERENCE_SIDE_CM).ok()?,
        })
    }
}

/// The kernel at one depth: linear between the table's neighbouring depths, scaled so that the 10 cm
/// square is exactly what the table's own interpolation says.
#[derive(Clone, Copy, Debug)]
pub struct ScatterAtDepth<'a> {
    low: &'a MadeRow,
    high: &'a MadeRow,
    share: f64,
    scale: f64,
}

impl ScatterAtDepth<'_> {
    fn between(&self, value: impl Fn(&MadeRow) -> f64) -> f64 {
        let low = value(self.low);
        if self.share == 0.0 {
            return low * self.scale;
        }
        (low + (value(self.high) - low) * self.share) * self.scale
    }

    /// K(d, 0): the dose by the primary of unit in-air fluence.
    #[must_use]
    pub fn primary(&self) -> f64 {
        self.between(|row| row.radial.at(0.0))
    }

    /// K(d, r) on the axis of a circular field, radius in cm in the plane of the point.
    #[must_use]
    pub fn circle(&self, radius_cm: f64) -> f64 {
        self.between(|row| row.radial.at(radius_cm))
    }

    /// T(d, s) on the axis of a square field, side in cm in the plane of the point.
    #[must_use]
    pub fn square(&self, side_cm: f64) -> f64 {
        self.between(|row| row.radial.square(side_cm))
    }

    /// Scatter at the point from a rectangle of unit in-air fluence; x1 .. x2, y1 .. y2 in cm from the point, in its plane.
    #[must_use]
    #[inline]
    pub fn rectangle(&self, x_cm: [f64; 2], y_cm: [f64; 2]) -> f64 {
        let mut sum = self.sum();
        sum.add(x_cm.map(Place::of), y_cm.map(Place::of), [1.0, 0.0]);
        let [scatter, _] = sum.totals();
        scatter
    }

    /// An empty sum of rectangles.
    #[must_use]
    pub fn sum(&self) -> ScatterSum<'_> {
        ScatterSum {
            kernel: self,
            sums: [[[0.0; 4]; 2]; 2],
        }
    }

    /// Beyond this distance from the point nothing was measured, cm: corners of the largest square.
    #[must_use]
    pub fn reach_cm(&self) -> f64 {
        self.low.radial.reach_cm.min(self.high.radial.reach_cm)
    }

    /// Sides that the tables hold at both neighbouring depths, cm.
    #[must_use]
    pub fn sides_cm(&self) -> (f64, f64) {
        let (low, high) = (self.low.sides_cm, self.high.sides_cm);
        (low.0.max(high.0), low.1.min(high.1))
    }

    /// Side of the square whose scatter-to-primary ratio this is, cm; bounded by 0 and the largest square.
    #[must_use]
    pub fn side_with_scatter(&self, scatter_to_primary: f64) -> f64 {
        let primary = self.primary();
        let wanted = primary * (1.0 + scatter_to_primary);
        let (mut low_cm, mut high_cm) = (0.0, self.sides_cm().1);
        for _ in 0..40 {
            let middle_cm = f64::midpoint(low_cm, high_cm);
            if self.square(middle_cm) < wanted {
                low_cm = middle_cm;
            } else {
                high_cm = middle_cm;
            }
        }
        f64::midpoint(low_cm, high_cm)
    }
}

/// Scatter at the point from many rectangles, each with two in-air fluences (through the opening and through what
/// shields it, say), which are summed apart.
#[derive(Clone, Debug)]
pub struct ScatterSum<'k> {
    kernel: &'k ScatterAtDepth<'k>,
    /// By depth and fluence, each still in four parts.
    sums: [[[f64; 4]; 2]; 2],
}

impl ScatterSum<'_> {
    /// Adds a rectangle by the places of its lower and upper edges along x and y.
    #[inline(always)]
    pub fn add(&mut self, x: [Place; 2], y: [Place; 2], fluences: [f64; 2]) {
        let corners = Corners::of(x, y);
        for (sums, row) in self
            .sums
            .iter_mut()
            .zip([self.kernel.low, self.kernel.high])
        {
            let parts = row.quadrants.over(&corners);
            for (sum, fluence) in sums.iter_mut().zip(fluences) {
                *sum = std::array::from_fn(|at| sum[at] + parts[at] * fluence);
            }
        }
    }

    /// The scatter by each of the two fluences.
    #[must_use]
    pub fn totals(&self) -> [f64; 2] {
        let total = |[a, b, c, d]: [f64; 4]| (a + d) + (b + c);
        let [low, high] = self.sums.map(|sums| sums.map(total));
        [0, 1].map(|fluence| {
            (low[fluence] + (high[fluence] - low[fluence]) * self.kernel.share) * self.kernel.scale
        })
    }
}
