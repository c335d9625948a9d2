//! A beam's tables as grids: bounds of their values, normalisation to d0, and
//! what the formalism takes for granted (1 at d0, 1 at 10 cm, 1 on the axis).
//! Plausibility beyond that is for `check`.

use super::machine_file::{DepthTableEntry, NormalisedAt, ValuesIn};
use super::model_folder::ModelFolder;
use super::table_file::{Bounds, TableFile};
use super::{DepthInterpolation, Grid, ModelError, OffAxis, OffAxisKind, OutputTable, TableKind};
use crate::quantity::{Quantity, tolerance};

/// Side of the field that output factors are relative to, cm.
const REFERENCE_SIDE_CM: f64 = 10.0;

/// Sides of squares: no linac field is wider at any distance in use (common practice).
const SIDES_CM: Bounds = Bounds {
    least: 0.1,
    greatest: 100.0,
};
const RADII_CM: Bounds = Bounds {
    least: 0.0,
    greatest: 45.0,
};
/// Dose relative to that at d0 or at the maximum, as a share.
const RELATIVE_DOSE: Bounds = Bounds {
    least: 1e-4,
    greatest: 4.0,
};
const OUTPUT_FACTOR: Bounds = Bounds {
    least: 0.5,
    greatest: 1.5,
};
const OFF_AXIS_RATIO: Bounds = Bounds {
    least: 1e-3,
    greatest: 1.5,
};

fn depth_bounds() -> Bounds {
    let range = Quantity::Depth.range();
    Bounds {
        least: range.least,
        greatest: range.greatest,
    }
}

/// Reads a depth table and normalises it to 1 (TPR) or 100 (PDD) at d0.
pub(super) fn load_depth_table(
    files: &mut ModelFolder,
    entry: &DepthTableEntry,
    kind: TableKind,
    d0_cm: f64,
) -> Result<Grid, ModelError> {
    let table = TableFile::parse(
        &files.path(&entry.file),
        &files.read_text(&entry.file)?,
        "depth_cm",
    )?;
    table.bound_rows(depth_bounds())?;
    let sides = table.column_numbers(SIDES_CM)?;
    if sides.len() < 2 {
        // A single column would be taken for every field size.
        return Err(ModelError::whole_table(
            &table.path,
            "a depth table needs at least two field sides",
        ));
    }
    let unit = match entry.values_in {
        ValuesIn::Percent => 100.0,
        ValuesIn::Share => 1.0,
    };
    table.bound_values(Bounds {
        least: RELATIVE_DOSE.least * unit,
        greatest: RELATIVE_DOSE.greatest * unit,
    })?;
    let full = match kind {
        TableKind::Tpr => 1.0,
        TableKind::Pdd { .. } => 100.0,
    };
    let build = |values: Vec<f64>| depth_grid(&table, entry, &sides, values);
    let scaled = table.values.iter().map(|value| value / unit * full);
    let as_written = build(scaled.collect())?;
    let at_d0 = values_at_d0(&table, &as_written, d0_cm)?;
    match entry.normalised_at {
        NormalisedAt::D0 => {
            for (&side, &value) in sides.iter().zip(&at_d0) {
                refuse_other_norm(&table, (side, value / full), &format!("at d0 = {d0_cm} cm"))?;
            }
            Ok(as_written)
        }
        NormalisedAt::DMax => {
            for (column, &side) in sides.iter().enumerate() {
                let greatest = column_maximum(&as_written, column);
                refuse_other_norm(&table, (side, greatest / full), "at its maximum")?;
            }
            let width = sides.len();
            let renormalised = table.values.iter().enumerate().map(|(index, value)| {
                let here = at_d0.get(index % width).copied().unwrap_or(f64::NAN);
                value / unit * full / here * full
            });
            build(renormalised.collect())
        }
    }
}

fn depth_grid(
    table: &TableFile,
    entry: &DepthTableEntry,
    sides: &[f64],
    values: Vec<f64>,
) -> Result<Grid, ModelError> {
    Grid::new(
        entry.file.as_str(),
        ("depth_cm", table.rows.clone()),
        ("side_cm", sides.to_vec()),
        values,
        entry.interpolation,
    )
    .map_err(|source| ModelError::Grid {
        path: table.path.clone(),
        source,
    })
}

