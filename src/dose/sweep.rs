//! A dynamic wedge whose plan states the field and no motion: from the beam
//! model's sweep to the motion of the jaw in this field.
//!
//! S(p) is the share of the full sweep's meterset that has been delivered when the moving jaw passes the position p
//! (isocentre plane, positive towards the thin end). The jaw comes from the thick end, so a place p is open until the
//! jaw passes it: with the whole sweep its fluence is S(p) of that of an open field.
//!
//! **A smaller angle** theta than the sweep's own A is made of that sweep and an open field, weighted by what they
//! give on the central axis: w = tan(theta) / tan(A) of A and 1 - w of open,
//!
//! ```text
//! F(p) / F(0) = w S(p) / S(0) + (1 - w)        so, in units of the full sweep,   S'(p) = w S(p) + (1 - w) S(0)
//! ```
//!
//! which is not a share of the MU: S(0) of an open field gives as much on the axis as the whole sweep does. (That the
//! weight is that of the tangents, and of the axis, is common practice for such wedges.)
//!
//! **A field** has its open jaw at p1 and the opposed one, which stands, at p2. It uses the part of the sweep from p1 to
//! e = p2 - gap. S'(p1) is delivered before the jaw moves; at e the beam ends, so its meterset is S'(e), and the share
//! of it with the jaw short of p is
//!
//! ```text
//! share(p) = S'(p) / S'(e),   p1 <= p <= e
//! ```
//!
//! which is also the fluence at p per MU of the beam; between e and p2 it is 1. The table is linear between its rows, so
//! a jaw that moves evenly from row to row delivers exactly this. What such a motion does to the dose is integrated in
//! `shaped`; what is told about it is the matter of `swept_field`.

use super::delivery::{Interval, turn_between_deg};
use super::text::number;
use super::{Obstacle, ObstacleKind, Technique};
use crate::beam_model::{JawAxis, MachineModel, WedgeModel, WedgeSweep};
use crate::plan::{ControlPoint, Wedge};
use crate::quantity::{Given, tolerance};

/// A dynamic wedge of a plan, with the sweep of the model that makes it.
#[derive(Clone, Copy, Debug)]
pub(super) struct PlannedSweep<'a> {
    model: &'a WedgeModel,
    sweep: &'a WedgeSweep,
    orientation_deg: f64,
    /// The plan's angle, above 0, at most the model's.
    angle_deg: f64,
    /// Which way the thin end lies on the sweep's axis.
    thin_end: ThinEnd,
}

/// Where the thin end of a wedge lies along its axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum ThinEnd {
    /// Towards positive coordinates: the jaw at negative ones moves.
    Positive,
    /// Towards negative coordinates.
    Negative,
}

/// What a sweep comes to in one field. Positions are along the sweep, cm at the isocentre plane, positive towards the
/// thin end.
#[derive(Clone, Debug)]
pub(super) struct JawMotion<'a> {
    planned: PlannedSweep<'a>,
    /// Share of the sweep's own angle, above 0, at most 1.
    pub(super) weight: f64,
    /// S(0) of the table.
    at_axis: f64,
    /// Where the jaw stands first, p1.
    pub(super) from_cm: f64,
    /// Where it stops, e.
    pub(super) to_cm: f64,
    /// Where the opposed jaw stands, p2.
    fixed_cm: f64,
    /// S'(p1) and S'(e).
    shares: [f64; 2],
    /// Where jaws and leaves stand; no control points of the plan.
    points: Vec<ControlPoint>,
}

fn unlike_model(message: String) -> Obstacle {
    Obstacle {
        kind: ObstacleKind::Model,
        message,
    }
}

fn reading(message: String) -> Obstacle {
    Obstacle {
        kind: ObstacleKind::Reading,
        message,
    }
}

/// What keeps a sweep that the plan does not state from being put into a beam that moves otherwise.
pub(super) fn motion_beside_sweep(technique: Technique) -> Option<Obstacle> {
    (technique != Technique::Wedge).then(|| Obstacle {
        kind: ObstacleKind::Technique,
        message: "a dynamic wedge whose jaw motion the control points do not spell out is in a beam whose opening or gantry moves: how the two go together is not stated, verify the beam by other means".to_owned(),
    })
}

impl<'a> PlannedSweep<'a> {
    /// The wedge (`name` in words) with the model's sweep of its ID.
    ///
    /// # Errors
    /// When the plan's angle is missing, not above 0 or above the sweep's, or when the sweep's jaws do not move along
    /// the wedge.
    pub(super) fn new(
        (wedge, name): (&Wedge, &str),
        (model, sweep): (&'a WedgeModel, &'a WedgeSweep),
        orientation_deg: f64,
    ) -> Result<Self, Obstacle> {
        let Some(angle_deg) = wedge.angle_deg.get() else {
            return Err(reading(format!(
                "Wedge Angle (300A,00D5) of {name} is not given: how much of the sweep it takes is not certain"
            )));
        };
        // NaN must not pass.
        let usable = angle_deg > tolerance::ANGLE_DEG
            && angle_deg <= model.angle_deg + tolerance::ANGLE_DEG
            && model.angle_deg < 90.0;
        if !usable {
            return Err(unlike_model(format!(
                "the plan states {} degrees for {name} (300A,00D5); the beam model's sweep makes angles above 0 and up to {} degrees",
                number(angle_deg),
                number(model.angle_deg)
            )));
        }
        let lies_at = |deg: f64| turn_between_deg(orientation_deg, deg) <= tolerance::ANGLE_DEG;
        // The thin end lies towards (-sin a, cos a), see `PlacedWedge::position_cm`.
        let (positive_deg, negative_deg, axis) = match sweep.moves_along {
            JawAxis::Y => (0.0, 180.0, "Y"),
            JawAxis::X => (270.0, 90.0, "X"),
        };
        let thin_end = match (lies_at(positive_deg), lies_at(negative_deg)) {
            (true, _) => ThinEnd::Positive,
            (_, true) => ThinEnd::Negative,
            (false, false) => {
                return Err(unlike_model(format!(
                    "Wedge Orientation (300A,00D8) of {name} is {} degrees, and the beam model's sweep is one of the {axis} jaws, which make a wedge at {positive_deg} and {negative_deg} degrees only",
                    number(orientation_deg)
                )));
            }
        };
        Ok(Self {
            model,
            sweep,
            orientation_deg,
            angle_deg: angle_deg.min(model.angle_deg),
            thin_end,
        })
    }

