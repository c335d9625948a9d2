//! Cuts blocks out of an opening: the rectangles are split into thin strips in
//! which block outlines are straight lines crossed half-way up. A shielding block
//! covers the inside of its outline, an aperture block the outside.

use super::opening::{Opening, Patch};

/// A block as the calculation needs it.
#[derive(Clone, Debug)]
pub(super) struct BlockShape<'a> {
    /// Outline, cm at the isocentre plane; the last point joins the first.
    pub(super) outline_cm: &'a [[f64; 2]],
    /// Whether it shields the inside.
    pub(super) shields_inside: bool,
    /// What it lets through, a share.
    pub(super) transmission: f64,
}

/// Replaces an opening's rectangles by strips no higher than `strip_cm` from which the blocks are taken.
pub(super) fn cut_blocks(opening: &mut Opening, blocks: &[BlockShape<'_>], strip_cm: f64) {
    if blocks.is_empty() {
        return;
    }
    let whole = std::mem::take(&mut opening.patches);
    let levels = levels_cm(&whole, blocks, strip_cm);
    for pair in levels.windows(2) {
        let strip = [pair[0], pair[1]];
        cut_strip(&whole, blocks, strip, &mut opening.patches);
    }
}

/// Where strips begin and end: at every edge of a rectangle, at every corner of an outline, and closely between.
fn levels_cm(patches: &[Patch], blocks: &[BlockShape<'_>], strip_cm: f64) -> Vec<f64> {
    let edges = patches.iter().flat_map(|patch| patch.y_cm);
    let (low, high) = edges
        .clone()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), edge| {
            (low.min(edge), high.max(edge))
        });
    let corners = blocks
        .iter()
        .flat_map(|block| block.outline_cm.iter().map(|point| point[1]));
    let mut fixed: Vec<f64> = edges
        .chain(corners)
        .filter(|&edge| edge >= low && edge <= high)
        .collect();
    fixed.sort_by(f64::total_cmp);
    fixed.dedup_by(|after, before| *after - *before < 1e-6);
    let mut levels = Vec::new();
    for pair in fixed.windows(2) {
        let parts = ((pair[1] - pair[0]) / strip_cm).ceil().max(1.0);
        levels.extend(
            (0..parts as u32).map(|part| pair[0] + (pair[1] - pair[0]) * f64::from(part) / parts),
        );
    }
    levels.extend(fixed.last());
    levels
}

fn cut_strip(whole: &[Patch], blocks: &[BlockShape<'_>], strip_cm: [f64; 2], cut: &mut Vec<Patch>) {
    let middle_cm = f64::midpoint(strip_cm[0], strip_cm[1]);
    let here: Vec<&Patch> = whole
        .iter()
        .filter(|patch| patch.y_cm[0] < middle_cm && middle_cm < patch.y_cm[1])
        .collect();
    let crossings: Vec<Vec<f64>> = blocks
        .iter()
        .map(|block| crossings_cm(block.outline_cm, middle_cm))
        .collect();
    let mut places: Vec<f64> = here.iter().flat_map(|patch| patch.x_cm).collect();
    places.extend(crossings.iter().flatten());
    places.sort_by(f64::total_cmp);
    places.dedup_by(|after, before| *after - *before < 1e-9);
    for pair in places.windows(2) {
        let x_cm = f64::midpoint(pair[0], pair[1]);
        let (open, leak) = here
            .iter()
            .filter(|patch| patch.x_cm[0] < x_cm && x_cm < patch.x_cm[1])
            .fold((0.0, 0.0), |(open, leak), patch| {
                (open + patch.open, leak + patch.leak)
            });
        let through: Option<f64> = blocks
            .iter()
            .zip(&crossings)
            .filter(|(block, crossings)| {
                let before = crossings
                    .iter()
                    .filter(|&&crossing| crossing < x_cm)
                    .count();
                (before % 2 == 1) == block.shields_inside
            })
            .map(|(block, _)| block.transmission)
            .reduce(|a, b| a * b);
        let (open, leak) = match through {
            None => (open, leak),
            Some(through) => (0.0, (open + leak) * through),
        };
        if open != 0.0 || leak != 0.0 {
            cut.push(Patch {
                x_cm: [pair[0], pair[1]],
                y_cm: strip_cm,
                open,
                leak,
                ..Patch::default()
            });
        }
    }
}

/// Where an outline crosses a level, rising; corners cannot lie on it, since strips begin there.
fn crossings_cm(outline_cm: &[[f64; 2]], level_cm: f64) -> Vec<f64> {
    let next = outline_cm.iter().cycle().skip(1);
    let mut found: Vec<f64> = outline_cm
        .iter()
        .zip(next)
        .filter(|(a, b)| (a[1] < level_cm) != (b[1] < level_cm))
        .map(|(a, b)| a[0] + (b[0] - a[0]) * (level_cm - a[1]) / (b[1] - a[1]))
        .collect();
    found.sort_by(f64::total_cmp);
    found
}

#[cfg(test)]
mod tests {
    use super::{BlockShape, cut_blocks};
    use crate::dose::shaped::opening::{Opening, Patch};

    /// Open fluence and leak at a place.
    fn fluence_at(opening: &Opening, [x_cm, y_cm]: [f64; 2]) -> (f64, f64) {
        let holds = |side: [f64; 2], at_cm: f64| side[0] <= at_cm && at_cm < side[1];
        opening
            .patches
            .iter()
            .filter(|patch| holds(patch.x_cm, x_cm) && holds(patch.y_cm, y_cm))
            .fold((0.0, 0.0), |(open, leak), patch| {
                (open + patch.open, leak + patch.leak)
            })
    }

    fn area(opening: &Opening) -> f64 {
        let patches = opening.patches.iter();
        patches
            .map(|patch| {
                patch.open * (patch.x_cm[1] - patch.x_cm[0]) * (patch.y_cm[1] - patch.y_cm[0])
            })
            .sum()
    }

    fn square() -> Opening {
        Opening {
            jaws_cm: [[-5.0, 5.0]; 2],
            patches: vec![Patch {
                x_cm: [-5.0, 5.0],
                y_cm: [-5.0, 5.0],
                open: 1.0,
                ..Patch::default()
            }],
            ..Opening::default()
        }
    }

    /// A right-angled triangle with legs of 4 cm in a corner covers 8 cm2 of 100.
    #[test]
    fn verify_areas_of_shielding_and_aperture() {
        let outline = [[1.0, 5.0], [5.0, 1.0], [5.0, 5.0]];
        for (shields_inside, open_cm2) in [(true, 92.0), (false, 8.0)] {
            let mut opening = square();
            let block = BlockShape {
                outline_cm: &outline,
                shields_inside,
                transmission: 0.05,
            };
            cut_blocks(&mut opening, &[block], 0.1);
            assert!(
                (area(&opening) - open_cm2).abs() < 1e-9,
                "{}",
                area(&opening)
            );
        }
    }

    /// Under two blocks of 10 % each a hundredth gets through.
    #[test]
    fn verify_transmissions_multiply() {
        let outline = [[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]];
        let block = BlockShape {
            outline_cm: &outline,
            shields_inside: true,
            transmission: 0.1,
        };
        let mut opening = square();
        cut_blocks(&mut opening, &[block.clone(), block], 0.1);
        let (open, leak) = fluence_at(&opening, [0.05, 0.05]);
        assert!(open == 0.0 && (leak - 0.01).abs() < 1e-12);
    }
}