fn values_at_d0(table: &TableFile, grid: &Grid, d0_cm: f64) -> Result<Vec<f64>, ModelError> {
    grid.columns()
        .iter()
        .map(|&side| grid.at(d0_cm, side).map(|found| found.value))
        .collect::<Result<_, _>>()
        .map_err(|outside| {
            ModelError::whole_table(
                &table.path,
                format!("the table does not reach the normalisation depth: {outside}"),
            )
        })
}

fn column_maximum(grid: &Grid, column: usize) -> f64 {
    (0..grid.rows().len())
        .filter_map(|row| grid.cell_value(row, column))
        .fold(f64::NEG_INFINITY, f64::max)
}

/// A table whose stated normalisation does not hold would be wrong by that factor everywhere.
fn refuse_other_norm(
    table: &TableFile,
    (side_cm, share): (f64, f64),
    place: &str,
) -> Result<(), ModelError> {
    if (share - 1.0).abs() <= tolerance::TABLE_NORM_RELATIVE {
        return Ok(());
    }
    Err(table.header_error(
        &side_cm.to_string(),
        format!(
            "the column is {share:.4} of full {place}, where machine.toml says that it is \
             normalised (see normalised_at, values_in and reference.depth_cm)"
        ),
    ))
}

/// Reads Sc and Sp.
pub(super) fn load_output_factors(
    files: &mut ModelFolder,
    file: &str,
) -> Result<OutputTable, ModelError> {
    let table = TableFile::parse(&files.path(file), &files.read_text(file)?, "side_cm")?;
    if table.header != ["side_cm", "sc", "sp"] {
        return Err(table.header_error(
            &table.header.join(","),
            "the header row must be `side_cm,sc,sp`",
        ));
    }
    table.bound_rows(SIDES_CM)?;
    table.bound_values(OUTPUT_FACTOR)?;
    let column = |index: usize, name: &'static str| -> Result<Grid, ModelError> {
        let values = table.values.iter().skip(index).step_by(2).copied();
        let grid = Grid::new(
            format!("{file}, {name}"),
            ("side_cm", table.rows.clone()),
            (name, vec![0.0]),
            values.collect(),
            DepthInterpolation::Linear,
        )
        .map_err(|source| ModelError::Grid {
            path: table.path.clone(),
            source,
        })?;
        let found = grid.at(REFERENCE_SIDE_CM, 0.0).map_err(|outside| {
            ModelError::whole_table(&table.path, format!("must cover 10 cm: {outside}"))
        })?;
        if (found.value - 1.0).abs() > tolerance::FACTOR_NORM_RELATIVE {
            return Err(table.header_error(
                name,
                format!("must be 1 at 10 cm, but is {:.4} there", found.value),
            ));
        }
        Ok(grid)
    };
    Ok(OutputTable {
        sc: column(0, "sc")?,
        sp: column(1, "sp")?,
    })
}

/// Reads off-axis ratios: a column for each depth, or one column `ratio` when the depth does not matter.
pub(super) fn load_off_axis(
    files: &mut ModelFolder,
    file: &str,
    kind: OffAxisKind,
) -> Result<OffAxis, ModelError> {
    let table = TableFile::parse(&files.path(file), &files.read_text(file)?, "radius_cm")?;
    table.bound_rows(RADII_CM)?;
    table.bound_values(OFF_AXIS_RATIO)?;
    let depths = match table.header.as_slice() {
        [_, only] if only == "ratio" => vec![0.0],
        [_, only] => {
            return Err(table.header_error(
                only,
                "a single column would be used at every depth: give several depths, or name it `ratio` when that is meant",
            ));
        }
        _ => table.column_numbers(depth_bounds())?,
    };
    if table.rows.first().is_none_or(|&radius| radius != 0.0) {
        return Err(ModelError::whole_table(
            &table.path,
            "the first radius_cm must be 0",
        ));
    }
    for (column, &ratio) in table.values.iter().take(depths.len()).enumerate() {
        if (ratio - 1.0).abs() > tolerance::FACTOR_NORM_RELATIVE {
            return Err(table.cell_error(0, column, format!("must be 1 on the axis, not {ratio}")));
        }
    }
    let grid = Grid::new(
        file,
        ("radius_cm", table.rows.clone()),
        ("depth_cm", depths),
        table.values.clone(),
        DepthInterpolation::Linear,
    )
    .map_err(|source| ModelError::Grid {
        path: table.path.clone(),
        source,
    })?;
    Ok(OffAxis { kind, grid })
}
