//! Rules over the shape of a depth table: normalisation, place of the maximum,
//! fall with depth, trend with the side. Single cells are for `depth_cells`.

use super::ModelFinding;
use crate::beam_model::{BeamModel, Grid, TableKind};

/// Rounding of a table to three decimals, with room.
const NORM_LIMIT: f64 = 1e-3;

/// A trend with the side may be broken by this share before it is pointed out: the AAPM TG-71 6 MV
/// table, printed to three decimals, breaks it by 0.4 %.
const TREND_LIMIT: f64 = 5e-3;

pub(super) fn check(beam: &BeamModel) -> Vec<ModelFinding> {
    let mut findings = Vec::new();
    findings.extend(norm(beam));
    findings.extend(maximum(beam));
    findings.extend(fall(beam));
    findings.extend(trend(beam));
    findings
}

/// The value that stands for all of the dose at the normalisation depth.
fn full(beam: &BeamModel) -> f64 {
    match beam.table_kind {
        TableKind::Tpr => 1.0,
        TableKind::Pdd { .. } => 100.0,
    }
}

/// A coordinate by index, NaN where there is none.
pub(super) fn coordinate(from: &[f64], index: usize) -> f64 {
    from.get(index).copied().unwrap_or(f64::NAN)
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
