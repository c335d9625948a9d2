//! Wedges of a beam: which ones it has, their factor on the axis, their profile
//! along the wedge direction, and the sweep of a jaw that makes a dynamic one.
//! Which wedge a plan's beam means, how it stands in the collimator and what
//! its factor is multiplied with are the work of `dose`.

use serde::{Deserialize, Serialize};

use super::{Grid, JawAxis, Lookup, OutOfRange};
use crate::quantity::PointSquare;

/// What makes a wedge, without its tables.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum WedgeModelKind {
    /// A wedge of metal, put in by hand: in for the whole beam.
    Fixed,
    /// A wedge of metal that the machine moves in for part of the meterset.
    Motorised,
    /// A jaw that moves while the beam is on.
    Dynamic,
}

impl WedgeModelKind {
    /// The word for messages.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::Fixed => "fixed",
            Self::Motorised => "motorised",
            Self::Dynamic => "dynamic",
        }
    }
}

/// One wedge that a beam can have.
#[derive(Clone, Debug)]
pub struct WedgeModel {
    /// Its ID, as Wedge ID (300A,00D4) of the plans, trimmed.
    pub id: String,
    /// Further IDs under which plans name the same wedge.
    pub further_ids: Vec<String>,
    /// Nominal angle, degrees; of a dynamic wedge the angle that its sweep makes.
    pub angle_deg: f64,
    /// Its tables.
    pub body: WedgeBody,
}

/// Tables of a wedge.
#[derive(Clone, Debug)]
pub enum WedgeBody {
    /// Of one that is put in by hand.
    Fixed(WedgeTables),
    /// Of one that the machine moves in.
    Motorised(WedgeTables),
    /// Of one that a jaw makes.
    Dynamic(WedgeSweep),
}

/// A wedge of metal: both tables hold for the wedge in the beam.
#[derive(Clone, Debug)]
pub struct WedgeTables {
    /// Dose on the axis with the wedge over dose without it at the same MU: depth_cm down, side_cm of the square at
    /// the point's plane across.
    pub factor: Grid,
    /// Fluence with the wedge over fluence without it along the wedge direction, 1 on the axis: position_cm at the
    /// isocentre plane down, positive towards the thin end; one column.
    pub profile: Grid,
}

/// A jaw's sweep at the full range that the machine has for it. The jaw starts at the thick end, where the beam is
/// covered first, and moves towards the thin end, where the other jaw of its pair stands still.
///
/// A field uses the part from its own open jaw position to [`Self::closing_gap_cm`] short of the fixed jaw: the
/// share that the table has at the open position is delivered with the jaw standing there, and the meterset of the
/// beam belongs to the share at the end of that part. A smaller angle than the wedge's own mixes the sweep with the open
/// field by what both give on the axis; the arithmetic stands in `dose`.
#[derive(Clone, Debug)]
pub struct WedgeSweep {
    /// The axis of the moving jaw pair.
    pub moves_along: JawAxis,
    /// Distance at which the moving jaw stops before the fixed one, cm at the isocentre plane.
    pub closing_gap_cm: f64,
    /// Share of the sweep's meterset, 0 to 1, that has been delivered when the jaw passes position_cm (at the
    /// isocentre plane, positive towards the thin end). Where the first row is above 0, that share comes with the jaw at rest there.
    pub delivered: Grid,
    /// Measured factor on the axis of squares for the sweep's own angle, as [`WedgeTables::factor`]; `None` when not given.
    /// It is held against the sweep and never put in its place: the dose rests on the sweep.
    pub factor: Option<Grid>,
}

impl WedgeTables {
    /// The wedge factor on the axis, for a depth (radiological where known) and the square at the point's plane.
    ///
    /// # Errors
    /// When depth or side is outside the table.
    pub fn factor(&self, depth_cm: f64, square: PointSquare) -> Result<Lookup, OutOfRange> {
        self.factor.at(depth_cm, square.side_cm())
    }

    /// The ratio of the profile at a position along the wedge direction, cm at the isocentre plane, positive towards
    /// the thin end.
    ///
    /// # Errors
    /// When the position is outside the table.
    pub fn profile(&self, position_cm: f64) -> Result<Lookup, OutOfRange> {
        self.profile.at(position_cm, 0.0)
    }
}

impl WedgeSweep {
    /// Share of the sweep's meterset that has been delivered when the moving jaw passes a position, cm at the isocentre
    /// plane, positive towards the thin end.
    ///
    /// # Errors
    /// When the position is outside the table.
    pub fn delivered_share(&self, position_cm: f64) -> Result<Lookup, OutOfRange> {
        self.delivered.at(position_cm, 0.0)
    }
}

impl WedgeModel {
    /// Its kind.
    #[must_use]
    pub const fn kind(&self) -> WedgeModelKind {
        match self.body {
            WedgeBody::Fixed(_) => WedgeModelKind::Fixed,
            WedgeBody::Motorised(_) => WedgeModelKind::Motorised,
            WedgeBody::Dynamic(_) => WedgeModelKind::Dynamic,
        }
    }

    /// Factor and profile; `None` for a dynamic wedge, whose field changes both.
    #[must_use]
    pub const fn tables(&self) -> Option<&WedgeTables> {
        match &self.body {
            WedgeBody::Fixed(tables) | WedgeBody::Motorised(tables) => Some(tables),
            WedgeBody::Dynamic(_) => None,
        }
    }

    /// The sweep of a dynamic wedge.
    #[must_use]
    pub const fn sweep(&self) -> Option<&WedgeSweep> {
        match &self.body {
            WedgeBody::Dynamic(sweep) => Some(sweep),
            WedgeBody::Fixed(_) | WedgeBody::Motorised(_) => None,
        }
    }

    /// Its ID and the further ones.
    pub fn ids(&self) -> impl Iterator<Item = &str> {
        std::iter::once(self.id.as_str()).chain(self.further_ids.iter().map(String::as_str))
    }
}
