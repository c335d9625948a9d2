//! What a beam's moments have in common, and why they could not be added up.

use super::bank::Bank;
use super::blocks::BlockShape;
use super::depth_track::DepthTrack;
use super::head::Heights;
use super::moments::{Moment, StepLimits};
use crate::beam_model::scatter::NoKernel;
use crate::beam_model::{BeamModel, CouchArc, HeadScatter, OutOfRange, Penumbra};
use crate::dose::placement::BeamGeometry;
use crate::dose::{FactorName, FieldModel, PlacedWedge, RayPoint};

/// Everything that does not change from moment to moment.
pub(super) struct Standing<'a> {
    pub(super) model: FieldModel<'a>,
    pub(super) geometry: &'a BeamGeometry,
    pub(super) banks: &'a [Bank<'a>],
    pub(super) blocks: &'a [BlockShape<'a>],
    pub(super) head: Option<(&'a HeadScatter, Heights)>,
    pub(super) depths: &'a DepthTrack,
    pub(super) penumbra: Penumbra,
    /// The fluence is compared with that at this distance from the point, cm in its plane.
    pub(super) margin_cm: f64,
    pub(super) steps: StepLimits,
    /// Height of the upper jaws, cm from the source; used below the smallest opening of the Sc table only.
    pub(super) jaw_height_cm: f64,
    /// Whether the couch counts by the gantry angle.
    pub(super) couch: bool,
    /// The wedge, with its item index in every control point's wedge positions.
    pub(super) wedge: Option<(PlacedWedge<'a>, usize)>,
}

/// Why the moments could not be added up.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum SumError {
    /// A position, an angle or a depth is missing.
    Missing(&'static str),
    /// A table does not reach.
    Range(FactorName, OutOfRange),
    /// Too few squares of the depth table reach this depth, cm.
    Squares(f64),
}

impl From<NoKernel> for SumError {
    fn from(why: NoKernel) -> Self {
        match why {
            NoKernel::Range(range) => Self::Range(FactorName::ApertureInPhantom, range),
            NoKernel::Squares(depth_cm) => Self::Squares(depth_cm),
        }
    }
}

impl Standing<'_> {
    pub(super) fn ray(&self, moment: &Moment<'_>) -> Result<RayPoint, SumError> {
        let gantry_deg = moment
            .gantry_deg
            .ok_or(SumError::Missing("a gantry angle"))?;
        self.geometry
            .ray_at(gantry_deg)
            .ok_or(SumError::Missing("the place of the point below the source"))
    }

    pub(super) fn beam(&self) -> &BeamModel {
        self.model.beam
    }

    pub(super) fn couch_at(&self, moment: &Moment<'_>) -> Option<CouchArc> {
        let gantry_deg = moment.gantry_deg?;
        self.couch
            .then(|| self.beam().couch_arc(gantry_deg.rem_euclid(360.0)))
            .flatten()
    }
}
