//! The clinic's own measured tables: loaded, checked, interpolated,
//! fingerprinted; immutable afterwards. Nothing here extrapolates: a look-up
//! beyond the measured range is an error that names the range. What the
//! factors mean and how they are multiplied is the work of `dose`.

mod beam;
mod check;
mod collimator_square;
mod derive;
mod error;
mod head_scatter;
pub mod kernel;
mod load_beam;
mod load_machine;
mod load_tables;
mod load_wedge;
mod machine;
mod machine_file;
mod machine_value;
mod model_folder;
pub mod scatter;
mod table;
mod table_file;
mod wedge;

pub use beam::{
    BeamModel, BeamUncertainty, CouchArc, OffAxis, OffAxisKind, OutputTable, Penumbra,
    ReferenceOutput, TableKind,
};
pub use check::{ModelFinding, ModelSeverity, TablePlace, check_machine, tpr20_10_from_pdd20_10};
pub use collimator_square::collimator_square;
pub use derive::{DerivedTable, derivable_grid, derive_table};
pub use error::ModelError;
pub use head_scatter::{HeadScatter, HeadScatterCell, HeadView, HeadWindow};
pub use load_machine::{load_machine, load_models};
pub use machine::{
    Approval, Collimation, DataOrigin, JawAxis, JawPair, LeafBank, MachineModel, ModelSet,
    ProofPoint, Provenance, Travel,
};
pub use table::{Cell, DepthInterpolation, Grid, GridError, Lookup, OutOfRange};
pub use wedge::{WedgeBody, WedgeModel, WedgeModelKind, WedgeSweep, WedgeTables};
