//! Wedges of a beam from `machine.toml` and their tables: keys that go
//! together, bounds of the values, 1 on the axis, a sweep that never goes back.
//! Plausibility beyond that is for `check`.

use super::machine_file::{AxisEntry, WedgeEntry};
use super::model_folder::ModelFolder;
use super::table_file::{Bounds, TableFile};
use super::{
    DepthInterpolation, Grid, ModelError, WedgeBody, WedgeModel, WedgeModelKind, WedgeSweep,
    WedgeTables,
};
use crate::quantity::{Quantity, tolerance};

/// A wedge lets less through than none, and never less than a twentieth (common practice: 60 degrees about 0.25 to 0.5).
const FACTOR: Bounds = Bounds {
    least: 0.05,
    greatest: 1.0,
};
/// Sides of squares in the plane of the point, cm.
const SIDES_CM: Bounds = Bounds {
    least: 0.1,
    greatest: 100.0,
};
/// Over 20 cm either way, 60 degrees come to exp(0.1 * 20) = 7.4 (common practice: about 10 % for each cm).
const PROFILE: Bounds = Bounds {
    least: 0.1,
    greatest: 10.0,
};
const SHARE: Bounds = Bounds {
    least: 0.0,
    greatest: 1.0,
};
/// Rounding of the last share of a sweep.
const FULL_SHARE: f64 = 1e-6;

fn range(quantity: Quantity) -> Bounds {
    let range = quantity.range();
    Bounds {
        least: range.least,
        greatest: range.greatest,
    }
}

/// Every wedge of a beam.
pub(super) fn load_wedges(
    files: &mut ModelFolder,
    label: &str,
    entries: Vec<WedgeEntry>,
) -> Result<Vec<WedgeModel>, ModelError> {
    let mut wedges: Vec<WedgeModel> = Vec::new();
    for entry in entries {
        let wedge = load_wedge(files, label, entry)?;
        let twice = wedge.ids().enumerate().find(|(index, id)| {
            let earlier = wedge.ids().take(*index);
            wedges
                .iter()
                .flat_map(WedgeModel::ids)
                .chain(earlier)
                .any(|known| known == *id)
        });
        if let Some((_, id)) = twice {
            return Err(ModelError::setting(
                &files.machine_path(),
                format!("beams {label}, wedges.id"),
                format!("`{id}` is given twice"),
            ));
        }
        wedges.push(wedge);
    }
    Ok(wedges)
}

fn load_wedge(
    files: &mut ModelFolder,
    label: &str,
    entry: WedgeEntry,
) -> Result<WedgeModel, ModelError> {
    let path = files.machine_path();
    let refuse = |key: &str, message: String| {
        ModelError::setting(
            &path,
            format!("beams {label}, wedges {}, {key}", entry.id),
            message,
        )
    };
    let kind = entry.kind.term();
    let missing = |key: &str| refuse(key, format!("a {kind} wedge needs it"));
    let unwanted = |key: &str| refuse(key, format!("a {kind} wedge has none: leave the key out"));
    let body = match entry.kind {
        WedgeModelKind::Fixed | WedgeModelKind::Motorised => {
            for (key, given) in [
                ("segments_file", entry.segments_file.is_some()),
                ("moves_along", entry.moves_along.is_some()),
                ("closing_gap_cm", entry.closing_gap_cm.is_some()),
            ] {
                if given {
                    return Err(unwanted(key));
                }
            }
            let factor_file = entry
                .factor_file
                .as_deref()
                .ok_or_else(|| missing("factor_file"))?;
            let profile_file = entry
                .profile_file
                .as_deref()
                .ok_or_else(|| missing("profile_file"))?;
            let tables = WedgeTables {
                factor: load_factor(files, factor_file)?,
                profile: load_profile(files, profile_file)?,
            };
            match entry.kind {
                WedgeModelKind::Motorised => WedgeBody::Motorised(tables),
                _ => WedgeBody::Fixed(tables),
            }
        }
        WedgeModelKind::Dynamic => {
            if entry.profile_file.is_some() {
                return Err(unwanted("profile_file"));
            }
            let segments_file = entry
                .segments_file
                .as_deref()
                .ok_or_else(|| missing("segments_file"))?;
            let moves_along = entry.moves_along.ok_or_else(|| missing("moves_along"))?;
            let closing_gap_cm = entry
                .closing_gap_cm
                .ok_or_else(|| missing("closing_gap_cm"))?;
            let factor = entry
                .factor_file
                .as_deref()
                .map(|file| load_factor(files, file))
                .transpose()?;
            WedgeBody::Dynamic(WedgeSweep {
                moves_along: AxisEntry::axis(moves_along),
                closing_gap_cm,
                delivered: load_segments(files, segments_file)?,
                factor,
            })
        }
    };
    Ok(WedgeModel {
        id: entry.id,
        further_ids: entry.further_ids,
        angle_deg: entry.angle_deg,
        body,
    })
}

