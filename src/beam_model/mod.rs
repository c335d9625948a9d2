//! The clinic's own measured tables: loaded, checked, interpolated,
//! fingerprinted; immutable afterwards. Nothing here extrapolates: a look-up
//! beyond the measured range is an error that names the range. What the
//! factors mean and how they are multiplied is the work of `dose`.

mod beam;
mod error;
mod load_beam;
mod load_machine;
mod machine;
mod machine_file;
mod model_folder;
mod table;
mod table_file;

pub use beam::{
    BeamModel, BeamUncertainty, CouchArc, OffAxis, OffAxisKind, OutputTable, ReferenceOutput,
    TableKind,
};
pub use error::ModelError;
pub use load_machine::{load_machine, load_models};
pub use machine::{
    Approval, Collimation, DataOrigin, JawAxis, JawPair, LeafBank, MachineModel, ModelSet,
    ProofPoint, Provenance, Travel,
};
pub use table::{Cell, DepthInterpolation, Grid, GridError, Lookup, OutOfRange};
