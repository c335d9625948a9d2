//! A plan as plain text.

use crate::plan::Plan;

/// Which control points.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ControlPointDetail {
    /// The first.
    First,
    /// All.
    All,
}

/// A plan.
#[must_use]
pub fn plan_text(_plan: &Plan, _control_points: ControlPointDetail) -> String {
    String::new()
}
