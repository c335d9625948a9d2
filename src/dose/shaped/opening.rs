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
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Patch {
    /// From, to along x in the middle of the step, cm.
    pub(super) x_cm: [f64; 2],
    /// From, to along y in the middle of the step, cm.
    pub(super) y_cm: [f64; 2],
    /// How far the edges along x move in the step, either way, cm.
    pub(super) x_travel_cm: [f64; 2],
    /// How far the edges along y move in the step, either way, cm.
    pub(super) y_travel_cm: [f64; 2],
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

/// Two opposed edges in the middle of a step, and how far each moves in it, either way, cm.
#[derive(Clone, Copy)]
struct Edges {
    at_cm: [f64; 2],
    travel_cm: [f64; 2],
}

/// A leaf pair's gap inside the jaws.
#[derive(Clone, Copy)]
struct Gap {
    along: Edges,
    across: Edges,
}

/// Where jaws and leaves stand between two control points.
#[derive(Clone, Copy)]
pub(super) struct Between<'a> {
    pub(super) start: &'a ControlPoint,
    pub(super) end: &'a ControlPoint,
    /// Middle of the step: 0 at the start, 1 at the end.
    pub(super) share: f64,
    /// Length of the step, as a share of the way from start to end.
    pub(super) step: f64,
}

impl Between<'_> {
    #[inline]
    fn edges(&self, [low, high]: [f64; 2], [end_low, end_high]: [f64; 2]) -> Edges {
        let (low_way, high_way) = (end_low - low, end_high - high);
        let half_step = self.step / 2.0;
        Edges {
            at_cm: [low + low_way * self.share, high + high_way * self.share],
            travel_cm: [low_way.abs() * half_step, high_way.abs() * half_step],
        }
    }

    fn jaws(&self, axis: LeafAxis) -> Option<Edges> {
        let jaws = |point: &ControlPoint| match axis {
            LeafAxis::X => point.jaws_x_cm.value().copied(),
            LeafAxis::Y => point.jaws_y_cm.value().copied(),
        };
        let (start, end) = (jaws(self.start)?, jaws(self.end)?);
        Some(self.edges(start, end))
    }
}

