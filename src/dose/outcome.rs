//! What the calculation of one beam hands to the audit: everything that could
//! be worked out, and every obstacle that keeps the result from being a
//! verification. An outcome with an obstacle may still carry a number; it is
//! shown, and never judged as within.

use std::sync::Arc;

use serde::Serialize;

use super::{ShapedResult, Trace};
use crate::quantity::{Collimator, CollimatorSquare, Patient, Point, PointSquare};

/// Technique of a beam, first match of: setup, electron, arc, dynamic, segmented, wedge, blocked, mlc, static.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Technique {
    /// Not delivered for treatment.
    Setup,
    /// Electrons.
    Electron,
    /// The gantry turns while meterset accrues.
    Arc,
    /// The aperture moves while meterset accrues.
    Dynamic,
    /// Several apertures.
    Segmented,
    /// A wedge is in the beam.
    Wedge,
    /// Blocks.
    Blocked,
    /// Leaves cut inside the jaws.
    Mlc,
    /// Jaws alone.
    Static,
}

impl Technique {
    /// The word used in outputs.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::Setup => "setup",
            Self::Electron => "electron",
            Self::Arc => "arc",
            Self::Dynamic => "dynamic",
            Self::Segmented => "segmented",
            Self::Wedge => "wedge",
            Self::Blocked => "blocked",
            Self::Mlc => "mlc",
            Self::Static => "static",
        }
    }
}

/// How a result was calculated.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Method {
    /// Factor formalism.
    Factors,
    /// Scatter integration.
    ScatterIntegration,
}

impl Method {
    /// The word used in outputs.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::Factors => "factors",
            Self::ScatterIntegration => "scatter-integration",
        }
    }
}

/// Which rule gave the calculation point.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum PointBasis {
    /// Beam Dose Specification Point (300A,0082).
    Beam,
    /// A Dose Reference named by the beam reference or the control points.
    Reference,
    /// The lowest-numbered TARGET Dose Reference with coordinates.
    Target,
    /// The isocentre.
    Isocentre,
}

impl PointBasis {
    /// The word used in outputs; `none` stands for no point.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::Beam => "beam",
            Self::Reference => "reference",
            Self::Target => "target",
            Self::Isocentre => "isocentre",
        }
    }
}

/// The calculation point.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct DosePoint {
    /// Which rule gave it.
    pub basis: PointBasis,
    /// From which attribute or item, in words.
    pub source: String,
    /// In the patient.
    pub patient: Point<Patient>,
    /// In the collimator system; `None` when the geometry could not be worked out.
    pub collimator: Option<Point<Collimator>>,
    /// Source-point distance along the axis, SAD - z_b, cm.
    pub spd_cm: Option<f64>,
    /// Projection onto the isocentre plane [x, y], cm.
    pub projected_cm: Option<[f64; 2]>,
    /// Off-axis radius of the projection, cm.
    pub off_axis_cm: Option<f64>,
}

/// On what ground a depth stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum DepthBasis {
    /// A row of the table that the user supplied.
    Table,
    /// The plan's point depth attributes.
    Plan,
    /// The plan's SSD and a flat surface perpendicular to the axis.
    Ssd,
}

impl DepthBasis {
    /// The word used in outputs; `none` stands for no depth.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::Table => "table",
            Self::Plan => "plan",
            Self::Ssd => "ssd",
        }
    }
}

/// One depth that could be used, best basis first.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct DepthCandidate {
    /// The ground it stands on.
    pub basis: DepthBasis,
    /// Whether that ground is independent of the planning system.
    pub independent: bool,
    /// Geometric depth perpendicular to a flat surface, cm; `None` when only a radiological one is known.
    pub perpendicular_cm: Option<f64>,
    /// Geometric depth along the ray from the source, cm.
    pub along_ray_cm: Option<f64>,
    /// Radiological depth along the ray, cm; equals the geometric one when the basis has none.
    pub effective_cm: f64,
    /// SSD on the axis, cm, when known.
    pub ssd_cm: Option<f64>,
    /// From which attributes or file, in words.
    pub source: String,
}

/// Equivalent squares of a beam.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Squares {
    /// For collimator scatter, at the isocentre plane.
    #[serde(rename = "collimator_square_cm")]
    pub collimator: CollimatorSquare,
    /// For phantom scatter, at the plane of the point.
    #[serde(rename = "phantom_square_cm")]
    pub phantom: Option<PointSquare>,
}

/// Why a result is no verification.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum ObstacleKind {
    /// The reader could not read what the calculation needs.
    Reading,
    /// A technique or device that no method here covers.
    Technique,
    /// No model, or no such energy in it, or geometry unlike the plan's.
    Model,
    /// No usable meterset.
    Meterset,
    /// The dose point is not stated.
    Point,
    /// No depth.
    Depth,
    /// No comparable planned dose.
    PlannedDose,
    /// Outside the method's range: shallower than the depth of dose maximum.
    BuildUp,
    /// Outside the method's range: too near a field edge.
    FieldEdge,
    /// Outside the method's range: outside the opening.
    UnderDevice,
    /// Outside the method's range: beyond a measured table.
    TableRange,
}

/// One obstacle.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Obstacle {
    /// Kind.
    pub kind: ObstacleKind,
    /// One sentence: what, with its numbers, and what to do.
    pub message: String,
}

