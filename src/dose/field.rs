//! One field as plain numbers: what the factor formalism needs to know of it,
//! from a plan or typed by hand, and which of it comes from a beam model. The
//! factors themselves are worked out in `factors`.

use thiserror::Error;

use super::aperture::point_square;
use super::{Factor, FactorName, FieldWedge, RayPoint};
use crate::beam_model::{
    BeamModel, CouchArc, JawAxis, OffAxisKind, OutOfRange, ReferenceOutput, collimator_square,
};
use crate::quantity::{CollimatorSquare, PointSquare, tolerance};

/// A beam model with what the collimator exchange needs to know of its machine.
#[derive(Clone, Copy, Debug)]
pub struct FieldModel<'a> {
    /// The beam's tables.
    pub beam: &'a BeamModel,
    /// Which jaw pair is nearer the source.
    pub upper_jaws: JawAxis,
}

/// Which form of the formalism.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Form {
    /// TPR and the point's own distance.
    Isocentric,
    /// Depth dose for a surface at this distance on the axis; the point's plane is at SSD + d = SPD.
    FixedSsd {
        /// SSD on the axis, cm, above 0.
        ssd_cm: f64,
    },
}

/// Depth of the point.
#[derive(Clone, Debug, PartialEq)]
pub struct FieldDepth {
    /// Geometric, perpendicular to a flat surface, cm; `None` when only a radiological depth is known.
    pub perpendicular_cm: Option<f64>,
    /// Radiological, along the ray, cm; equals the geometric one along the ray when nothing else is known.
    pub effective_cm: f64,
    /// On what it stands, for the trace.
    pub source: String,
}

/// A tray in the beam.
#[derive(Clone, Debug, PartialEq)]
pub struct Tray {
    /// Its ID.
    pub id: String,
    /// Its transmission, a share.
    pub transmission: f64,
}

/// A factor given by hand instead of taken from a model.
#[derive(Clone, Debug, PartialEq)]
pub struct Typed {
    /// The value: a ratio; cGy/MU for D'0; a share of 1 (not per cent) for the depth dose.
    pub value: f64,
    /// Where it comes from, for the trace.
    pub source: String,
}

impl Typed {
    /// A value whose source is "typed".
    #[must_use]
    pub fn new(value: f64) -> Self {
        Self {
            value,
            source: "typed".to_owned(),
        }
    }
}

/// One field, complete. Positions are in the collimator system at the isocentre plane.
#[derive(Clone, Debug)]
pub struct FieldInput<'a> {
    /// The tables; `None` when every factor is typed.
    pub model: Option<FieldModel<'a>>,
    /// X jaws, cm.
    pub jaws_x_cm: [f64; 2],
    /// Y jaws, cm.
    pub jaws_y_cm: [f64; 2],
    /// The point on its ray.
    pub ray: RayPoint,
    /// The point's depth.
    pub depth: FieldDepth,
    /// Form.
    pub form: Form,
    /// Tray in the beam.
    pub tray: Option<Tray>,
    /// Wedge in the beam.
    pub wedge: Option<FieldWedge<'a>>,
    /// Couch in the beam.
    pub couch: Option<CouchArc>,
    /// D'0, d0 and `S_ref` typed instead of the model's.
    pub reference: Option<ReferenceOutput>,
    /// Factors typed instead of the model's, and further transmission, which only comes typed.
    pub typed: Vec<(FactorName, Typed)>,
}

/// Why a dose per MU could not be calculated.
#[derive(Clone, Debug, Error, PartialEq)]
pub enum FactorError {
    /// A table does not reach that far.
    #[error("{}: {range}", .which.title())]
    OutOfRange {
        /// The factor that was looked up.
        which: FactorName,
        /// The range.
        range: OutOfRange,
    },
    /// Neither a model nor a typed value gives a factor.
    #[error("{} ({}) is neither typed nor given by a beam model", .which.title(), .which.symbol())]
    MissingFactor {
        /// The factor.
        which: FactorName,
    },
    /// A number with which no field can be calculated.
    #[error("{name} is {value}, which makes no field")]
    Unusable {
        /// What.
        name: &'static str,
        /// Its value.
        value: f64,
    },
}

