//! Head scatter of an aperture relative to its jaws: what of the extra-focal
//! source the point sees through jaws and leaves, each at its own height. Blocks
//! on a tray far below the head do not count (common practice).

use super::bank::Bank;
use super::opening::Opening;
use crate::beam_model::{HeadScatter, JawAxis, MachineModel};
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
    let [x, y] = ray.projected_cm;
    let jaws_x = head.window(opening.jaws_cm[0], x, heights.x_jaws_cm);
    let jaws_y = head.window(opening.jaws_cm[1], y, heights.y_jaws_cm);
    let through_jaws = head.visible(jaws_x, jaws_y);
    let open: f64 = opening
        .patches
        .iter()
        .filter(|patch| patch.open != 0.0)
        .map(|patch| {
            let patch_x = head.window(patch.x_cm, x, leaves_cm).and(jaws_x);
            let patch_y = head.window(patch.y_cm, y, leaves_cm).and(jaws_y);
            patch.open * head.visible(patch_x, patch_y)
        })
        .sum();
    let through_leaves = open + transmission * (through_jaws - open).max(0.0);
    head.output(through_leaves, jaw_side_cm) / head.output(through_jaws, jaw_side_cm)
}
