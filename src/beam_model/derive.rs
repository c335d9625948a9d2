//! A depth table in the other form: TPR from PDD and PDD from TPR, cell by
//! cell through the same look-ups that an audit uses. Writing files is for the
//! callers.

use std::fmt::Write as _;

use super::{BeamModel, OutOfRange, TableKind};
use crate::quantity::{PointSquare, SurfaceSquare};

/// A depth table that was worked out from another.
#[derive(Clone, Debug, PartialEq)]
pub struct DerivedTable {
    /// What it holds, normalised at the beam's d0.
    pub kind: TableKind,
    /// Depths down, cm.
    pub depths_cm: Vec<f64>,
    /// Sides across, cm: at the point for TPR, at the surface for PDD.
    pub sides_cm: Vec<f64>,
    /// Row-major: TPR as a share, PDD in per cent.
    pub values: Vec<f64>,
}

/// Derives a table of another kind at the depths and sides wanted.
///
/// # Errors
/// At the first cell that the measured tables do not reach: nothing is extrapolated.
pub fn derive_table(
    beam: &BeamModel,
    kind: TableKind,
    depths_cm: &[f64],
    sides_cm: &[f64],
) -> Result<DerivedTable, OutOfRange> {
    let mut values = Vec::with_capacity(depths_cm.len() * sides_cm.len());
    for &depth_cm in depths_cm {
        for &side_cm in sides_cm {
            values.push(cell(beam, kind, depth_cm, side_cm)?);
        }
    }
    Ok(DerivedTable {
        kind,
        depths_cm: depths_cm.to_vec(),
        sides_cm: sides_cm.to_vec(),
        values,
    })
}

/// The beam's own depths, and those of its own sides for which every depth can be derived.
#[must_use]
pub fn derivable_grid(beam: &BeamModel, kind: TableKind) -> (Vec<f64>, Vec<f64>) {
    let depths_cm = beam.depth_table.rows().to_vec();
    let all_depths = |side_cm: &f64| {
        depths_cm
            .iter()
            .all(|&depth_cm| cell(beam, kind, depth_cm, *side_cm).is_ok())
    };
    let sides_cm = beam.depth_table.columns().iter().copied();
    let sides_cm = sides_cm.filter(all_depths).collect();
    (depths_cm, sides_cm)
}

fn cell(beam: &BeamModel, kind: TableKind, depth_cm: f64, side_cm: f64) -> Result<f64, OutOfRange> {
    let found = match kind {
        TableKind::Tpr => beam.tpr(depth_cm, PointSquare::new(side_cm))?,
        TableKind::Pdd { ssd_cm } => {
            beam.pdd_percent(depth_cm, SurfaceSquare::new(side_cm), ssd_cm)?
        }
    };
    Ok(found.value)
}

impl DerivedTable {
    /// The table as a model's CSV file, comments first, each on its own line.
    #[must_use]
    pub fn to_csv(&self, comments: &[&str]) -> String {
        let decimals = match self.kind {
            TableKind::Tpr => 5,
            TableKind::Pdd { .. } => 3,
        };
        let mut text = String::new();
        for line in comments.iter().flat_map(|comment| comment.lines()) {
            let _ = writeln!(text, "# {line}");
        }
        text.push_str("depth_cm");
        for side_cm in &self.sides_cm {
            let _ = write!(text, ",{side_cm}");
        }
        text.push('\n');
        let rows = self.values.chunks(self.sides_cm.len().max(1));
        for (depth_cm, row) in self.depths_cm.iter().zip(rows) {
            let _ = write!(text, "{depth_cm}");
            for value in row {
                let _ = write!(text, ",{value:.decimals$}");
            }
            text.push('\n');
        }
        text
    }
}