impl FieldInput<'_> {
    /// Opening along x at the isocentre plane, cm.
    #[must_use]
    pub fn x_cm(&self) -> f64 {
        self.jaws_x_cm[1] - self.jaws_x_cm[0]
    }

    /// Opening along y at the isocentre plane, cm.
    #[must_use]
    pub fn y_cm(&self) -> f64 {
        self.jaws_y_cm[1] - self.jaws_y_cm[0]
    }

    /// Equivalent square for phantom scatter at the point's plane.
    #[must_use]
    pub fn point_square(&self) -> PointSquare {
        point_square(self.x_cm(), self.y_cm(), self.ray)
    }

    /// Equivalent square for collimator scatter; without a model both jaw pairs count alike.
    #[must_use]
    pub fn collimator_square(&self) -> CollimatorSquare {
        let (upper, k) = self.model.map_or((JawAxis::Y, 1.0), |model| {
            (model.upper_jaws, model.beam.exchange_k)
        });
        collimator_square(self.x_cm(), self.y_cm(), upper, k)
    }

    /// The depth that the TPR is taken at, cm.
    #[must_use]
    pub fn tpr_depth_cm(&self) -> f64 {
        match self.model.map(|model| model.beam.off_axis.kind) {
            Some(OffAxisKind::InWater) => self.depth.effective_cm * self.ray.cosine(),
            Some(OffAxisKind::InAir) | None => self.depth.effective_cm,
        }
    }

    pub(super) fn typed(&self, which: FactorName) -> Option<Factor> {
        let (_, typed) = self.typed.iter().find(|(name, _)| *name == which)?;
        Some(Factor {
            name: which,
            value: typed.value,
            source: typed.source.clone(),
        })
    }

    pub(super) fn beam(&self, which: FactorName) -> Result<&BeamModel, FactorError> {
        let model = self.model.ok_or(FactorError::MissingFactor { which })?;
        Ok(model.beam)
    }

    pub(super) fn reference(&self, which: FactorName) -> Result<ReferenceOutput, FactorError> {
        match self.reference {
            Some(reference) => Ok(reference),
            None => Ok(self.beam(which)?.output),
        }
    }

    pub(super) fn check(&self) -> Result<(), FactorError> {
        let mut positive = vec![
            ("the opening along x, cm,", self.x_cm()),
            ("the opening along y, cm,", self.y_cm()),
            ("the source-point distance, cm,", self.ray.spd_cm),
            ("the source-axis distance, cm,", self.ray.sad_cm),
        ];
        if let Form::FixedSsd { ssd_cm } = self.form {
            positive.push(("the SSD, cm,", ssd_cm));
        }
        let depths = [
            Some(("the effective depth, cm,", self.depth.effective_cm)),
            self.depth
                .perpendicular_cm
                .map(|depth_cm| ("the depth, cm,", depth_cm)),
        ];
        let not_positive = positive
            .into_iter()
            .find(|(_, value)| !(value.is_finite() && *value > 0.0));
        let negative = depths
            .into_iter()
            .flatten()
            .find(|(_, value)| !(value.is_finite() && *value >= 0.0));
        if let (Form::FixedSsd { ssd_cm }, Some(depth_cm)) =
            (self.form, self.depth.perpendicular_cm)
            && (self.ray.spd_cm - ssd_cm - depth_cm).abs() > tolerance::POSITION_CM
        {
            return Err(FactorError::Unusable {
                name: "SPD - SSD - d, cm, which must be 0,",
                value: self.ray.spd_cm - ssd_cm - depth_cm,
            });
        }
        match not_positive.or(negative) {
            Some((name, value)) => Err(FactorError::Unusable { name, value }),
            None => Ok(()),
        }
    }
}
