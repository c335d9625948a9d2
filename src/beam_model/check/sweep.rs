//! A dynamic wedge's measured factor beside what its sweep comes to on the axis.
//! The dose of a plan's beam rests on the sweep alone; here a person sees whether the
//! two tables are of one wedge. How steep the sweep is, `wedge` looks at.

use super::ModelFinding;
use crate::beam_model::{
    BeamModel, Grid, JawAxis, MachineModel, WedgeModel, WedgeSweep, collimator_square,
};
use crate::quantity::CollimatorSquare;

/// Beyond this the measured factor and the sweep are not of one wedge, per cent (an own choice).
const LIMIT_PERCENT: f64 = 1.0;

/// Side of the square where one column of the table holds for every side, cm.
const ANY_SIDE_CM: f64 = 10.0;

/// The jaw goes no further than this in one step, cm.
const STEP_CM: f64 = 0.1;

/// One cell of the measured table beside the sweep.
struct Beside {
    depth_cm: f64,
    column: f64,
    side_cm: f64,
    measured: f64,
    swept: f64,
}

impl Beside {
    fn percent(&self) -> f64 {
        100.0 * (self.swept / self.measured - 1.0)
    }
}

/// A note with the largest difference, a warning where it is too large; nothing for a sweep without measured factor.
pub(super) fn check(
    machine: &MachineModel,
    beam: &BeamModel,
    wedge: &WedgeModel,
    sweep: &WedgeSweep,
) -> Option<ModelFinding> {
    let grid = sweep.factor.as_ref()?;
    let cells = beside(machine, beam, sweep, grid);
    let worst = cells
        .iter()
        .max_by(|one, other| one.percent().abs().total_cmp(&other.percent().abs()));
    let Some(worst) = worst else {
        return Some(
            ModelFinding::note(format!(
                "the measured factor of wedge `{}` holds no depth and side at which its sweep can be integrated: the two are not held against each other",
                wedge.id
            ))
            .in_table(grid),
        );
    };
    let percent = worst.percent();
    let words = format!(
        "wedge `{}`: the sweep ({}) comes to {:.4} of the open {} x {} field on the axis, measured {:.4}: {percent:+.1} %",
        wedge.id,
        sweep.delivered.name(),
        worst.swept,
        worst.side_cm,
        worst.side_cm,
        worst.measured
    );
    // NaN must not pass.
    let agrees = percent.abs() <= LIMIT_PERCENT;
    let finding = if agrees {
        ModelFinding::note(format!(
            "{words}, the largest difference of {} cells",
            cells.len()
        ))
    } else {
        ModelFinding::warning(format!(
            "{words}: are both of one wedge? The dose rests on the sweep"
        ))
        .limit(LIMIT_PERCENT)
    };
    let column = (grid.columns().len() > 1).then_some(worst.column);
    Some(finding.measured(percent).at(grid, worst.depth_cm, column))
}

fn beside(
    machine: &MachineModel,
    beam: &BeamModel,
    sweep: &WedgeSweep,
    grid: &Grid,
) -> Vec<Beside> {
    let mut cells = Vec::new();
    for (row, &depth_cm) in grid.rows().iter().enumerate() {
        for (index, &column) in grid.columns().iter().enumerate() {
            let side_cm = if grid.columns().len() > 1 {
                column
            } else {
                ANY_SIDE_CM
            };
            let measured = grid.cell_value(row, index);
            let swept = on_axis(machine, beam, sweep, (depth_cm, side_cm));
            if let (Some(measured), Some(swept)) = (measured, swept) {
                cells.push(Beside {
                    depth_cm,
                    column,
                    side_cm,
                    measured,
                    swept,
                });
            }
        }
    }
    cells
}

/// Dose on the axis of a square swept over that of the same square open, the point at the isocentre: the mean over the
/// meterset of Sc times (primary while the axis is open, and scatter of what is open). `None` beyond a table.
fn on_axis(
    machine: &MachineModel,
    beam: &BeamModel,
    sweep: &WedgeSweep,
    (depth_cm, side_cm): (f64, f64),
) -> Option<f64> {
    let kernel = beam.scatter_at(depth_cm).ok()?;
    let half_cm = side_cm / 2.0;
    let to_cm = half_cm - sweep.closing_gap_cm;
    let dose = |jaw_cm: f64| {
        let sc = collimator_scatter(machine, beam, sweep, [side_cm, half_cm - jaw_cm])?;
        let primary = if jaw_cm < 0.0 { kernel.primary() } else { 0.0 };
        Some(sc * (primary + kernel.rectangle([-half_cm, half_cm], [jaw_cm, half_cm])))
    };
    let share = |jaw_cm: f64| Some(sweep.delivered_share(jaw_cm).ok()?.value);
    let open = dose(-half_cm)?;
    let mut sum = share(-half_cm)? * open;
    // A step never goes over the axis, where the primary ends.
    for [from_cm, end_cm] in [[-half_cm, to_cm.min(0.0)], [0.0, to_cm]] {
        let length_cm = end_cm - from_cm;
        if length_cm <= 0.0 {
            continue;
        }
        let steps = (length_cm / STEP_CM).ceil().max(1.0);
        for step in 0..steps as u32 {
            let at = |part: f64| from_cm + length_cm * (f64::from(step) + part) / steps;
            sum += (share(at(1.0))? - share(at(0.0))?) * dose(at(0.5))?;
        }
    }
    let ratio = sum / (share(to_cm)? * open);
    ratio.is_finite().then_some(ratio)
}

/// Sc of an opening, across and along the sweep; below the smallest opening of the table that one, where little more than
/// scatter is left.
fn collimator_scatter(
    machine: &MachineModel,
    beam: &BeamModel,
    sweep: &WedgeSweep,
    [across_cm, along_cm]: [f64; 2],
) -> Option<f64> {
    let (x_cm, y_cm) = match sweep.moves_along {
        JawAxis::X => (along_cm, across_cm),
        JawAxis::Y => (across_cm, along_cm),
    };
    let square = collimator_square(x_cm, y_cm, machine.upper_jaws, beam.exchange_k);
    let least_cm = *beam.output_factors.sc.rows().first()?;
    let square = CollimatorSquare::new(square.side_cm().max(least_cm));
    Some(beam.sc(square).ok()?.value)
}
