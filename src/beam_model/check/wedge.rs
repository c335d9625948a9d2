//! Rules over wedges: factors fall with the angle and rise slowly with depth
//! and side, profiles rise towards the thin end about as steeply as the angle
//! says, single cells. Bounds, 1 on the axis and a sweep that never goes back
//! the loader has seen to.

use super::ModelFinding;
use super::outlier;
use super::sweep;
use crate::beam_model::{
    BeamModel, Grid, MachineModel, WedgeBody, WedgeModel, WedgeModelKind, WedgeTables,
};
use crate::quantity::{PointSquare, SurfaceSquare};

/// Where factors are compared with each other and with common values, cm.
const AT_DEPTH_CM: f64 = 10.0;
const AT_SIDE_CM: f64 = 10.0;

/// Usual factors by angle (common practice: at 6 MV 15 degrees .75 to .80, 30 .60 to .65, 45 about .5, 60 about .4; higher
/// energies and internal wedges with room).
const USUAL: &[(f64, f64, f64)] = &[
    (15.0, 0.55, 0.90),
    (30.0, 0.42, 0.80),
    (45.0, 0.30, 0.70),
    (60.0, 0.20, 0.60),
];

/// Falls with depth or side by less than this share are rounding.
const FALL_LIMIT: f64 = 3e-3;

/// Growth from the first to the last cell: published factors grow by up to 4 % over 15 cm of depth, so some 10 % to
/// 40 cm, and by up to 7 % with the side (common practice).
const GROWTH_LIMIT: f64 = 0.18;

/// A cell stands out beyond this share.
const CELL_LIMIT: f64 = 1e-2;

/// Half the stretch over which the profile's steepness is taken, cm.
const SLOPE_HALF_CM: f64 = 2.0;

/// The wedge angle that the steepness implies may be off by this factor of its tangent either way: a wedge of 45 degrees
/// taken for one of 30 or 60 is off by 1.7.
const TANGENT_LIMIT: f64 = 1.4;

pub(super) fn check(machine: &MachineModel, beam: &BeamModel) -> Vec<ModelFinding> {
    let mut findings = Vec::new();
    for wedge in &beam.wedges {
        match &wedge.body {
            WedgeBody::Fixed(tables) | WedgeBody::Motorised(tables) => {
                findings.extend(factor(wedge, &tables.factor));
                findings.extend(profile(machine, beam, wedge, tables));
            }
            WedgeBody::Dynamic(sweep) => {
                findings.extend(sweep.factor.iter().flat_map(|grid| factor(wedge, grid)));
                findings.extend(steepness(machine, beam, wedge, &sweep.delivered));
                findings.extend(stands_out_in_curve(&sweep.delivered));
                findings.extend(sweep::check(machine, beam, wedge, sweep));
            }
        }
    }
    findings.extend(order(beam));
    findings
}

fn points(grid: &Grid) -> Vec<(f64, f64)> {
    let rows = grid.rows().iter().enumerate();
    rows.filter_map(|(row, &place)| Some((place, grid.cell_value(row, 0)?)))
        .collect()
}

/// The factor where wedges are compared; `None` when the table does not hold the place.
fn at_reference(tables: &WedgeTables) -> Option<f64> {
    let found = tables.factor(AT_DEPTH_CM, PointSquare::new(AT_SIDE_CM));
    found.ok().map(|lookup| lookup.value)
}

fn factor(wedge: &WedgeModel, grid: &Grid) -> Vec<ModelFinding> {
    let mut findings = Vec::new();
    findings.extend(usual(wedge, grid));
    findings.extend(grid.rows().iter().enumerate().flat_map(|(row, &depth_cm)| {
        let columns = grid.columns().iter().enumerate();
        columns.filter_map(move |(column, &side_cm)| fall(grid, (row, depth_cm), (column, side_cm)))
    }));
    findings.extend(growth(grid));
    findings.extend(stands_out_in_table(grid));
    findings
}

