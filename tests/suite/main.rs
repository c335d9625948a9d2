//! The integration tests, one binary. Each module says what it holds against what.

mod report;
