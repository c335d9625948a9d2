//! A plan as plain text, in a form that can be held against a planning
//! system's printout: every value that was read, each with where it stands,
//! then what the reader noticed. Nothing is calculated.

mod beam;
mod control_point;
mod lines;
mod modifiers;
mod overview;
mod plan;
mod units;

use crate::plan::Plan;
use lines::{LEGEND, Lines};

/// Which control points of a beam are shown.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ControlPointDetail {
    /// The first of each beam.
    First,
    /// All of them.
    All,
}

/// Everything that was read from a plan, as text.
#[must_use]
pub fn plan_text(plan: &Plan, control_points: ControlPointDetail) -> String {
    let mut lines = Lines::default();
    lines.plain(LEGEND);
    plan::identity(&mut lines, &plan.identity);
    plan::approval(&mut lines, &plan.identity.approval);
    plan::setups(&mut lines, plan);
    plan::prescription(&mut lines, &plan.dose_references);
    for (index, group) in plan.fraction_groups.iter().enumerate() {
        plan::fraction_group(&mut lines, plan, group, index);
    }
    overview::beams(&mut lines, plan);
    for (index, beam) in plan.beams.iter().enumerate() {
        beam::beam(&mut lines, beam, index, control_points);
    }
    plan::notes(&mut lines, &plan.notes);
    lines.finish()
}
