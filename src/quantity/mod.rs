//! Units, frames and named numbers that every later stage shares: points that
//! know their coordinate frame, square fields that know their plane, values
//! that know where they stand, credible ranges and numerical tolerances.
//!
//! Lengths are cm, angles degrees, dose Gy, output cGy/MU; every name carries
//! its unit. This stage knows nothing about plans, models or files.

mod fingerprint;
mod frame;
mod given;
mod normal;
mod range;
mod square;
pub mod tolerance;

pub use fingerprint::{hex, sha256_hex};
pub use frame::{Collimator, Fixed, Frame, Gantry, Patient, Point, Vector};
pub use given::Given;
pub use normal::{normal_between, normal_share, normal_share_integral};
pub use range::{CredibleRange, Quantity};
pub use square::{
    CollimatorSquare, PointSquare, ReferenceDepthSquare, SurfaceSquare, sterling_side_cm,
};
