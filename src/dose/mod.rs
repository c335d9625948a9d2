//! Plan, model and point in; a trace of factors out. No I/O, no logging, no
//! rounding. What a deviation means is judged in `audit`.
//!
//! [`calculate_beam`] does one beam of a plan; [`dose_per_mu`] one field from
//! plain numbers, with a model's tables or typed factors.

mod aperture;
mod beam;
mod delivery;
mod depth;
mod depth_question;
mod factors;
mod field;
pub mod geometry;
mod limits;
mod mayneord;
mod modifier;
mod outcome;
mod placement;
mod plan_depth;
mod point;
mod prerequisite;
mod proof;
mod ray;
mod shaped;
mod spread;
mod sweep;
mod technique;
mod text;
mod trace;
mod wedge;
mod wedge_factor;

pub use aperture::point_square;
pub use beam::{BeamRequest, ModelAnswer, calculate_beam};
pub use depth_question::DepthRow;
pub use factors::dose_per_mu;
pub use field::{FactorError, FieldDepth, FieldInput, FieldModel, Form, Tray, Typed};
pub use limits::outside_method;
pub use mayneord::{Mayneord, mayneord};
pub use outcome::{
    BeamCalculation, BeamView, BlockOutline, DepthBasis, DepthCandidate, DosePoint, LastAperture,
    LeafOpening, Method, Obstacle, ObstacleKind, PointBasis, Spread, SpreadTerm, Squares,
    Technique,
};
pub use proof::prove;
pub use ray::RayPoint;
pub use shaped::{
    ControlPointDose, FluenceImage, IntervalSource, ShapedResult, Shares, StepLimits,
};
pub use spread::expected_spread;
pub use technique::classify;
pub use trace::{Factor, FactorName, Input, Trace};
pub use wedge::{FieldWedge, PlacedWedge};
