//! Rules over off-axis ratios: range, fall of a beam without flattening filter,
//! single cells. That they are 1 on the axis the loader has seen to.

use super::ModelFinding;
use super::outlier;
use crate::beam_model::BeamModel;

/// Ratios of a flattened beam out to the radius of the largest square's side (common practice).
const FLAT_RANGE: (f64, f64) = (0.80, 1.10);

/// ... to this radius, cm; further out, towards the corners, beams and depths differ too much.
const FLAT_TO_CM: f64 = 15.0;

/// ... and to this depth, cm, below which the softening off the axis wins.
const FLAT_TO_DEPTH_CM: f64 = 25.0;

/// A ratio of a beam without flattening filter may rise outward by this before it is pointed out.
const RISE_LIMIT: f64 = 5e-3;

/// A cell stands out beyond this share; the largest in the AAPM TG-71 6 MV table is 0.5 %.
const CELL_LIMIT: f64 = 1e-2;

pub(super) fn check(beam: &BeamModel) -> Vec<ModelFinding> {
    let grid = &beam.off_axis.grid;
    let one_for_all = grid.columns().len() == 1;
    let flattened = beam.fluence_mode_ids.is_empty();
    let mut findings = Vec::new();
    let mut logarithms = Vec::new();
    for (row, &radius) in grid.rows().iter().enumerate() {
        for (column, &depth) in grid.columns().iter().enumerate() {
            let Some(ratio) = grid.cell_value(row, column) else {
                continue;
            };
            logarithms.push(ratio.ln());
            let place = (!one_for_all).then_some(depth);
            let (least, greatest) = FLAT_RANGE;
            let near = radius <= FLAT_TO_CM && (one_for_all || depth <= FLAT_TO_DEPTH_CM);
            if flattened && near && (ratio < least || ratio > greatest) {
                let limit = if ratio < least { least } else { greatest };
                findings.push(
                    ModelFinding::warning(format!(
                        "{ratio:.4} is outside the usual range {least} to {greatest} of a flattened beam"
                    ))
                    .measured(ratio)
                    .limit(limit)
                    .at(grid, radius, place),
                );
            }
            let inward = row
                .checked_sub(1)
                .and_then(|row| grid.cell_value(row, column));
            if let Some(inward) = inward
                && !flattened
                && ratio > inward * (1.0 + RISE_LIMIT)
            {
                findings.push(
                    ModelFinding::warning(format!(
                        "a beam without flattening filter falls off the axis, but {ratio:.4} follows {inward:.4}"
                    ))
                    .measured(ratio)
                    .limit(inward)
                    .at(grid, radius, place),
                );
            }
        }
    }
    let outliers = if one_for_all {
        outlier::in_curve(grid.rows(), &logarithms, CELL_LIMIT)
    } else {
        outlier::in_table(grid.rows(), grid.columns(), &logarithms, |_| CELL_LIMIT)
    };
    for outlier in outliers {
        let (Some(&radius), Some(&depth), Some(value)) = (
            grid.rows().get(outlier.row),
            grid.columns().get(outlier.column),
            grid.cell_value(outlier.row, outlier.column),
        ) else {
            continue;
        };
        let percent = 100.0 * outlier.residual;
        findings.push(
            ModelFinding::warning(format!(
                "the value {value:.4} stands out from its neighbours by {percent:+.1} %: a typing error?"
            ))
            .measured(percent)
            .limit(100.0 * CELL_LIMIT)
            .at(grid, radius, (!one_for_all).then_some(depth)),
        );
    }
    findings
}
