//! Lines of the text: a marker for where a value stands, its name, the value.

use std::fmt::Display;

use crate::quantity::Given;
use crate::report::plain_text::{one_line, trimmed};

/// Width of the column of names.
const NAME_WIDTH: usize = 34;
/// Names of absent values are wrapped at this width.
const LINE_WIDTH: usize = 96;

/// What the markers mean.
pub(super) const LEGEND: &str = "S stated in the file here    I inherited from an earlier control point    D derived from other values    - absent";

/// The text while it grows.
#[derive(Debug, Default)]
pub(super) struct Lines {
    out: String,
    absent: Vec<&'static str>,
}

impl Lines {
    /// A heading of a part.
    pub(super) fn heading(&mut self, text: &str) {
        self.absent_names();
        let text = one_line(text);
        let rule = "=".repeat(text.chars().count());
        self.out.push_str(&format!("\n{text}\n{rule}\n"));
    }

    /// A heading within a part.
    pub(super) fn subheading(&mut self, text: &str) {
        self.absent_names();
        self.out.push_str(&format!("\n  {}\n", one_line(text)));
    }

    /// A line without a marker.
    pub(super) fn plain(&mut self, text: &str) {
        self.out.push_str("     ");
        self.out.push_str(one_line(text).trim_end());
        self.out.push('\n');
    }

    /// A value that is always shown, also when absent.
    pub(super) fn given<T>(&mut self, name: &str, value: &Given<T>, show: impl Fn(&T) -> String) {
        let marker = marker(value);
        let text = value.value().map_or_else(String::new, show);
        let ground = match value {
            Given::Inherited {
                from_control_point, ..
            } => format!("   (from control point {from_control_point})"),
            Given::Derived { how, .. } => format!("   ({how})"),
            Given::Absent | Given::Stated { .. } => String::new(),
        };
        let line = format!(
            "  {marker}  {name:<NAME_WIDTH$} {}",
            one_line(&format!("{text}{ground}"))
        );
        self.out.push_str(line.trim_end());
        self.out.push('\n');
    }

    /// A value that is shown when present; absent ones are named together.
    pub(super) fn optional<T>(
        &mut self,
        name: &'static str,
        value: &Given<T>,
        show: impl Fn(&T) -> String,
    ) {
        if value.is_absent() {
            self.absent.push(name);
        } else {
            self.given(name, value, show);
        }
    }

    /// Names the absent values collected so far.
    pub(super) fn absent_names(&mut self) {
        let names = std::mem::take(&mut self.absent);
        let mut line = String::new();
        for (index, name) in names.iter().enumerate() {
            let last = index + 1 == names.len();
            let word = if last {
                (*name).to_owned()
            } else {
                format!("{name}, ")
            };
            if !line.is_empty() && line.len() + word.len() > LINE_WIDTH {
                self.out
                    .push_str(&format!("  -  absent: {}\n", line.trim_end()));
                line.clear();
            }
            line.push_str(&word);
        }
        if !line.is_empty() {
            self.out
                .push_str(&format!("  -  absent: {}\n", line.trim_end()));
        }
    }

    /// The text.
    pub(super) fn finish(mut self) -> String {
        self.absent_names();
        self.out
    }
}

const fn marker<T>(value: &Given<T>) -> char {
    match value {
        Given::Stated { .. } => 'S',
        Given::Inherited { .. } => 'I',
        Given::Derived { .. } => 'D',
        Given::Absent => '-',
    }
}

/// A number with a unit, at most six decimals.
pub(super) fn in_unit(unit: &'static str) -> impl Fn(&f64) -> String {
    move |value| {
        let text = trimmed(*value, 6);
        if unit.is_empty() {
            text
        } else {
            format!("{text} {unit}")
        }
    }
}

/// Anything that prints itself.
pub(super) fn as_is<T: Display>(value: &T) -> String {
    value.to_string()
}

/// A yes or a no.
pub(super) fn yes_no(value: &bool) -> String {
    if *value { "yes" } else { "no" }.to_owned()
}

/// The two sides of an opening.
pub(super) fn sides(value: &[f64; 2]) -> String {
    let [from, to] = *value;
    format!(
        "{} to {} cm   (opening {} cm)",
        trimmed(from, 6),
        trimmed(to, 6),
        trimmed(to - from, 6)
    )
}
