//! Fields of any shape, standing or moving, by scatter integration:
//!
//! ```text
//! D/MU = D'0 (S_ref/SPD)^2 Sc(A) OAR [ K(d, 0) Phi_p + G * integral of Phi k_d dA ] TF CF
//! ```
//!
//! Phi is the open fluence of the aperture with what leaves and blocks let through, Phi_p its value at the
//! point blurred by the penumbra, Sc(A) the jaws' table value times the aperture's head scatter over the
//! jaws', G the off-axis weight of the scatter. A moving field is the mean of its moments over the
//! meterset. Kernel and head scatter are made from the model's own tables in `beam_model`; what a plan's beam
//! calls for is decided in `dose::beam`.

mod bank;
mod beside;
mod blocks;
mod calculate;
mod depth_track;
mod exposure;
mod fluence_image;
mod head;
mod instant;
mod jaw_scatter;
mod moments;
mod opening;
mod parts;
mod range;
mod raster;
mod results;
mod scatter_weight;
mod shared;
mod spread;
mod standing;
mod sum;
mod trace;

pub(super) use calculate::{ShapedField, calculate_shaped};
pub(super) use depth_track::{DepthTrack, track_depths};
pub use fluence_image::FluenceImage;
pub use moments::StepLimits;
pub use results::{ControlPointDose, IntervalSource, ShapedResult, Shares};
