//! A dose point in the build-up.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::dose::ObstacleKind;

check! {
    /// What it looks at: the depth of the dose point against the beam's depth of dose maximum.
    ///
    /// Why it matters: the formalism does not hold in the build-up: electron contamination and missing charged-particle equilibrium make tables and inverse square unreliable there.
    ///
    /// Silent when: the point is at the depth of dose maximum or deeper, or its depth is not known.
    ///
    /// What to do: state the dose at a point beyond the depth of dose maximum in the planning system.
    ///
    /// Source: AAPM TG-71 (2014) and TG-114 (2011), choice of the calculation point.
    "point-in-build-up", Tolerance, look,
    fires on || example::with_obstacle(ObstacleKind::BuildUp),
    silent on || example::with_obstacle(ObstacleKind::Model)
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    Observation::from_obstacles(input, ObstacleKind::BuildUp)
}
