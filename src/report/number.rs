//! Numbers as people read them on the page: rounded sensibly, a sign where the
//! direction matters, never an exponent, a dash for what is missing. The CSV
//! files and `audit.json` keep the unrounded numbers.

/// Stands for a value that is not there.
pub(super) const MISSING: &str = "\u{2013}";
const MINUS: char = '\u{2212}';
/// Beyond this a number is given in words; nothing credible is as large.
const GREATEST_SHOWN: f64 = 1e9;

/// A number with this many decimals.
pub(super) fn fixed(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return MISSING.to_owned();
    }
    if value.abs() > GREATEST_SHOWN {
        return "beyond 1 000 000 000".to_owned();
    }
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(digits) if digits.chars().all(|digit| matches!(digit, '0' | '.')) => digits.to_owned(),
        Some(digits) => format!("{MINUS}{digits}"),
        None => text,
    }
}

/// A number with this many decimals, or a dash.
pub(super) fn fixed_or_dash(value: Option<f64>, decimals: usize) -> String {
    value.map_or_else(|| MISSING.to_owned(), |value| fixed(value, decimals))
}

/// A number with its sign, also when positive.
pub(super) fn signed(value: f64, decimals: usize) -> String {
    let text = fixed(value, decimals);
    let zero = text.chars().all(|character| matches!(character, '0' | '.'));
    if zero || !value.is_finite() || text.starts_with(MINUS) {
        return text;
    }
    format!("+{text}")
}

/// A number with its sign, or a dash.
pub(super) fn signed_or_dash(value: Option<f64>, decimals: usize) -> String {
    value.map_or_else(|| MISSING.to_owned(), |value| signed(value, decimals))
}

/// A number with at most this many decimals, without trailing zeros.
pub(super) fn short(value: f64, decimals: usize) -> String {
    let text = fixed(value, decimals);
    if !text.contains('.') {
        return text;
    }
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

/// A number with at most this many decimals, or a dash.
pub(super) fn short_or_dash(value: Option<f64>, decimals: usize) -> String {
    value.map_or_else(|| MISSING.to_owned(), |value| short(value, decimals))
}

/// Text, or a dash.
pub(super) fn text_or_dash(value: Option<&String>) -> String {
    value
        .filter(|text| !text.is_empty())
        .cloned()
        .unwrap_or_else(|| MISSING.to_owned())
}

/// Decimals that suit a unit of the trace.
pub(super) fn decimals_of(unit: &str) -> usize {
    match unit {
        "cm" | "mm" => 2,
        "MU" | "degrees" | "deg" => 1,
        _ => 4,
    }
}
