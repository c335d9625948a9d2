//! The trace of factors as a table of finished strings.

use super::words::is_result;
use crate::audit::BeamEntry;
use crate::dose::Trace;
use crate::report::number::{decimals_of, fixed, fixed_or_dash};

/// A factor or an input.
#[derive(Clone, Debug)]
pub(super) struct TraceRow {
    pub(super) symbol: String,
    pub(super) name: String,
    pub(super) value: String,
    pub(super) unit: &'static str,
    pub(super) source: String,
}

/// A trace.
#[derive(Clone, Debug)]
pub(super) struct TraceView {
    pub(super) formula: String,
    pub(super) formula_source: &'static str,
    pub(super) inputs: Vec<TraceRow>,
    pub(super) factors: Vec<TraceRow>,
    pub(super) product: String,
    /// Meterset times product, as arithmetic; `None` without a meterset.
    pub(super) dose_line: Option<String>,
    /// Planned dose over product, as arithmetic; `None` without a planned dose.
    pub(super) meterset_line: Option<String>,
}

/// The view of a beam's trace.
pub(super) fn view(trace: &Trace, beam: &BeamEntry) -> TraceView {
    let product = fixed(trace.dose_per_mu_cgy, 4);
    // A number that verifies nothing never looks like a plain result.
    let shown = |number: String| {
        if is_result(beam.verdict) {
            number
        } else {
            format!("[{number}]")
        }
    };
    let dose_line = beam.planned_mu.map(|mu| {
        format!(
            "{} MU \u{d7} {product} cGy/MU / 100 = {} Gy",
            fixed(mu, 2),
            shown(fixed_or_dash(beam.independent_dose_gy, 4))
        )
    });
    let meterset_line = beam.planned_dose_gy.map(|dose| {
        format!(
            "{} Gy \u{d7} 100 / {product} cGy/MU = {} MU",
            fixed(dose, 4),
            shown(fixed_or_dash(beam.independent_mu, 2))
        )
    });
    TraceView {
        formula: trace.formula.replace(" * ", " \u{d7} "),
        formula_source: trace.formula_source,
        inputs: trace
            .inputs
            .iter()
            .map(|input| TraceRow {
                symbol: input.symbol.to_owned(),
                name: input.name.to_owned(),
                value: fixed(input.value, decimals_of(input.unit)),
                unit: input.unit,
                source: input.source.clone(),
            })
            .collect(),
        factors: trace
            .factors
            .iter()
            .map(|factor| TraceRow {
                symbol: factor.name.symbol().to_owned(),
                name: factor.name.title().to_owned(),
                value: fixed(factor.value, 4),
                unit: factor.name.unit(),
                source: factor.source.clone(),
            })
            .collect(),
        product: shown(product),
        dose_line,
        meterset_line,
    }
}
