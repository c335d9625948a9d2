//! Cells and rows of a depth table that stand out, and the published kernel as
//! a band around it. Rules over its shape are for `depth_table`.

use super::ModelFinding;
use super::depth_table::coordinate;
use super::outlier::{self, Outlier};
use super::quality;
use crate::beam_model::kernel::PencilKernel;
use crate::beam_model::{BeamModel, Grid, TableKind};

/// A cell stands out beyond this share. The largest in the AAPM TG-71 6 MV tables is 0.7 %.
const CELL_LIMIT: f64 = 1e-2;

/// In the build-up the tables bend more, and no beam is verified there.
const BUILD_UP_CELL_LIMIT: f64 = 3e-2;

/// Beyond this share a cell that stands out is an error.
const CELL_ERROR: f64 = 3e-2;

/// Band of the kernel around a clinic's tables, a share. The AAPM TG-71 6 MV TPR table lies within -1.7 to +0.9 %.
const KERNEL_LIMIT: f64 = 3e-2;

/// The kernel is compared from this depth, and this far below d_max, cm: it is not valid in the build-up.
const KERNEL_FROM_CM: f64 = 3.0;
const KERNEL_BELOW_D_MAX_CM: f64 = 1.5;

pub(super) fn check(beam: &BeamModel) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let mut findings = Vec::new();
    let ratios = quality::tpr20_10(beam)
        .and_then(PencilKernel::matching)
        .map(|kernel| kernel_ratios(beam, &kernel));
    findings.extend(cells(beam, ratios.as_ref()).into_iter().map(|outlier| {
        let row = coordinate(table.rows(), outlier.row);
        let column = coordinate(table.columns(), outlier.column);
        let percent = 100.0 * outlier.residual;
        let message = format!(
            "the value {} stands out from its neighbours by {percent:+.1} %: a typing error?",
            shown(table, outlier.row, outlier.column)
        );
        let finding = if outlier.residual.abs() > CELL_ERROR && row >= beam.d_max_cm {
            ModelFinding::error(message)
        } else {
            ModelFinding::warning(message)
        };
        finding
            .measured(percent)
            .limit(100.0 * cell_limit(beam, row))
            .at(table, row, Some(column))
    }));
    if let Some(ratios) = ratios {
        findings.extend(rows(beam, &ratios));
        findings.extend(band(beam, &ratios));
    }
    findings
}

/// The logarithm of table over kernel, row-major, from the first row where the kernel is valid.
struct KernelRatios {
    first_row: usize,
    logarithms: Vec<f64>,
}

fn shown(table: &Grid, row: usize, column: usize) -> String {
    table
        .cell_value(row, column)
        .map_or_else(String::new, |value| format!("{value:.4}"))
}

fn kernel_from_cm(beam: &BeamModel) -> f64 {
    KERNEL_FROM_CM.max(beam.d_max_cm + KERNEL_BELOW_D_MAX_CM)
}

fn cell_limit(beam: &BeamModel, depth_cm: f64) -> f64 {
    if depth_cm < beam.d_max_cm {
        BUILD_UP_CELL_LIMIT
    } else {
        CELL_LIMIT
    }
}

/// Single cells, by two smooth quantities: the logarithm relative to the mean of its row, at every depth; and the
/// logarithm of the ratio to the kernel, where that is valid.
fn cells(beam: &BeamModel, ratios: Option<&KernelRatios>) -> Vec<Outlier> {
    let table = &beam.depth_table;
    let logarithm_of_side: Vec<f64> = table.columns().iter().map(|side| side.ln()).collect();
    let width = table.columns().len();
    let logarithms: Vec<f64> = (0..table.rows().len() * width)
        .filter_map(|index| table.cell_value(index / width, index % width))
        .map(f64::ln)
        .collect();
    let relative: Vec<f64> = logarithms
        .chunks(width)
        .flat_map(|row| {
            // The mean and not the median: a wrong cell in the middle column would shift a median onto another column.
            let mean = row.iter().sum::<f64>() / width as f64;
            row.iter().map(move |value| value - mean)
        })
        .collect();
    let limit = |depth_cm| cell_limit(beam, depth_cm);
    let mut found = outlier::in_table(table.rows(), &logarithm_of_side, &relative, limit);
    if let Some(KernelRatios {
        first_row: first,
        logarithms: ratios,
    }) = ratios
    {
        let rows = table.rows().get(*first..).unwrap_or_default();
        for mut outlier in outlier::in_table(rows, &logarithm_of_side, ratios, limit) {
            outlier.row += *first;
            let known =
                |other: &Outlier| (other.row, other.column) == (outlier.row, outlier.column);
            if !found.iter().any(known) {
                found.push(outlier);
            }
        }
    }
    found.sort_by_key(|outlier| (outlier.row, outlier.column));
    found
}

