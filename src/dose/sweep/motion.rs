//! The motion of the jaw in one field: where it begins and stops, which share of
//! the meterset it has delivered where, and what keeps the field from being swept at all. It is told in `words`.

use super::planned::{PlannedSweep, ThinEnd};
use crate::beam_model::{JawAxis, MachineModel};
use crate::dose::delivery::Interval;
use crate::dose::text::number;
use crate::dose::{Obstacle, ObstacleKind};
use crate::plan::ControlPoint;
use crate::quantity::{Given, tolerance};

/// What a sweep comes to in one field. Positions are along the sweep, cm at the isocentre plane, positive towards the
/// thin end.
#[derive(Clone, Debug)]
pub(super) struct JawMotion<'a> {
    pub(super) planned: PlannedSweep<'a>,
    /// Share of the sweep's own angle, above 0, at most 1.
    pub(super) weight: f64,
    /// S(0) of the table.
    pub(super) at_axis: f64,
    /// Where the jaw stands first, p1.
    pub(super) from_cm: f64,
    /// Where it stops, e.
    pub(super) to_cm: f64,
    /// Where the opposed jaw stands, p2.
    fixed_cm: f64,
    /// S'(p1) and S'(e).
    pub(super) shares: [f64; 2],
    /// Where jaws and leaves stand; no control points of the plan.
    points: Vec<ControlPoint>,
}

impl<'a> PlannedSweep<'a> {
    /// The motion in a field with jaws as at a control point.
    ///
    /// # Errors
    /// When jaws are missing or closed, when the field is no wider than the closing gap, beyond the sweep's table or
    /// the travel of the jaw, or when nothing is delivered on the axis.
    pub(super) fn motion(
        &self,
        machine: &MachineModel,
        at: &ControlPoint,
    ) -> Result<JawMotion<'a>, Obstacle> {
        let jaws = match self.sweep.moves_along {
            JawAxis::X => &at.jaws_x_cm,
            JawAxis::Y => &at.jaws_y_cm,
        };
        let [low_cm, high_cm] = jaws.get().ok_or_else(|| {
            Obstacle::reading(format!(
                "the positions of the jaws {} and {} are not given: where the sweep of the wedge {} begins is not certain",
                self.jaw_names()[0],
                self.jaw_names()[1],
                self.id()
            ))
        })?;
        let (from_cm, fixed_cm) = match self.thin_end {
            ThinEnd::Positive => (low_cm, high_cm),
            ThinEnd::Negative => (-high_cm, -low_cm),
        };
        let to_cm = fixed_cm - self.sweep.closing_gap_cm;
        // NaN must not pass.
        let sweeps = to_cm - from_cm > tolerance::POSITION_CM;
        if !sweeps {
            return Err(Obstacle {
                kind: ObstacleKind::Technique,
                message: format!(
                    "the field is {} cm wide along the wedge {}, whose jaw stops {} cm before the other one: nothing is left to sweep",
                    number(fixed_cm - from_cm),
                    self.id(),
                    number(self.sweep.closing_gap_cm)
                ),
            });
        }
        self.within_travel(machine, [from_cm, to_cm])?;
        let share = |position_cm: f64| {
            let found = self.sweep.delivered_share(position_cm);
            found.map(|lookup| lookup.value).map_err(|range| Obstacle {
                kind: ObstacleKind::TableRange,
                message: format!(
                    "outside the method's range: sweep of the wedge {}: {range}",
                    self.id()
                ),
            })
        };
        let at_axis = share(0.0)?;
        let weight = self.weight();
        let mixed = |share: f64| weight * share + (1.0 - weight) * at_axis;
        let shares = [mixed(share(from_cm)?), mixed(share(to_cm)?)];
        // Without fluence on the axis there is nothing to weigh the angle by.
        if !(at_axis > 0.0 && shares[1] > 0.0) {
            return Err(Obstacle::model(format!(
                "the sweep of the wedge {} ({}) delivers nothing before its jaw reaches the axis or the end of the field",
                self.id(),
                self.sweep.delivered.name()
            )));
        }
        let mut motion = JawMotion {
            planned: *self,
            weight,
            at_axis,
            from_cm,
            to_cm,
            fixed_cm,
            shares,
            points: Vec::new(),
        };
        motion.points = motion.control_points(at, [low_cm, high_cm]);
        Ok(motion)
    }

    /// tan(theta) / tan(A).
    fn weight(&self) -> f64 {
        if (self.angle_deg - self.model.angle_deg).abs() <= tolerance::ANGLE_DEG {
            return 1.0;
        }
        self.angle_deg.to_radians().tan() / self.model.angle_deg.to_radians().tan()
    }

    /// What the model states of the jaw's travel.
    fn within_travel(
        &self,
        machine: &MachineModel,
        [from_cm, to_cm]: [f64; 2],
    ) -> Result<(), Obstacle> {
        let Some(pair) = machine.collimation.jaw(self.sweep.moves_along) else {
            return Ok(());
        };
        let beyond = |reaches_cm: f64, limit_cm: Option<f64>, what: &str| {
            let limit_cm = limit_cm?;
            (reaches_cm > limit_cm + tolerance::POSITION_CM).then(|| {
                Obstacle::model(format!(
                    "the sweep of the wedge {} takes the jaw {} {} cm {what} the axis, and the beam model lets it go {} cm: the machine cannot deliver this field",
                    self.id(),
                    self.jaw_names()[0],
                    number(reaches_cm),
                    number(limit_cm)
                ))
            })
        };
        // The moving jaw is the one on the thick, negative side.
        beyond(-from_cm, pair.travel.outward_cm, "outward from")
            .or_else(|| beyond(to_cm, pair.travel.across_cm, "across"))
            .map_or(Ok(()), Err)
    }
}

