//! Rules over a depth table: normalisation, place of the maximum, fall with
//! depth, trend with the side, single cells, the published kernel as a band.

use super::ModelFinding;
use super::outlier::{self, Outlier};
use super::quality;
use crate::beam_model::kernel::PencilKernel;
use crate::beam_model::{BeamModel, Grid, TableKind};

/// Rounding of a table to three decimals, with room.
const NORM_LIMIT: f64 = 1e-3;

/// A trend with the side may be broken by this share before it is pointed out: the AAPM TG-71 6 MV
/// table, printed to three decimals, breaks it by 0.4 %.
const TREND_LIMIT: f64 = 5e-3;

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
    findings.extend(norm(beam));
    findings.extend(maximum(beam));
    findings.extend(fall(beam));
    findings.extend(trend(beam));
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

fn full(beam: &BeamModel) -> f64 {
    match beam.table_kind {
        TableKind::Tpr => 1.0,
        TableKind::Pdd { .. } => 100.0,
    }
}

fn coordinate(from: &[f64], index: usize) -> f64 {
    from.get(index).copied().unwrap_or(f64::NAN)
}

fn shown(table: &Grid, row: usize, column: usize) -> String {
    table
        .cell_value(row, column)
        .map_or_else(String::new, |value| format!("{value:.4}"))
}

/// Each column with its side.
fn columns(table: &Grid) -> impl Iterator<Item = (f64, Vec<(f64, f64)>)> {
    table.columns().iter().enumerate().map(|(column, &side)| {
        let values = table.rows().iter().enumerate();
        let values =
            values.filter_map(|(row, &depth)| Some((depth, table.cell_value(row, column)?)));
        (side, values.collect())
    })
}

fn norm(beam: &BeamModel) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let d0_cm = beam.output.depth_cm;
    let found = table.columns().iter().filter_map(|&side| {
        let share = table.at(d0_cm, side).ok()?.value / full(beam);
        ((share - 1.0).abs() > NORM_LIMIT).then(|| {
            ModelFinding::warning(format!(
                "{share:.4} of full at the normalisation depth, where it must be 1"
            ))
            .measured(share)
            .limit(1.0)
            .at(table, d0_cm, Some(side))
        })
    });
    found.collect()
}

fn maximum(beam: &BeamModel) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let stated_cm = beam.d_max_cm;
    let mut findings = Vec::new();
    let mut deepest_cm = 0.0_f64;
    for (side, values) in columns(table) {
        let Some(&(depth_cm, _)) = values.iter().max_by(|one, other| one.1.total_cmp(&other.1))
        else {
            continue;
        };
        deepest_cm = deepest_cm.max(depth_cm);
        if depth_cm > stated_cm + 1e-9 {
            findings.push(
                ModelFinding::error(format!(
                    "the maximum lies deeper than the stated d_max of {stated_cm} cm, so points of the build-up would pass for verifiable"
                ))
                .measured(depth_cm)
                .limit(stated_cm)
                .at(table, depth_cm, Some(side)),
            );
        }
    }
    if deepest_cm + 1.0 < stated_cm {
        findings.push(
            ModelFinding::warning(format!(
                "the stated d_max of {stated_cm} cm is more than 1 cm deeper than the deepest maximum of the table"
            ))
            .measured(deepest_cm)
            .limit(stated_cm)
            .in_table(table),
        );
    }
    if let Some(&first_cm) = table.rows().first()
        && first_cm >= stated_cm
    {
        findings.push(
            ModelFinding::note(format!(
                "the table begins at {first_cm} cm, so the stated d_max of {stated_cm} cm cannot be confirmed from it"
            ))
            .in_table(table),
        );
    }
    findings
}

fn fall(beam: &BeamModel) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let mut findings = Vec::new();
    for (side, values) in columns(table) {
        let beyond = || values.iter().filter(|(depth, _)| *depth >= beam.d_max_cm);
        for (&(_, before), &(depth, after)) in beyond().zip(beyond().skip(1)) {
            if after >= before {
                findings.push(
                    ModelFinding::error(format!(
                        "beyond d_max the dose must fall with depth, but {after:.4} follows {before:.4}"
                    ))
                    .measured(after)
                    .limit(before)
                    .at(table, depth, Some(side)),
                );
            }
        }
    }
    findings
}

/// More side, more scatter: below d0 a table normalised at d0 rises with the side. Above d0, by the same reason, it falls.
/// In the build-up both can be.
fn trend(beam: &BeamModel) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let d0_cm = beam.output.depth_cm;
    let mut findings = Vec::new();
    for (row, &depth) in table.rows().iter().enumerate() {
        let (sign, word) = if depth > d0_cm {
            (1.0, "rise")
        } else if depth < d0_cm && depth >= beam.d_max_cm {
            (-1.0, "fall")
        } else {
            continue;
        };
        let sides = table.columns().iter().enumerate();
        for (column, &side) in sides.skip(1) {
            let (Some(before), Some(here)) = (
                table.cell_value(row, column - 1),
                table.cell_value(row, column),
            ) else {
                continue;
            };
            let wrong_way = -sign * (here / before - 1.0);
            if wrong_way > TREND_LIMIT {
                findings.push(
                    ModelFinding::warning(format!(
                        "at this depth the values must {word} with the side, but {here:.4} follows {before:.4}"
                    ))
                    .measured(here)
                    .limit(before)
                    .at(table, depth, Some(side)),
                );
            }
        }
    }
    findings
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
    let mut ratios = Vec::new();
    for (row, &depth) in table.rows().iter().enumerate().skip(first) {
        for (column, &side) in table.columns().iter().enumerate() {
            let expected = match beam.table_kind {
                TableKind::Tpr => kernel.tpr(depth, side, common_cm),
                TableKind::Pdd { ssd_cm } => kernel.pdd_percent(depth, side, (ssd_cm, common_cm)),
            };
            let common = table
                .at(common_cm, side)
                .map_or(f64::NAN, |found| found.value);
            let here = table.cell_value(row, column).unwrap_or(f64::NAN);
            ratios.push((here / common * full(beam) / expected).ln());
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
        "beside the published kernel for this beam quality the largest difference is {percent:+.1} % ({outside} of {} cells beyond {:.0} %)",
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