/// Factors by depth and side; one column `factor` when the side does not matter.
fn load_factor(files: &mut ModelFolder, file: &str) -> Result<Grid, ModelError> {
    let table = TableFile::parse(&files.path(file), &files.read_text(file)?, "depth_cm")?;
    table.bound_rows(range(Quantity::Depth))?;
    let sides = match table.header.as_slice() {
        [_, only] if only == "factor" => vec![0.0],
        [_, only] => {
            return Err(table.header_error(
                only,
                "a single column would be used for every field: give several sides, or name it `factor` when that is meant",
            ));
        }
        _ => table.column_numbers(SIDES_CM)?,
    };
    table.bound_values(FACTOR)?;
    grid(&table, file, ("side_cm", sides))
}

/// The profile, 1 on the axis.
fn load_profile(files: &mut ModelFolder, file: &str) -> Result<Grid, ModelError> {
    let table = TableFile::parse(&files.path(file), &files.read_text(file)?, "position_cm")?;
    refuse_other_header(&table, "ratio")?;
    table.bound_rows(range(Quantity::DevicePosition))?;
    table.bound_values(PROFILE)?;
    let grid = grid(&table, file, ("ratio", vec![0.0]))?;
    let axis = grid.at(0.0, 0.0).map_err(|outside| {
        ModelError::whole_table(&table.path, format!("must cover the axis: {outside}"))
    })?;
    if (axis.value - 1.0).abs() > tolerance::FACTOR_NORM_RELATIVE {
        return Err(ModelError::whole_table(
            &table.path,
            format!(
                "must be 1 on the axis (position_cm 0), but is {:.4} there",
                axis.value
            ),
        ));
    }
    Ok(grid)
}

/// The sweep: shares that never fall and end at 1.
fn load_segments(files: &mut ModelFolder, file: &str) -> Result<Grid, ModelError> {
    let table = TableFile::parse(&files.path(file), &files.read_text(file)?, "position_cm")?;
    refuse_other_header(&table, "cumulative_meterset")?;
    table.bound_rows(range(Quantity::DevicePosition))?;
    table.bound_values(SHARE)?;
    let pairs = table.values.iter().zip(table.values.iter().skip(1));
    if let Some((row, (before, after))) = pairs
        .enumerate()
        .find(|(_, (before, after))| after < before)
    {
        return Err(table.cell_error(
            row + 1,
            0,
            format!("must not fall from row to row, but {after} follows {before}"),
        ));
    }
    if let Some(last) = table.values.last()
        && (last - 1.0).abs() > FULL_SHARE
    {
        return Err(table.cell_error(
            table.rows.len() - 1,
            0,
            format!("the sweep ends with a share of 1, not {last}"),
        ));
    }
    let grid = grid(&table, file, ("cumulative_meterset", vec![0.0]))?;
    grid.at(0.0, 0.0).map_err(|outside| {
        ModelError::whole_table(&table.path, format!("must cover the axis: {outside}"))
    })?;
    Ok(grid)
}

fn refuse_other_header(table: &TableFile, column: &str) -> Result<(), ModelError> {
    if table.header == ["position_cm", column] {
        return Ok(());
    }
    Err(table.header_error(
        &table.header.join(","),
        format!("the header row must be `position_cm,{column}`"),
    ))
}

fn grid(
    table: &TableFile,
    file: &str,
    columns: (&'static str, Vec<f64>),
) -> Result<Grid, ModelError> {
    let row_name = match columns.0 {
        "side_cm" => "depth_cm",
        _ => "position_cm",
    };
    Grid::new(
        file,
        (row_name, table.rows.clone()),
        columns,
        table.values.clone(),
        DepthInterpolation::Linear,
    )
    .map_err(|source| ModelError::Grid {
        path: table.path.clone(),
        source,
    })
}
