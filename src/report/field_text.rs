//! A trace as plain text.

use crate::dose::Trace;

/// A trace.
#[must_use]
pub fn trace_text(trace: &Trace) -> String {
    trace.formula.clone()
}
