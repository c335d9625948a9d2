//! What both plain texts share: one line without control characters, numbers
//! with a plain minus.

/// Text on one line: control characters and marks that reverse the reading
/// order would let a file write on the terminal.
pub(super) fn one_line(text: &str) -> String {
    text.chars()
        .filter_map(|character| match character {
            '\t' | '\n' | '\r' | '\u{2028}' | '\u{2029}' => Some(' '),
            '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' => None,
            other if other.is_control() => None,
            other => Some(other),
        })
        .collect()
}

/// A number with this many decimals.
pub(super) fn rounded(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return "not a number".to_owned();
    }
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(digits) if digits.chars().all(|digit| matches!(digit, '0' | '.')) => digits.to_owned(),
        _ => text,
    }
}

/// A number with at most this many decimals.
pub(super) fn trimmed(value: f64, decimals: usize) -> String {
    let text = rounded(value, decimals);
    if !text.contains('.') {
        return text;
    }
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}