fn usual(wedge: &WedgeModel, grid: &Grid) -> Option<ModelFinding> {
    let value = grid.at(AT_DEPTH_CM, AT_SIDE_CM).ok()?.value;
    let &(_, least, greatest) = USUAL.iter().min_by(|one, other| {
        let away = |angle: f64| (angle - wedge.angle_deg).abs();
        away(one.0).total_cmp(&away(other.0))
    })?;
    let limit = if value < least { least } else { greatest };
    (value < least || value > greatest).then(|| {
        ModelFinding::warning(format!(
            "the factor of wedge `{}` is {value:.4} at {AT_DEPTH_CM} cm depth for {AT_SIDE_CM} x {AT_SIDE_CM}, outside the usual range {least} to {greatest} of {} degrees",
            wedge.id, wedge.angle_deg
        ))
        .measured(value)
        .limit(limit)
        .in_table(grid)
    })
}

/// A wedge hardens the beam and scatters into it, so its factor falls neither with depth nor with side.
fn fall(
    grid: &Grid,
    (row, depth_cm): (usize, f64),
    (column, side_cm): (usize, f64),
) -> Option<ModelFinding> {
    let here = grid.cell_value(row, column)?;
    let before = [
        ("depth", row.checked_sub(1).map(|row| (row, column))),
        ("side", column.checked_sub(1).map(|column| (row, column))),
    ];
    before.into_iter().find_map(|(what, place)| {
        let (row, column) = place?;
        let before = grid.cell_value(row, column)?;
        (here < before * (1.0 - FALL_LIMIT)).then(|| {
            ModelFinding::warning(format!(
                "a wedge factor rises with the {what}, but {here:.4} follows {before:.4}"
            ))
            .measured(here)
            .limit(before)
            .at(grid, depth_cm, column_of(grid, side_cm))
        })
    })
}

fn column_of(grid: &Grid, at: f64) -> Option<f64> {
    (grid.columns().len() > 1).then_some(at)
}

fn growth(grid: &Grid) -> Option<ModelFinding> {
    let first = grid.cell_value(0, 0)?;
    let last = grid.cell_value(
        grid.rows().len().checked_sub(1)?,
        grid.columns().len().checked_sub(1)?,
    )?;
    let growth = last / first - 1.0;
    (growth > GROWTH_LIMIT).then(|| {
        ModelFinding::warning(format!(
            "the factor grows by {:.1} % from the first to the last cell, more than hardening and scatter usually do",
            100.0 * growth
        ))
        .measured(100.0 * growth)
        .limit(100.0 * GROWTH_LIMIT)
        .in_table(grid)
    })
}

fn stands_out_in_table(grid: &Grid) -> Vec<ModelFinding> {
    if grid.columns().len() == 1 {
        return stands_out_in_curve(grid);
    }
    let width = grid.columns().len();
    let logarithms: Vec<f64> = (0..grid.rows().len() * width)
        .filter_map(|index| grid.cell_value(index / width, index % width))
        .map(f64::ln)
        .collect();
    outlier::in_table(grid.rows(), grid.columns(), &logarithms, |_| CELL_LIMIT)
        .into_iter()
        .filter_map(|found| {
            let row = *grid.rows().get(found.row)?;
            let column = *grid.columns().get(found.column)?;
            let value = grid.cell_value(found.row, found.column)?;
            Some(typing_error(value, found.residual).at(grid, row, Some(column)))
        })
        .collect()
}

fn stands_out_in_curve(grid: &Grid) -> Vec<ModelFinding> {
    // Where a sweep has delivered nothing yet there is no logarithm.
    let points: Vec<(f64, f64)> = points(grid)
        .into_iter()
        .filter(|&(_, value)| value > 0.0)
        .collect();
    let places: Vec<f64> = points.iter().map(|point| point.0).collect();
    let logarithms: Vec<f64> = points.iter().map(|point| point.1.ln()).collect();
    outlier::in_curve(&places, &logarithms, CELL_LIMIT)
        .into_iter()
        .filter_map(|found| {
            let &(place, value) = points.get(found.row)?;
            Some(typing_error(value, found.residual).at(grid, place, None))
        })
        .collect()
}

fn typing_error(value: f64, residual: f64) -> ModelFinding {
    let percent = 100.0 * residual;
    ModelFinding::warning(format!(
        "the value {value:.4} stands out from its neighbours by {percent:+.1} %: a typing error?"
    ))
    .measured(percent)
    .limit(100.0 * CELL_LIMIT)
}

