//! A dose point in the penumbra.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
use crate::dose::ObstacleKind;

check! {
    /// What it looks at: the distance of the dose point from the nearest field edge, in the point's plane.
    ///
    /// Why it matters: in the penumbra a millimetre changes the dose by several per cent, so a comparison there says little.
    ///
    /// Silent when: the point is further inside than the site's margin (technical.edge_margin_cm), or outside altogether (another check).
    ///
    /// What to do: state the dose at a point well inside the field.
    ///
    /// Source: AAPM TG-114 (2011), choice of the calculation point; the margin is the site's.
    "point-near-edge", Tolerance, look,
    fires on || example::with_obstacle(ObstacleKind::FieldEdge),
    silent on || example::with_obstacle(ObstacleKind::Model)
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    Observation::from_obstacles(input, ObstacleKind::FieldEdge)
}