impl Opening {
    /// Makes this the opening at a moment; room that is already there is used again. A leaf pair that moves further
    /// than `leaf_step_cm` stands in several places, each for its part of the step. `None` when a position is missing.
    pub(super) fn set(
        &mut self,
        banks: &[Bank<'_>],
        at: Between<'_>,
        leaf_step_cm: f64,
    ) -> Option<()> {
        self.patches.clear();
        self.gap_area_cm2 = 0.0;
        self.gap_width_cm = 0.0;
        let jaws = [at.jaws(LeafAxis::X), at.jaws(LeafAxis::Y)];
        let limits = jaws.map(|jaws| jaws.unwrap_or(Edges::FIELD_LIMIT));
        self.jaws_cm = limits.map(|limit| limit.at_cm);
        let closed = limits
            .iter()
            .any(|limit| limit.width_cm() <= tolerance::POSITION_CM);
        match banks {
            _ if closed => {}
            [] => self
                .patches
                .push(Patch::new(limits[0], limits[1], (1.0, 0.0))),
            [bank] => {
                let through = bank.model.transmission;
                self.push_background(limits, through);
                self.push_gaps(bank, (at, leaf_step_cm), limits, (1.0, -through))?;
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

    fn push_background(&mut self, limits: [Edges; 2], leak: f64) {
        self.patches
            .push(Patch::new(limits[0], limits[1], (0.0, leak)));
    }

    fn push_gaps(
        &mut self,
        bank: &Bank<'_>,
        at: (Between<'_>, f64),
        limits: [Edges; 2],
        (open, leak): (f64, f64),
    ) -> Option<()> {
        for_each_gap(bank, at, limits, |gap, part| {
            let (along, across) = (gap.along, gap.across);
            let fluences = (open * part, leak * part);
            // Each in its own place: a rectangle made first and turned then is written twice.
            match bank.axis {
                LeafAxis::X => self.patches.push(Patch::new(along, across, fluences)),
                LeafAxis::Y => self.patches.push(Patch::new(across, along, fluences)),
            }
            let width_cm = gap.across.width_cm() * part;
            self.gap_area_cm2 += width_cm * gap.along.width_cm();
            self.gap_width_cm += width_cm;
        })
    }

    /// Two layers: open where both are; what each lets through multiplies.
    fn push_stacked(
        &mut self,
        banks: [&Bank<'_>; 2],
        at: Between<'_>,
        limits: [Edges; 2],
    ) -> Option<()> {
        // The layers cross at one time: no pair has steps of its own.
        let whole = (at, f64::INFINITY);
        let [t1, t2] = banks.map(|bank| bank.model.transmission);
        self.push_background(limits, t1 * t2);
        let first = self.patches.len();
        self.push_gaps(banks[0], whole, limits, (0.0, t2 * (1.0 - t1)))?;
        let second = self.patches.len();
        self.push_gaps(banks[1], whole, limits, (0.0, t1 * (1.0 - t2)))?;
        let both_leak = (1.0 - t1) * (1.0 - t2) - 1.0;
        let end = self.patches.len();
        (self.gap_area_cm2, self.gap_width_cm) = (0.0, 0.0);
        for one in first..second {
            for two in second..end {
                let (one, two) = (self.patches[one], self.patches[two]);
                let (x, y) = (one.x().and(two.x()), one.y().and(two.y()));
                if x.width_cm() > 0.0 && y.width_cm() > 0.0 {
                    self.patches.push(Patch::new(x, y, (1.0, both_leak)));
                    let across_cm = match banks[0].axis {
                        LeafAxis::X => y.width_cm(),
                        LeafAxis::Y => x.width_cm(),
                    };
                    self.gap_area_cm2 += x.width_cm() * y.width_cm();
                    self.gap_width_cm += across_cm;
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
}

impl Edges {
    const FIELD_LIMIT: Self = Self::still([-FIELD_LIMIT_CM, FIELD_LIMIT_CM]);

    const fn still(at_cm: [f64; 2]) -> Self {
        Self {
            at_cm,
            travel_cm: [0.0; 2],
        }
    }

    fn width_cm(&self) -> f64 {
        self.at_cm[1] - self.at_cm[0]
    }

    /// What is between both pairs of edges.
    #[inline]
    fn and(self, other: Self) -> Self {
        let ([low, high], [low_travel, high_travel]) = (self.at_cm, self.travel_cm);
        let ([other_low, other_high], other_travel) = (other.at_cm, other.travel_cm);
        let (low, low_travel) = if low >= other_low {
            (low, low_travel)
        } else {
            (other_low, other_travel[0])
        };
        let (high, high_travel) = if high <= other_high {
            (high, high_travel)
        } else {
            (other_high, other_travel[1])
        };
        Self {
            at_cm: [low, high],
            travel_cm: [low_travel, high_travel],
        }
    }
}

impl Patch {
    #[inline]
    const fn new(x: Edges, y: Edges, (open, leak): (f64, f64)) -> Self {
        Self {
            x_cm: x.at_cm,
            y_cm: y.at_cm,
            x_travel_cm: x.travel_cm,
            y_travel_cm: y.travel_cm,
            open,
            leak,
        }
    }

    const fn x(&self) -> Edges {
        Edges {
            at_cm: self.x_cm,
            travel_cm: self.x_travel_cm,
        }
    }

    const fn y(&self) -> Edges {
        Edges {
            at_cm: self.y_cm,
            travel_cm: self.y_travel_cm,
        }
    }
}

/// A pair stands in so many places in a step at most.
const MOST_PARTS: f64 = 400.0;

/// The radiation gaps of a bank inside the limits, each with the part of the step that it stands for: a rounded leaf
/// end lets radiation pass behind its tip by the model's offset, and leaves that meet are closed. `None` when positions
/// are missing.
fn for_each_gap(
    bank: &Bank<'_>,
    (at, leaf_step_cm): (Between<'_>, f64),
    limits: [Edges; 2],
    mut take: impl FnMut(Gap, f64),
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
    let (start, end) = (start.split_at(pairs), end.split_at(pairs));
    let lower = start.0.iter().zip(end.0);
    let upper = start.1.iter().zip(end.1);
    // Most pairs lie under the jaws; the boundaries rise, as the model's do.
    let covered = bank
        .boundaries_cm
        .partition_point(|side| *side <= across.at_cm[0]);
    let pairs = bank.boundaries_cm.windows(2).zip(lower).zip(upper);
    for ((sides, lower), upper) in pairs.skip(covered.saturating_sub(1)) {
        if sides[0] >= across.at_cm[1] {
            break;
        }
        let width = Edges::still([sides[0], sides[1]]).and(across);
        if width.width_cm() <= 0.0 {
            continue;
        }
        let tips = Tips {
            start_cm: [*lower.0, *upper.0],
            end_cm: [*lower.1, *upper.1],
        };
        let offset_cm = bank.model.leaf_end_offset_cm;
        tips.in_parts(at, leaf_step_cm, |tips, part| {
            if tips.width_cm() <= tolerance::POSITION_CM {
                return;
            }
            let ends = Edges {
                at_cm: [tips.at_cm[0] - offset_cm, tips.at_cm[1] + offset_cm],
                ..tips
            };
            let gap = ends.and(along);
            if gap.width_cm() > 0.0 {
                let across = width;
                take(Gap { along: gap, across }, part);
            }
        });
    }
    Some(())
}

/// The tips of a leaf pair at two control points, lower and upper, cm.
struct Tips {
    start_cm: [f64; 2],
    end_cm: [f64; 2],
}

impl Tips {
    /// Where the tips stand in a step, or in each part of it when they move further than `leaf_step_cm`.
    #[inline]
    fn in_parts(&self, at: Between<'_>, leaf_step_cm: f64, mut take: impl FnMut(Edges, f64)) {
        let whole = at.edges(self.start_cm, self.end_cm);
        let way_cm = 2.0 * whole.travel_cm[0].max(whole.travel_cm[1]);
        if way_cm <= leaf_step_cm * (1.0 + 1e-9) {
            take(whole, 1.0);
            return;
        }
        let parts = (way_cm / leaf_step_cm - 1e-9).ceil().min(MOST_PARTS);
        for part in 0..parts as u32 {
            let share = (f64::from(part) + 0.5) / parts - 0.5;
            let at = Between {
                share: at.share + at.step * share,
                step: at.step / parts,
                ..at
            };
            take(at.edges(self.start_cm, self.end_cm), 1.0 / parts);
        }
    }
}