fn profile(
    machine: &MachineModel,
    beam: &BeamModel,
    wedge: &WedgeModel,
    tables: &WedgeTables,
) -> Vec<ModelFinding> {
    let grid = &tables.profile;
    let points = points(grid);
    let ends = points.first().zip(points.last());
    if let Some((&(_, thick), &(position, thin))) = ends
        && thin < thick
    {
        return vec![
            ModelFinding::error(format!(
                "the profile of wedge `{}` falls from {thick:.4} to {thin:.4} towards positive positions, which lie at the thin end: turned round",
                wedge.id
            ))
            .measured(thin)
            .limit(thick)
            .at(grid, position, None),
        ];
    }
    let mut findings = stands_out_in_curve(grid);
    for (&(_, before), &(position, after)) in points.iter().zip(points.iter().skip(1)) {
        if after < before * (1.0 - FALL_LIMIT) {
            findings.push(
                ModelFinding::warning(format!(
                    "a wedge's profile rises towards the thin end, but {after:.4} follows {before:.4}"
                ))
                .measured(after)
                .limit(before)
                .at(grid, position, None),
            );
        }
    }
    findings.extend(steepness(machine, beam, wedge, grid));
    findings
}

/// Whether the curve is about as steep as the angle says. The isodoses of a fluence exp(g x) on a dose that falls as
/// exp(-m d) are tilted by tan(angle) = g / m; m of a 10 x 10 field about 10 cm deep at the isocentre, inverse square included.
fn steepness(
    machine: &MachineModel,
    beam: &BeamModel,
    wedge: &WedgeModel,
    grid: &Grid,
) -> Option<ModelFinding> {
    let log_at = |position_cm| Some(grid.at(position_cm, 0.0).ok()?.value.ln());
    let per_cm = (log_at(SLOPE_HALF_CM)? - log_at(-SLOPE_HALF_CM)?) / (2.0 * SLOPE_HALF_CM);
    let ssd_cm = machine.sad_cm - AT_DEPTH_CM;
    let surface = SurfaceSquare::new(AT_SIDE_CM * ssd_cm / machine.sad_cm);
    let log_dose = |depth_cm| {
        let pdd = beam.pdd_percent(depth_cm, surface, ssd_cm);
        pdd.ok().map(|lookup| lookup.value.ln())
    };
    let attenuation = (log_dose(AT_DEPTH_CM - 1.0)? - log_dose(AT_DEPTH_CM + 1.0)?) / 2.0;
    let implied = per_cm / attenuation;
    let nominal = wedge.angle_deg.to_radians().tan();
    let off = implied > nominal * TANGENT_LIMIT || implied < nominal / TANGENT_LIMIT;
    // NaN must not pass.
    (off || implied.is_nan()).then(|| {
        let implied_deg = implied.atan().to_degrees();
        ModelFinding::warning(format!(
            "wedge `{}` of {} degrees: the curve is as steep as that of about {implied_deg:.0} degrees ({:.2} % per cm beside {:.2} % per cm with depth): another wedge's table?",
            wedge.id,
            wedge.angle_deg,
            100.0 * per_cm,
            100.0 * attenuation
        ))
        .measured(implied_deg)
        .limit(wedge.angle_deg)
        .in_table(grid)
    })
}

/// A steeper wedge of the same kind lets less through.
fn order(beam: &BeamModel) -> Vec<ModelFinding> {
    let mut findings = Vec::new();
    for kind in [WedgeModelKind::Fixed, WedgeModelKind::Motorised] {
        let mut of_kind: Vec<(&WedgeModel, &WedgeTables, f64)> = beam
            .wedges
            .iter()
            .filter(|wedge| wedge.kind() == kind)
            .filter_map(|wedge| {
                let tables = wedge.tables()?;
                Some((wedge, tables, at_reference(tables)?))
            })
            .collect();
        of_kind.sort_by(|one, other| one.0.angle_deg.total_cmp(&other.0.angle_deg));
        for (one, other) in of_kind.iter().zip(of_kind.iter().skip(1)) {
            if other.0.angle_deg > one.0.angle_deg && other.2 >= one.2 {
                findings.push(
                    ModelFinding::warning(format!(
                        "wedge `{}` of {} degrees lets {:.4} through and `{}` of {} degrees {:.4}: the steeper one usually less",
                        one.0.id, one.0.angle_deg, one.2, other.0.id, other.0.angle_deg, other.2
                    ))
                    .measured(other.2)
                    .limit(one.2)
                    .in_table(&other.1.factor),
                );
            }
        }
    }
    findings
}