    /// The same wedge turned round.
    pub(super) fn reversed(&self) -> Self {
        Self {
            orientation_deg: self.orientation_deg + 180.0,
            thin_end: match self.thin_end {
                ThinEnd::Positive => ThinEnd::Negative,
                ThinEnd::Negative => ThinEnd::Positive,
            },
            ..*self
        }
    }

    /// ID in the model.
    pub(super) fn id(&self) -> &'a str {
        &self.model.id
    }

    pub(super) const fn sweep(&self) -> &'a WedgeSweep {
        self.sweep
    }

    /// Position along the sweep of a place [x, y] of the collimator system, cm.
    pub(super) fn position_cm(&self, [x_cm, y_cm]: [f64; 2]) -> f64 {
        let along_cm = match self.sweep.moves_along {
            JawAxis::X => x_cm,
            JawAxis::Y => y_cm,
        };
        self.thin_end.signed(along_cm)
    }

    /// Names of the jaw that moves and of the one that stands.
    const fn jaw_names(&self) -> [&'static str; 2] {
        match (self.sweep.moves_along, self.thin_end) {
            (JawAxis::X, ThinEnd::Positive) => ["X1", "X2"],
            (JawAxis::X, ThinEnd::Negative) => ["X2", "X1"],
            (JawAxis::Y, ThinEnd::Positive) => ["Y1", "Y2"],
            (JawAxis::Y, ThinEnd::Negative) => ["Y2", "Y1"],
        }
    }

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
            reading(format!(
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
            return Err(unlike_model(format!(
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
                unlike_model(format!(
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

impl ThinEnd {
    /// From a coordinate of the collimator system to a position along the sweep, and back.
    const fn signed(self, cm: f64) -> f64 {
        match self {
            Self::Positive => cm,
            Self::Negative => -cm,
        }
    }
}

impl<'a> JawMotion<'a> {
    /// The wedge.
    pub(super) const fn planned(&self) -> &PlannedSweep<'a> {
        &self.planned
    }

    /// Share of the beam's meterset with the jaw short of a position, 0 to 1.
    pub(super) fn share(&self, position_cm: f64) -> f64 {
        let within_cm = position_cm.clamp(self.from_cm, self.to_cm);
        self.mixed(within_cm) / self.shares[1]
    }

    /// S'(p) inside the field.
    fn mixed(&self, position_cm: f64) -> f64 {
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

    /// The arithmetic of [`Self::share`] at a position, for a person.
    pub(super) fn share_in_words(&self, position_cm: f64) -> String {
        let within_cm = position_cm.clamp(self.from_cm, self.to_cm);
        let table = self.planned.sweep.delivered_share(within_cm);
        let source = table.map_or_else(
            |range| range.to_string(),
            |lookup| format!("S({}) = {}", number(within_cm), lookup.source()),
        );
        format!(
            "S'({}) / S'({}) = {} / {}; {source}",
            number(within_cm),
            number(self.to_cm),
            number(self.mixed(within_cm)),
            number(self.shares[1])
        )
    }

    /// What was taken from the model, so that it can be done again by hand.
    pub(super) fn in_words(&self, name: &str) -> String {
        let planned = &self.planned;
        let [moving, standing] = planned.jaw_names();
        let place = |position_cm: f64| number(planned.thin_end.signed(position_cm));
        let angle = number(planned.angle_deg);
        let table_angle = number(planned.model.angle_deg);
        let mixing = if self.weight >= 1.0 {
            format!("S' = S, {angle} degrees being the sweep's own angle")
        } else {
            format!(
                "S'(p) = w S(p) + (1 - w) S(0) with w = tan {angle} / tan {table_angle} = {} and S(0) = {}",
                number(self.weight),
                number(self.at_axis)
            )
        };
        format!(
            "{name}, {angle} degrees at orientation {}: the plan does not spell out how its jaw moves; the motion is the beam model's sweep of {} ({}, {table_angle} degrees), and stands in no control point of the plan. Jaw {moving} goes from {} to {} cm, {} cm before {standing}; p is {}{} positive towards the thin end; {mixing}. {} of the meterset comes before the jaw moves: S'({}) / S'({}) = {} / {}. No wedge factor is applied",
            number(planned.orientation_deg),
            planned.id(),
            planned.sweep.delivered.name(),
            place(self.from_cm),
            place(self.to_cm),
            number(planned.sweep.closing_gap_cm),
            match planned.thin_end {
                ThinEnd::Positive => "",
                ThinEnd::Negative => "-",
            },
            match planned.sweep.moves_along {
                JawAxis::X => "x,",
                JawAxis::Y => "y,",
            },
            format_args!("{} %", number(100.0 * self.shares[0] / self.shares[1])),
            number(self.from_cm),
            number(self.to_cm),
            number(self.shares[0]),
            number(self.shares[1]),
        )
    }
}
