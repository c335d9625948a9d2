//! One run over many files: first a survey (what is each file, which plans
//! stand twice), then the audit, both in parallel; results leave in the order
//! of the files and are streamed to disk. A panic in one file becomes that
//! file's row. Nothing here prints.

mod depth_rows;
mod depths;
mod fate;
mod guard;
mod one_file;
mod record;
mod run;
mod summary;
mod survey;

pub use depths::{DepthTable, DepthTableError, read_depth_table};
pub use guard::quiet_panics;
pub use run::{BatchError, BatchRequest, Outcome, Progress, RunFacts, run};
pub use summary::Tally;
