//! The integration tests, one binary. Each module says what it holds against what.

/// Beam models: loader errors, published tables, shipped models.
mod models;

/// The calculation of one beam.
mod dose;
