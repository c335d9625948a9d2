//! What jaws and leaves leave open at a moment, as rectangles in the isocentre
//! plane with their fluence. Blocks are cut out in `blocks`; where the point is,
//! and what it gets, is the work of `exposure`.

use super::bank::Bank;
use crate::plan::{ControlPoint, LeafAxis};
use crate::quantity::tolerance;

/// No treatment field reaches further from the axis, cm at the isocentre plane (common practice: 40 x 40).
const FIELD_LIMIT_CM: f64 = 20.0;

/// A rectangle of the collimator system at the isocentre plane with its in-air fluence. Rectangles
/// overlap; the fluence at a place is the sum over those that hold it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Patch {
    /// From, to along x, cm.
    pub(super) x_cm: [f64; 2],
    /// From, to along y, cm.
    pub(super) y_cm: [f64; 2],
    /// Fluence through the opening.
    pub(super) open: f64,
    /// Fluence through leaves and blocks.
    pub(super) leak: f64,
}

/// The opening at a moment.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Opening {
    /// What the jaws leave open, x then y, cm; on an axis without jaws what the leaves leave open.
    pub(super) jaws_cm: [[f64; 2]; 2],
    /// The rectangles.
    pub(super) patches: Vec<Patch>,
    /// Total width of open leaf gaps inside the jaws times leaf width, cm2, and the sum of those leaf widths, cm.
    pub(super) gap_area_cm2: f64,
    /// See `gap_area_cm2`.
    pub(super) gap_width_cm: f64,
}

/// A leaf pair's gap inside the jaws.
#[derive(Clone, Copy)]
struct Gap {
    along: [f64; 2],
    across: [f64; 2],
}

/// Where jaws and leaves stand between two control points.
#[derive(Clone, Copy)]
pub(super) struct Between<'a> {
    pub(super) start: &'a ControlPoint,
    pub(super) end: &'a ControlPoint,
    /// 0 at the start, 1 at the end.
    pub(super) share: f64,
}

impl Between<'_> {
    fn jaws(&self, axis: LeafAxis) -> Option<[f64; 2]> {
        let jaws = |point: &ControlPoint| match axis {
            LeafAxis::X => point.jaws_x_cm.value().copied(),
            LeafAxis::Y => point.jaws_y_cm.value().copied(),
        };
        let (start, end) = (jaws(self.start)?, jaws(self.end)?);
        Some([0, 1].map(|side| start[side] + (end[side] - start[side]) * self.share))
    }
}

