//! The clinic's own measured tables: loaded, checked, interpolated,
//! fingerprinted; immutable afterwards. Nothing here extrapolates: a look-up
//! beyond the measured range is an error that names the range. What the
//! factors mean and how they are multiplied is the work of `dose`.

mod beam;
mod machine;
mod table;

pub use beam::{
    BeamModel, BeamUncertainty, CouchArc, OffAxis, OffAxisKind, OutputTable, ReferenceOutput,
    TableKind,
};
pub use machine::{Approval, DataOrigin, JawAxis, MachineModel, ModelSet, ProofPoint, Provenance};
pub use table::{Cell, DepthInterpolation, Grid, GridError, Lookup, OutOfRange};
