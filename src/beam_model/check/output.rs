//! Rules over Sc and Sp: they rise with the side, lie in a credible range, run
//! smoothly; Sp beside the published kernel. That they are 1 at 10 cm the
//! loader has seen to.

use super::ModelFinding;
use super::outlier;
use super::quality;
use crate::beam_model::kernel::PencilKernel;
use crate::beam_model::{BeamModel, Grid};

/// Sc from the smallest to the largest fields (common practice).
const SC_RANGE: (f64, f64) = (0.85, 1.10);

/// Sp from 3 to 40 cm at depths up to 10 cm: the published kernel gives 0.85 to 1.22 for the softest beams.
const SP_RANGE: (f64, f64) = (0.80, 1.25);

/// A point stands out beyond this share.
const POINT_LIMIT: f64 = 6e-3;

/// Falls with the side by less than this are rounding.
const FALL_LIMIT: f64 = 1.5e-3;

/// Sp beside the kernel; AAPM TG-71 6 MV lies within 1.1 %.
const KERNEL_LIMIT: f64 = 3e-2;

/// Shallower than this the kernel's phantom scatter does not hold, cm.
const KERNEL_FROM_CM: f64 = 5.0;

pub(super) fn check(beam: &BeamModel) -> Vec<ModelFinding> {
    let factors = &beam.output_factors;
    let mut findings = curve(&factors.sc, SC_RANGE);
    findings.extend(curve(&factors.sp, SP_RANGE));
    let d0_cm = beam.output.depth_cm;
    if d0_cm >= KERNEL_FROM_CM
        && let Some(kernel) = quality::tpr20_10(beam).and_then(PencilKernel::matching)
    {
        findings.extend(points(&factors.sp).into_iter().filter_map(|(side, sp)| {
            let expected = kernel.sp(side, d0_cm);
            ((sp / expected - 1.0).abs() > KERNEL_LIMIT).then(|| {
                ModelFinding::warning(format!(
                    "{sp:.4} differs by {:+.1} % from the published kernel for this beam quality",
                    100.0 * (sp / expected - 1.0)
                ))
                .measured(sp)
                .limit(expected)
                .at(&factors.sp, side, None)
            })
        }));
    }
    findings
}

fn points(grid: &Grid) -> Vec<(f64, f64)> {
    let rows = grid.rows().iter().enumerate();
    rows.filter_map(|(row, &side)| Some((side, grid.cell_value(row, 0)?)))
        .collect()
}

fn curve(grid: &Grid, (least, greatest): (f64, f64)) -> Vec<ModelFinding> {
    let points = points(grid);
    let mut findings = Vec::new();
    for &(side, value) in &points {
        if value < least || value > greatest {
            let limit = if value < least { least } else { greatest };
            findings.push(
                ModelFinding::warning(format!(
                    "{value:.4} is outside the usual range {least} to {greatest}"
                ))
                .measured(value)
                .limit(limit)
                .at(grid, side, None),
            );
        }
    }
    for (&(_, before), &(side, after)) in points.iter().zip(points.iter().skip(1)) {
        if after < before * (1.0 - FALL_LIMIT) {
            findings.push(
                ModelFinding::warning(format!(
                    "must rise with the side, but {after:.4} follows {before:.4}"
                ))
                .measured(after)
                .limit(before)
                .at(grid, side, None),
            );
        }
    }
    let logarithms = |pick: fn(&(f64, f64)) -> f64| -> Vec<f64> {
        points.iter().map(|point| pick(point).ln()).collect()
    };
    let (sides, values) = (logarithms(|point| point.0), logarithms(|point| point.1));
    for outlier in outlier::in_curve(&sides, &values, POINT_LIMIT) {
        let Some(&(side, value)) = points.get(outlier.row) else {
            continue;
        };
        let percent = 100.0 * outlier.residual;
        findings.push(
            ModelFinding::warning(format!(
                "the value {value:.4} stands out from its neighbours by {percent:+.1} %: a typing error?"
            ))
            .measured(percent)
            .limit(100.0 * POINT_LIMIT)
            .at(grid, side, None),
        );
    }
    findings
}