impl Opening {
    /// Makes this the opening at a moment; room that is already there is used again. `None` when a position is
    /// missing.
    pub(super) fn set(&mut self, banks: &[Bank<'_>], at: Between<'_>) -> Option<()> {
        self.patches.clear();
        self.gap_area_cm2 = 0.0;
        self.gap_width_cm = 0.0;
        let jaws = [at.jaws(LeafAxis::X), at.jaws(LeafAxis::Y)];
        let limits = jaws.map(|jaws| jaws.unwrap_or([-FIELD_LIMIT_CM, FIELD_LIMIT_CM]));
        self.jaws_cm = limits;
        let closed = limits
            .iter()
            .any(|limit| limit[1] - limit[0] <= tolerance::POSITION_CM);
        match banks {
            _ if closed => {}
            [] => self.patches.push(Patch {
                x_cm: limits[0],
                y_cm: limits[1],
                open: 1.0,
                leak: 0.0,
            }),
            [bank] => {
                let through = bank.model.transmission;
                self.push_background(limits, through);
                self.push_gaps(bank, at, limits, (1.0, -through))?;
            }
            [one, two] => self.push_stacked([one, two], at, limits)?,
            _ => return None,
        }
        for (axis, jaws) in jaws.into_iter().enumerate() {
            if jaws.is_none() {
                self.jaws_cm[axis] = self.extent(axis);
            }
        }
        Some(())
    }

    fn push_background(&mut self, limits: [[f64; 2]; 2], leak: f64) {
        self.patches.push(Patch {
            x_cm: limits[0],
            y_cm: limits[1],
            open: 0.0,
            leak,
        });
    }

    fn push_gaps(
        &mut self,
        bank: &Bank<'_>,
        at: Between<'_>,
        limits: [[f64; 2]; 2],
        (open, leak): (f64, f64),
    ) -> Option<()> {
        for_each_gap(bank, at, limits, |gap| {
            let (x_cm, y_cm) = gap.sides(bank.axis);
            self.patches.push(Patch {
                x_cm,
                y_cm,
                open,
                leak,
            });
            let width_cm = gap.across[1] - gap.across[0];
            self.gap_area_cm2 += width_cm * (gap.along[1] - gap.along[0]);
            self.gap_width_cm += width_cm;
        })
    }

    /// Two layers: open where both are; what each lets through multiplies.
    fn push_stacked(
        &mut self,
        banks: [&Bank<'_>; 2],
        at: Between<'_>,
        limits: [[f64; 2]; 2],
    ) -> Option<()> {
        let [t1, t2] = banks.map(|bank| bank.model.transmission);
        self.push_background(limits, t1 * t2);
        let first = self.patches.len();
        self.push_gaps(banks[0], at, limits, (0.0, t2 * (1.0 - t1)))?;
        let second = self.patches.len();
        self.push_gaps(banks[1], at, limits, (0.0, t1 * (1.0 - t2)))?;
        let both_leak = (1.0 - t1) * (1.0 - t2) - 1.0;
        let end = self.patches.len();
        (self.gap_area_cm2, self.gap_width_cm) = (0.0, 0.0);
        for one in first..second {
            for two in second..end {
                let (one, two) = (self.patches[one], self.patches[two]);
                let x_cm = common(one.x_cm, two.x_cm);
                let y_cm = common(one.y_cm, two.y_cm);
                if x_cm[1] > x_cm[0] && y_cm[1] > y_cm[0] {
                    self.patches.push(Patch {
                        x_cm,
                        y_cm,
                        open: 1.0,
                        leak: both_leak,
                    });
                    let (along, across) = match banks[0].axis {
                        LeafAxis::X => (x_cm, y_cm),
                        LeafAxis::Y => (y_cm, x_cm),
                    };
                    self.gap_area_cm2 += (along[1] - along[0]) * (across[1] - across[0]);
                    self.gap_width_cm += across[1] - across[0];
                }
            }
        }
        Some(())
    }

    /// From where to where something is open along an axis (0 x, 1 y), cm; empty when nothing is.
    fn extent(&self, axis: usize) -> [f64; 2] {
        let open = self.patches.iter().filter(|patch| patch.open > 0.0);
        let sides = open.map(|patch| [patch.x_cm, patch.y_cm][axis]);
        let [low, high] = sides.fold([f64::INFINITY, f64::NEG_INFINITY], |all, side| {
            [all[0].min(side[0]), all[1].max(side[1])]
        });
        if low < high { [low, high] } else { [0.0, 0.0] }
    }

    /// Open fluence and leak at a place, cm at the isocentre plane.
    pub(super) fn fluence_at(&self, [x_cm, y_cm]: [f64; 2]) -> (f64, f64) {
        let holds = |side: [f64; 2], at_cm: f64| side[0] <= at_cm && at_cm < side[1];
        self.patches
            .iter()
            .filter(|patch| holds(patch.x_cm, x_cm) && holds(patch.y_cm, y_cm))
            .fold((0.0, 0.0), |(open, leak), patch| {
                (open + patch.open, leak + patch.leak)
            })
    }
}

fn common(a: [f64; 2], b: [f64; 2]) -> [f64; 2] {
    [a[0].max(b[0]), a[1].min(b[1])]
}

impl Gap {
    const fn sides(&self, axis: LeafAxis) -> ([f64; 2], [f64; 2]) {
        match axis {
            LeafAxis::X => (self.along, self.across),
            LeafAxis::Y => (self.across, self.along),
        }
    }
}

/// The radiation gaps of a bank inside the limits: a rounded leaf end lets radiation pass behind its tip by
/// the model's offset, and leaves that meet are closed. `None` when positions are missing.
fn for_each_gap(
    bank: &Bank<'_>,
    at: Between<'_>,
    limits: [[f64; 2]; 2],
    mut take: impl FnMut(Gap),
) -> Option<()> {
    let positions = |point: &'_ ControlPoint| {
        point
            .leaves
            .get(bank.index)
            .and_then(|leaves| leaves.positions_cm.value().cloned())
    };
    let start = positions(at.start)?;
    let end = positions(at.end)?;
    let pairs = bank.boundaries_cm.len().checked_sub(1)?;
    if start.len() != 2 * pairs || end.len() != 2 * pairs {
        return None;
    }
    let (along, across) = match bank.axis {
        LeafAxis::X => (limits[0], limits[1]),
        LeafAxis::Y => (limits[1], limits[0]),
    };
    let offset_cm = bank.model.leaf_end_offset_cm;
    for pair in 0..pairs {
        let width = common(
            [bank.boundaries_cm[pair], bank.boundaries_cm[pair + 1]],
            across,
        );
        if width[1] - width[0] <= 0.0 {
            continue;
        }
        let tip = |leaf: usize| start[leaf] + (end[leaf] - start[leaf]) * at.share;
        let tips = [tip(pair), tip(pair + pairs)];
        if tips[1] - tips[0] <= tolerance::POSITION_CM {
            continue;
        }
        let gap = common([tips[0] - offset_cm, tips[1] + offset_cm], along);
        if gap[1] - gap[0] > 0.0 {
            take(Gap {
                along: gap,
                across: width,
            });
        }
    }
    Some(())
}