impl<'a> JawMotion<'a> {
    /// Share of the beam's meterset with the jaw short of a position, 0 to 1.
    pub(super) fn share(&self, position_cm: f64) -> f64 {
        let within_cm = position_cm.clamp(self.from_cm, self.to_cm);
        self.mixed(within_cm) / self.shares[1]
    }

    /// S'(p) inside the field.
    pub(super) fn mixed(&self, position_cm: f64) -> f64 {
        let found = self.planned.sweep.delivered_share(position_cm);
        // Both ends of the field are in the table, so all between are.
        let share = found.map_or(f64::NAN, |lookup| lookup.value);
        self.weight * share + (1.0 - self.weight) * self.at_axis
    }

    /// One stand for the share that comes before the jaw moves, one at every row of the table, one where it stops.
    fn control_points(&self, at: &ControlPoint, jaws_cm: [f64; 2]) -> Vec<ControlPoint> {
        let apart = |a_cm: f64, b_cm: f64| (a_cm - b_cm).abs() > tolerance::TABLE_EDGE_CM;
        let rows = self.planned.sweep.delivered.rows().iter().copied();
        let between = rows.filter(|&row_cm| {
            row_cm > self.from_cm
                && row_cm < self.to_cm
                && apart(row_cm, self.from_cm)
                && apart(row_cm, self.to_cm)
        });
        let moving = std::iter::once(self.from_cm)
            .chain(between)
            .chain(std::iter::once(self.to_cm));
        let first = std::iter::once((self.from_cm, 0.0));
        first
            .chain(moving.map(|position_cm| (position_cm, self.share(position_cm))))
            .map(|(position_cm, share)| self.control_point(at, jaws_cm, (position_cm, share)))
            .collect()
    }

    fn control_point(
        &self,
        at: &ControlPoint,
        [low_cm, high_cm]: [f64; 2],
        (position_cm, share): (f64, f64),
    ) -> ControlPoint {
        let how = "the beam model's sweep";
        let mut point = ControlPoint {
            cumulative_weight: Given::derived(share, how),
            ..at.clone()
        };
        let moved_cm = self.planned.thin_end.signed(position_cm);
        let jaws_cm = match self.planned.thin_end {
            ThinEnd::Positive => [moved_cm, high_cm],
            ThinEnd::Negative => [low_cm, moved_cm],
        };
        match self.planned.sweep.moves_along {
            JawAxis::X => point.jaws_x_cm = Given::derived(jaws_cm, how),
            JawAxis::Y => point.jaws_y_cm = Given::derived(jaws_cm, how),
        }
        point
    }

    /// The stretches of the sweep in which meterset accrues; their indices count stretches, not the plan's control
    /// points.
    pub(super) fn intervals(&self) -> Vec<Interval<'_>> {
        let weight = |point: &ControlPoint| point.cumulative_weight.get().unwrap_or(f64::NAN);
        let pairs = self.points.iter().zip(self.points.iter().skip(1));
        pairs
            .enumerate()
            .map(|(start_index, (start, end))| Interval {
                start_index,
                start,
                end,
                weight: weight(end) - weight(start),
            })
            // NaN stays in, and makes the dose NaN.
            .filter(|interval| interval.weight > 0.0 || interval.weight.is_nan())
            .collect()
    }

    /// Where jaws and leaves stand at the end.
    pub(super) fn last_point(&self) -> Option<&ControlPoint> {
        self.points.last()
    }

    /// The field with the jaw where it stands first, for the whole meterset.
    pub(super) fn open(&self) -> Vec<Interval<'_>> {
        let first = self.points.first();
        first
            .map(|point| Interval {
                start_index: 0,
                start: point,
                end: point,
                weight: 1.0,
            })
            .into_iter()
            .collect()
    }

    /// Whether the field is the same on both sides of the axis along the sweep.
    pub(super) fn is_symmetric(&self) -> bool {
        (self.from_cm + self.fixed_cm).abs() <= tolerance::POSITION_CM
    }
}
