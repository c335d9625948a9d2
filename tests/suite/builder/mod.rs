//! Builds RT Plan objects for tests and sample plans. The default is a valid
//! plan: one static isocentric photon beam, two control points. Plain structs
//! say what is in it; methods name deviations from it. Lengths are cm here and
//! mm in the file. What the reader makes of it is the tests' matter.

mod deviation;
mod edit;
mod element;
mod encode;
mod spec;
mod write;

pub(crate) use encode::{Encoding, data_set_offset, encode};
#[allow(
    unused_imports,
    reason = "a tool kit: not every part is named by a test yet"
)]
pub(crate) use spec::{
    AccessorySpec, ApplicatorSpec, BeamSpec, BlockSpec, BolusSpec, CompensatorSpec, DepthSpec,
    DeviceSpec, DoseReferenceSpec, GroupSpec, PlanSpec, PointSpec, ReferenceSpec, SetupSpec,
    WedgeSpec,
};
