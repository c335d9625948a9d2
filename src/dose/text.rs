//! Numbers in the sources of a trace. The values themselves stay unrounded;
//! only these sentences are short.

/// At most four decimals, no trailing zeros.
pub(super) fn number(value: f64) -> String {
    let text = format!("{value:.4}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" {
        "0".to_owned()
    } else {
        text.to_owned()
    }
}
