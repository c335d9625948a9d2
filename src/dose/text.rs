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

#[cfg(test)]
mod tests {
    use super::number;

    #[test]
    fn verify_numbers_are_short() {
        assert_eq!(number(10.0), "10");
        assert_eq!(number(0.98765), "0.9877");
        assert_eq!(number(-0.000_01), "0");
        assert_eq!(number(100.5), "100.5");
    }
}
