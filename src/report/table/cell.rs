//! A cell of a table as text: plain decimals, empty for what is missing, and
//! text that no spreadsheet will run as a formula. Which cells there are is
//! decided by the columns.

/// A cell before it becomes text.
#[derive(Clone, Debug, PartialEq)]
pub(in crate::report) enum Cell {
    /// Nothing: written as an empty cell.
    Missing,
    /// A number, written as a plain decimal; not finite counts as missing.
    Number(f64),
    /// A whole number.
    Whole(i64),
    /// Text: made harmless.
    Text(String),
    /// A measured value or limit in words: a bare number stays as it is, all else is text.
    Value(String),
}

impl Cell {
    /// Text, or missing.
    pub(in crate::report) fn text(value: Option<&String>) -> Self {
        value.map_or(Self::Missing, |text| Self::Text(text.clone()))
    }

    /// A fixed word.
    pub(in crate::report) fn word(value: &str) -> Self {
        Self::Text(value.to_owned())
    }

    /// A number, or missing.
    pub(in crate::report) fn number(value: Option<f64>) -> Self {
        value.map_or(Self::Missing, Self::Number)
    }

    /// A whole number, or missing.
    pub(in crate::report) fn whole<T: Into<i64>>(value: Option<T>) -> Self {
        value.map_or(Self::Missing, |whole| Self::Whole(whole.into()))
    }

    /// A count.
    pub(in crate::report) fn count(value: usize) -> Self {
        Self::Whole(i64::try_from(value).unwrap_or(i64::MAX))
    }

    /// The cell as it is written.
    pub(in crate::report) fn render(&self) -> String {
        match self {
            Self::Missing => String::new(),
            Self::Number(value) => plain_decimal(*value),
            Self::Whole(value) => value.to_string(),
            Self::Text(text) => harmless(text),
            Self::Value(text) if is_bare_number(text) => text.clone(),
            Self::Value(text) => harmless(text),
        }
    }
}

/// The shortest plain decimal that reads back as the same number: a dot, no
/// exponent, no thousands separator. Empty when not finite.
#[must_use]
pub fn plain_decimal(value: f64) -> String {
    if !value.is_finite() {
        return String::new();
    }
    // `+ 0.0` turns a negative zero into zero; `Display` never writes an exponent.
    format!("{}", value + 0.0)
}

/// Text without control characters that no spreadsheet takes for a formula: an
/// apostrophe stands before a formula's first character, at the start of the
/// cell and after a semicolon (which some locales take for the separator).
#[must_use]
pub fn harmless(text: &str) -> String {
    let mut out = String::with_capacity(text.len() + 1);
    let mut at_start = true;
    let mut blanks = String::new();
    for character in text.chars() {
        let Some(character) = visible(character) else {
            continue;
        };
        if at_start && is_blank(character) {
            blanks.push(character);
            continue;
        }
        if at_start {
            if starts_formula(character) {
                out.push('\'');
            }
            out.push_str(&blanks);
            blanks.clear();
        }
        at_start = character == ';';
        out.push(character);
    }
    out.push_str(&blanks);
    out
}

/// The character as it may stand in a cell: line breaks and tabs become blanks,
/// other control characters and marks that reverse the reading order go.
fn visible(character: char) -> Option<char> {
    match character {
        '\t' | '\n' | '\r' | '\u{2028}' | '\u{2029}' => Some(' '),
        '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' => None,
        other if other.is_control() => None,
        other => Some(other),
    }
}

fn is_blank(character: char) -> bool {
    // Zero-width characters and the byte order mark are skipped by some programs.
    character.is_whitespace()
        || matches!(character, '\u{200b}'..='\u{200f}' | '\u{2060}' | '\u{feff}')
}

fn starts_formula(character: char) -> bool {
    // The second line: full-width and small forms, which some programs fold into the first.
    matches!(
        character,
        '=' | '+'
            | '-'
            | '@'
            | '\u{ff1d}'
            | '\u{ff0b}'
            | '\u{ff0d}'
            | '\u{ff20}'
            | '\u{fe66}'
            | '\u{fe62}'
            | '\u{fe63}'
            | '\u{fe6b}'
            | '\u{2212}'
    )
}

fn is_bare_number(text: &str) -> bool {
    let digits = text.strip_prefix(['+', '-']).unwrap_or(text);
    let plain = digits
        .chars()
        .all(|character| character.is_ascii_digit() || character == '.');
    plain && text.parse::<f64>().is_ok()
}
