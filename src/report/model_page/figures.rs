//! Which curves of a beam are drawn, and from which look-ups. How they are
//! drawn is for `curves`.

use super::curves::{Axis, Curve, Plot, draw};
use super::wedges;
use crate::beam_model::{BeamModel, Grid, OffAxisKind, TableKind};
use crate::report::number::short;

/// A drawing with its caption.
pub(super) struct Figure {
    pub(super) caption: String,
    pub(super) svg: String,
}

/// So many columns of a table are drawn, spread over it, with the first and last.
const CURVES: usize = 6;

/// Points of a curve between its ends.
const STEPS: u32 = 160;

/// Depth table, output factors, off-axis ratios and wedges of a beam; `number` makes the drawings' ids unique.
pub(super) fn of_beam(beam: &BeamModel, number: usize) -> Vec<Figure> {
    let table = &beam.depth_table;
    let (what, unit) = match beam.table_kind {
        TableKind::Tpr => ("TPR", "TPR"),
        TableKind::Pdd { .. } => ("PDD", "PDD, per cent of d0"),
    };
    let factors = &beam.output_factors;
    let kind = match beam.off_axis.kind {
        OffAxisKind::InAir => "in air",
        OffAxisKind::InWater => "in water",
    };
    let plots = [
        (
            format!(
                "{what} by depth, for sides in cm; dots are the table's own values ({})",
                table.name()
            ),
            table_plot(table, ["depth, cm", unit]),
        ),
        (
            "Output factors by side; Sc at the isocentre plane, Sp at d0".to_owned(),
            Plot {
                x: Axis("side, cm".to_owned()),
                y: Axis("factor".to_owned()),
                curves: [("Sc", &factors.sc), ("Sp", &factors.sp)]
                    .into_iter()
                    .map(|(name, grid)| curve(grid, 0, name.to_owned()))
                    .collect(),
            },
        ),
        (
            format!(
                "Off-axis ratio {kind} by radius at the isocentre plane, for depths in cm ({})",
                beam.off_axis.grid.name()
            ),
            table_plot(&beam.off_axis.grid, ["radius, cm", "ratio"]),
        ),
    ];
    plots
        .into_iter()
        .chain(wedges::plots(beam))
        .enumerate()
        .map(|(index, (caption, plot))| Figure {
            svg: draw(&plot, &format!("beam-{number}-{index}"), &caption),
            caption,
        })
        .collect()
}

fn table_plot(grid: &Grid, [x, y]: [&str; 2]) -> Plot {
    let columns = grid.columns();
    let chosen: Vec<usize> = if columns.len() <= CURVES {
        (0..columns.len()).collect()
    } else {
        let last = columns.len() - 1;
        (0..CURVES)
            .map(|index| (index * last + (CURVES - 1) / 2) / (CURVES - 1))
            .collect()
    };
    let curves = chosen.into_iter().filter_map(|column| {
        let label = columns.get(column)?;
        let label = if columns.len() == 1 {
            "any".to_owned()
        } else {
            short(*label, 2)
        };
        Some(curve(grid, column, label))
    });
    Plot {
        x: Axis(x.to_owned()),
        y: Axis(y.to_owned()),
        curves: curves.collect(),
    }
}

/// One column, as the program interpolates it, with its own values as dots.
pub(super) fn curve(grid: &Grid, column: usize, label: String) -> Curve {
    let rows = grid.rows();
    let at = grid.columns().get(column).copied().unwrap_or(0.0);
    let (first, last) = (
        rows.first().copied().unwrap_or(0.0),
        rows.last().copied().unwrap_or(0.0),
    );
    let mut places: Vec<f64> = (0..=STEPS)
        .map(|step| first + (last - first) * f64::from(step) / f64::from(STEPS))
        .chain(rows.iter().copied())
        .collect();
    places.sort_by(f64::total_cmp);
    let line = places
        .into_iter()
        .filter_map(|row| Some([row, grid.at(row, at).ok()?.value]));
    let dots = rows
        .iter()
        .enumerate()
        .filter_map(|(row, &place)| Some([place, grid.cell_value(row, column)?]));
    Curve {
        label,
        line: line.collect(),
        dots: dots.collect(),
    }
}
