//! A dose point outside the opening.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::dose::ObstacleKind;

check! {
    /// What it looks at: whether the dose point lies inside the opening of the jaws.
    ///
    /// Why it matters: a point under a jaw gets transmission and scatter only; either the point belongs to another beam or the jaws are wrong.
    ///
    /// Silent when: the point is inside the opening.
    ///
    /// What to do: compare jaws, collimator angle and point with the planning system.
    ///
    /// Source: AAPM TG-114 (2011), choice of the calculation point.
    "point-under-device", Action, look,
    fires on || example::with_obstacle(ObstacleKind::UnderDevice),
    silent on || example::with_obstacle(ObstacleKind::Model)
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    Observation::from_obstacles(input, ObstacleKind::UnderDevice)
}
