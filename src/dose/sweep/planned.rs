//! A dynamic wedge of a plan with the sweep that makes it: angle, which way the
//! thin end lies, and which jaw moves. How far it goes in a field is worked out in `motion`.

use crate::beam_model::{JawAxis, WedgeModel, WedgeSweep};
use crate::dose::delivery::turn_between_deg;
use crate::dose::text::number;
use crate::dose::{Obstacle, Technique};
use crate::plan::Wedge;
use crate::quantity::tolerance;

/// A dynamic wedge of a plan, with the sweep of the model that makes it.
#[derive(Clone, Copy, Debug)]
pub(in crate::dose) struct PlannedSweep<'a> {
    pub(super) model: &'a WedgeModel,
    pub(super) sweep: &'a WedgeSweep,
    pub(super) orientation_deg: f64,
    /// The plan's angle, above 0, at most the model's.
    pub(super) angle_deg: f64,
    /// Which way the thin end lies on the sweep's axis.
    pub(super) thin_end: ThinEnd,
}

/// Where the thin end of a wedge lies along its axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum ThinEnd {
    /// Towards positive coordinates: the jaw at negative ones moves.
    Positive,
    /// Towards negative coordinates.
    Negative,
}

/// What keeps a sweep that the plan does not state from being put into a beam that moves otherwise.
pub(in crate::dose) fn motion_beside_sweep(technique: Technique) -> Option<Obstacle> {
    (technique != Technique::Wedge).then(|| Obstacle::technique("a dynamic wedge whose jaw motion the control points do not spell out is in a beam whose opening or gantry moves: how the two go together is not stated, verify the beam by other means".to_owned()))
}

impl<'a> PlannedSweep<'a> {
    /// The wedge (`name` in words) with the model's sweep of its ID.
    ///
    /// # Errors
    /// When the plan's angle is missing, not above 0 or above the sweep's, or when the sweep's jaws do not move along
    /// the wedge.
    pub(in crate::dose) fn new(
        (wedge, name): (&Wedge, &str),
        (model, sweep): (&'a WedgeModel, &'a WedgeSweep),
        orientation_deg: f64,
    ) -> Result<Self, Obstacle> {
        let Some(angle_deg) = wedge.angle_deg.get() else {
            return Err(Obstacle::reading(format!(
                "Wedge Angle (300A,00D5) of {name} is not given: how much of the sweep it takes is not certain"
            )));
        };
        // NaN must not pass.
        let usable = angle_deg > tolerance::ANGLE_DEG
            && angle_deg <= model.angle_deg + tolerance::ANGLE_DEG
            && model.angle_deg < 90.0;
        if !usable {
            return Err(Obstacle::model(format!(
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
                return Err(Obstacle::model(format!(
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
    pub(in crate::dose) fn reversed(&self) -> Self {
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
    pub(in crate::dose) fn id(&self) -> &'a str {
        &self.model.id
    }

    pub(in crate::dose) const fn sweep(&self) -> &'a WedgeSweep {
        self.sweep
    }

    /// Position along the sweep of a place [x, y] of the collimator system, cm.
    pub(in crate::dose) fn position_cm(&self, [x_cm, y_cm]: [f64; 2]) -> f64 {
        let along_cm = match self.sweep.moves_along {
            JawAxis::X => x_cm,
            JawAxis::Y => y_cm,
        };
        self.thin_end.signed(along_cm)
    }

    /// Names of the jaw that moves and of the one that stands.
    pub(super) const fn jaw_names(&self) -> [&'static str; 2] {
        match (self.sweep.moves_along, self.thin_end) {
            (JawAxis::X, ThinEnd::Positive) => ["X1", "X2"],
            (JawAxis::X, ThinEnd::Negative) => ["X2", "X1"],
            (JawAxis::Y, ThinEnd::Positive) => ["Y1", "Y2"],
            (JawAxis::Y, ThinEnd::Negative) => ["Y2", "Y1"],
        }
    }
}

impl ThinEnd {
    /// From a coordinate of the collimator system to a position along the sweep, and back.
    pub(super) const fn signed(self, cm: f64) -> f64 {
        match self {
            Self::Positive => cm,
            Self::Negative => -cm,
        }
    }
}
