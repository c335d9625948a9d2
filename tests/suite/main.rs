//! The integration tests, one binary. Each module says what it holds against what.

/// Beam models: loader errors, published tables, shipped models.
mod models;

/// The order of the house, read from the sources.
mod house;
/// The site file.
mod settings;
