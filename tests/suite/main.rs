//! The integration tests, one binary. Each module says what it holds against what.

/// Beam models: loader errors, published tables, shipped models.
mod models;

/// Whole plans from bytes to verdicts.
mod audit;
/// Builds RT Plan objects; used by every module that needs a plan.
#[allow(
    dead_code,
    reason = "a tool kit: not every deviation is needed by a test yet"
)]
mod builder;
/// The program as a user runs it.
mod cli;
/// The calculation of one beam.
mod dose;
/// The order of the house, read from the sources.
mod house;
/// The reader against plans that the builder writes, and against damaged files.
mod reader;
mod report;
/// The plans in `sample-plans/`.
mod sample_plans;
/// The site file.
mod settings;
/// Shaped and moving fields against the world outside.
mod shaped;
