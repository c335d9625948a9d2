//! Head scatter of an aperture relative to its jaws: what of the extra-focal
//! source the point sees through jaws and leaves, each at its own height. Blocks
//! on a tray far below the head do not count (common practice).

use super::bank::Bank;
use super::opening::Opening;
use super::shared::Shared;
use crate::beam_model::{HeadScatter, HeadView, JawAxis, MachineModel};
use crate::dose::RayPoint;

/// Heights of the devices, cm from the source.
#[derive(Clone, Copy, Debug)]
pub(super) struct Heights {
    x_jaws_cm: f64,
    y_jaws_cm: f64,
    leaves_cm: Option<f64>,
}

/// The heights that the machine's model gives; the name of the one that is missing otherwise.
pub(super) fn heights(machine: &MachineModel, banks: &[Bank<'_>]) -> Result<Heights, &'static str> {
    let jaw_cm = |axis: JawAxis| machine.collimation.jaw(axis)?.source_distance_cm;
    let leaves_cm = match banks {
        [] => None,
        [first, ..] => Some(
            first
                .model
                .source_distance_cm
                .ok_or("leaf_banks.source_distance_cm")?,
        ),
    };
    Ok(Heights {
        x_jaws_cm: jaw_cm(JawAxis::X).ok_or("jaws.source_distance_cm of the x pair")?,
        y_jaws_cm: jaw_cm(JawAxis::Y).ok_or("jaws.source_distance_cm of the y pair")?,
        leaves_cm,
    })
}

/// Output of the aperture over that of its jaws; `transmission` is what a closed leaf lets through.
pub(super) fn aperture_over_jaws(
    head: &HeadScatter,
    heights: &Heights,
    opening: &Opening,
    ray: RayPoint,
    (jaw_side_cm, transmission): (f64, f64),
) -> f64 {
    let Some(leaves_cm) = heights.leaves_cm else {
        return 1.0;
    };
    let [x_cm, y_cm] = ray.projected_cm;
    let below = |view: HeadView, edges_cm: [f64; 2]| {
        [view.share_below(edges_cm[0]), view.share_below(edges_cm[1])]
    };
    let jaws_x = below(head.view(x_cm, heights.x_jaws_cm), opening.jaws_cm[0]);
    let jaws_y = below(head.view(y_cm, heights.y_jaws_cm), opening.jaws_cm[1]);
    let through_jaws = between(jaws_x) * between(jaws_y);
    let [leaves_x, leaves_y] = [x_cm, y_cm].map(|at_cm| head.view(at_cm, leaves_cm));
    let mut along_y = Shared::new();
    let mut open = 0.0;
    for patch in opening.patches.iter().filter(|patch| patch.open != 0.0) {
        // What is open through both: the later of the lower edges, the earlier of the upper ones.
        let x = within(below(leaves_x, patch.x_cm), jaws_x);
        let y = along_y.pair(patch.y_cm, |edge_cm| leaves_y.share_below(edge_cm));
        let y = within(y, jaws_y);
        open += patch.open * between(x) * between(y);
    }
    let through_leaves = open + transmission * (through_jaws - open).max(0.0);
    head.output(through_leaves, jaw_side_cm) / head.output(through_jaws, jaw_side_cm)
}

fn between([lower, upper]: [f64; 2]) -> f64 {
    (upper - lower).max(0.0)
}

fn within(share: [f64; 2], limits: [f64; 2]) -> [f64; 2] {
    [share[0].max(limits[0]), share[1].min(limits[1])]
}