fn kernel_ratios(beam: &BeamModel, kernel: &PencilKernel) -> KernelRatios {
    let table = &beam.depth_table;
    let d0_cm = beam.output.depth_cm;
    let from_cm = kernel_from_cm(beam);
    let first = table.rows().partition_point(|&depth| depth < from_cm);
    // With d0 itself in the build-up of the kernel, only the shape below counts: take 10 cm as the common depth.
    let common_cm = if d0_cm >= from_cm { d0_cm } else { 10.0 };
    let kernel_dose = |depth: f64, side: f64| match beam.table_kind {
        TableKind::Tpr => kernel.square_dose(side, depth),
        TableKind::Pdd { ssd_cm } => {
            let spd_cm = ssd_cm + depth;
            kernel.square_dose(side * spd_cm / ssd_cm, depth) / spd_cm.powi(2)
        }
    };
    let measured_at_common = |side| {
        table
            .at(common_cm, side)
            .map_or(f64::NAN, |found| found.value)
    };
    let common: Vec<f64> = table
        .columns()
        .iter()
        .map(|&side| measured_at_common(side) / kernel_dose(common_cm, side))
        .collect();
    let mut ratios = Vec::new();
    for (row, &depth) in table.rows().iter().enumerate().skip(first) {
        for (column, (&side, common)) in table.columns().iter().zip(&common).enumerate() {
            let measured = table.cell_value(row, column).unwrap_or(f64::NAN);
            ratios.push((measured / kernel_dose(depth, side) / common).ln());
        }
    }
    KernelRatios {
        first_row: first,
        logarithms: ratios,
    }
}

/// Whole rows that stand out, such as one typed under the wrong depth.
fn rows(beam: &BeamModel, ratios: &KernelRatios) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let depths = table.rows().get(ratios.first_row..).unwrap_or_default();
    let middles: Vec<f64> = ratios
        .logarithms
        .chunks(table.columns().len())
        .map(|row| outlier::median(row.to_vec()))
        .collect();
    outlier::in_curve(depths, &middles, CELL_LIMIT)
        .into_iter()
        .map(|outlier| {
            let percent = 100.0 * outlier.residual;
            ModelFinding::error(format!(
                "the whole row stands out from the rows beside it by {percent:+.1} %: a wrong depth?"
            ))
            .measured(percent)
            .limit(100.0 * CELL_LIMIT)
            .at(table, coordinate(depths, outlier.row), None)
        })
        .collect()
}

fn band(beam: &BeamModel, ratios: &KernelRatios) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let width = table.columns().len();
    let KernelRatios {
        first_row: first,
        logarithms: ratios,
    } = ratios;
    let outside = ratios
        .iter()
        .filter(|ratio| ratio.abs() > KERNEL_LIMIT)
        .count();
    let worst = ratios
        .iter()
        .enumerate()
        .max_by(|one, other| one.1.abs().total_cmp(&other.1.abs()));
    let Some((index, &ratio)) = worst else {
        return Vec::new();
    };
    let percent = 100.0 * ratio;
    let message = format!(
        "beside the published kernel for this beam quality the largest difference is {percent:+.2} % ({outside} of {} cells beyond {:.0} %)",
        ratios.len(),
        100.0 * KERNEL_LIMIT
    );
    let finding = if outside > 0 {
        ModelFinding::warning(message)
    } else {
        ModelFinding::note(message)
    };
    vec![finding.measured(percent).limit(100.0 * KERNEL_LIMIT).at(
        table,
        coordinate(table.rows(), first + index / width),
        Some(coordinate(table.columns(), index % width)),
    )]
}