impl Obstacle {
    /// The model lacks something or contradicts the plan.
    pub(super) const fn model(message: String) -> Self {
        Self {
            kind: ObstacleKind::Model,
            message,
        }
    }

    /// The plan does not say what is needed.
    pub(super) const fn reading(message: String) -> Self {
        Self {
            kind: ObstacleKind::Reading,
            message,
        }
    }

    /// No method covers what the plan has.
    pub(super) const fn technique(message: String) -> Self {
        Self {
            kind: ObstacleKind::Technique,
            message,
        }
    }
}

/// One contribution to the expected spread.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SpreadTerm {
    /// What from.
    pub name: &'static str,
    /// 1 sigma, per cent of the dose.
    pub percent: f64,
    /// How it was estimated.
    pub source: String,
}

/// Expected spread of the result, 1 sigma: the terms added in quadrature.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Spread {
    /// The terms.
    pub terms: Vec<SpreadTerm>,
    /// Root of the sum of squares, per cent.
    pub percent: f64,
}

impl Spread {
    /// From its terms.
    #[must_use]
    pub fn new(terms: Vec<SpreadTerm>) -> Self {
        let percent = terms
            .iter()
            .map(|term| term.percent * term.percent)
            .sum::<f64>()
            .sqrt();
        Self { terms, percent }
    }
}

/// One leaf pair's opening as a rectangle in the beam's-eye view, cm at the isocentre plane.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct LeafOpening {
    /// Lower x.
    pub x1_cm: f64,
    /// Upper x.
    pub x2_cm: f64,
    /// Lower y.
    pub y1_cm: f64,
    /// Upper y.
    pub y2_cm: f64,
}

/// What the beam's-eye view draws, cm at the isocentre plane in the collimator system.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct BeamView {
    /// X jaws of the control point where dose begins.
    pub jaws_x_cm: Option<[f64; 2]>,
    /// Y jaws of the control point where dose begins.
    pub jaws_y_cm: Option<[f64; 2]>,
    /// Leaf openings of the control point where dose begins, by bank.
    pub leaf_banks: Vec<Vec<LeafOpening>>,
    /// Block outlines, with whether each shields the inside.
    pub blocks: Vec<BlockOutline>,
    /// The dose point's projection [x, y].
    pub point_cm: Option<[f64; 2]>,
    /// Jaws and leaves of the control point where dose ends; `None` when they stand as where it begins.
    /// Of a dynamic wedge that the plan does not spell out, where the beam model's sweep ends.
    pub last: Option<LastAperture>,
}

/// Jaws and leaves where dose ends, cm at the isocentre plane.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct LastAperture {
    /// X jaws.
    pub jaws_x_cm: Option<[f64; 2]>,
    /// Y jaws.
    pub jaws_y_cm: Option<[f64; 2]>,
    /// Leaf openings, by bank.
    pub leaf_banks: Vec<Vec<LeafOpening>>,
}

/// A block's outline.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct BlockOutline {
    /// Points [x, y], shared by every entry of the beam.
    pub outline_cm: Arc<[[f64; 2]]>,
    /// Shields inside (else it is an aperture).
    pub shields_inside: bool,
}

/// Everything worked out for one beam of one fraction group (or of none).
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct BeamCalculation {
    /// Item index in `Plan::beams`.
    pub beam_index: usize,
    /// Item index in `Plan::fraction_groups`; `None` for a beam that no group references.
    pub group_index: Option<usize>,
    /// Item index in the group's `beams`.
    pub reference_index: Option<usize>,
    /// Technique.
    pub technique: Technique,
    /// Gantry angle where dose begins, degrees.
    pub gantry_deg: Option<f64>,
    /// Gantry angle where dose ends, degrees.
    pub gantry_end_deg: Option<f64>,
    /// Collimator angle, degrees.
    pub collimator_deg: Option<f64>,
    /// Couch angle, degrees.
    pub couch_deg: Option<f64>,
    /// Opening along x at the isocentre plane, cm.
    pub x_cm: Option<f64>,
    /// Opening along y at the isocentre plane, cm.
    pub y_cm: Option<f64>,
    /// Equivalent squares.
    pub squares: Option<Squares>,
    /// The point, when there is one.
    pub point: Option<DosePoint>,
    /// Every depth that could be used, best basis first: the first is the one used.
    pub depths: Vec<DepthCandidate>,
    /// SSD where dose begins as the plan states it, cm.
    pub plan_ssd_cm: Option<f64>,
    /// The dose per MU, when it could be calculated (also outside the method's range).
    pub trace: Option<Trace>,
    /// Method of the trace.
    pub method: Option<Method>,
    /// What a scatter integration found besides the dose.
    pub shaped: Option<ShapedResult>,
    /// Expected spread of the result.
    pub spread: Option<Spread>,
    /// Why the result is no verification; empty when it is one.
    pub obstacles: Vec<Obstacle>,
    /// Worth telling, without effect (fluence mode not stated, couch not in the model ...).
    pub remarks: Vec<String>,
    /// For the picture.
    pub view: BeamView,
}

impl BeamCalculation {
    /// Whether there is a dose per MU at all.
    #[must_use]
    pub const fn is_calculated(&self) -> bool {
        self.trace.is_some()
    }
}
