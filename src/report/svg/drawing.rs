//! A drawing: elements in, one `<svg>` out. Text is escaped here, because the
//! page takes the drawing as it is.

use std::fmt::Write;

/// Which end of a text its position is.
#[derive(Clone, Copy, Debug)]
pub(in crate::report) enum Anchor {
    Start,
    Middle,
    End,
}

impl Anchor {
    const fn term(self) -> &'static str {
        match self {
            Self::Start => "start",
            Self::Middle => "middle",
            Self::End => "end",
        }
    }
}

/// A drawing of fixed size in picture units.
#[derive(Debug)]
pub(in crate::report) struct Drawing {
    width: f64,
    height: f64,
    body: String,
}

impl Drawing {
    pub(in crate::report) const fn new(width: f64, height: f64) -> Self {
        Self {
            width,
            height,
            body: String::new(),
        }
    }

    /// A rectangle between two corners, in any order.
    pub(in crate::report) fn rectangle(&mut self, class: &str, from: [f64; 2], to: [f64; 2]) {
        let _ = write!(
            self.body,
            "<rect class=\"{class}\" x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\"/>",
            n(from[0].min(to[0])),
            n(from[1].min(to[1])),
            n((to[0] - from[0]).abs()),
            n((to[1] - from[1]).abs()),
        );
    }

    /// A picture between two corners, stretched to them; `data_uri` must be one of ours.
    pub(in crate::report) fn image(
        &mut self,
        class: &str,
        from: [f64; 2],
        to: [f64; 2],
        data_uri: &str,
    ) {
        let _ = write!(
            self.body,
            "<image class=\"{class}\" x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" preserveAspectRatio=\"none\" href=\"{data_uri}\"/>",
            n(from[0].min(to[0])),
            n(from[1].min(to[1])),
            n((to[0] - from[0]).abs()),
            n((to[1] - from[1]).abs()),
        );
    }

    /// A straight line.
    pub(in crate::report) fn line(&mut self, class: &str, from: [f64; 2], to: [f64; 2]) {
        let _ = write!(
            self.body,
            "<line class=\"{class}\" x1=\"{}\" y1=\"{}\" x2=\"{}\" y2=\"{}\"/>",
            n(from[0]),
            n(from[1]),
            n(to[0]),
            n(to[1]),
        );
    }

    /// A closed outline.
    pub(in crate::report) fn outline(&mut self, class: &str, points: &[[f64; 2]]) {
        let _ = write!(self.body, "<polygon class=\"{class}\" points=\"");
        for (index, point) in points.iter().enumerate() {
            let space = if index == 0 { "" } else { " " };
            let _ = write!(self.body, "{space}{},{}", n(point[0]), n(point[1]));
        }
        self.body.push_str("\"/>");
    }

    /// An open line through points.
    pub(in crate::report) fn curve(&mut self, class: &str, points: &[[f64; 2]]) {
        let _ = write!(self.body, "<polyline class=\"{class}\" points=\"");
        for (index, point) in points.iter().enumerate() {
            let space = if index == 0 { "" } else { " " };
            let _ = write!(self.body, "{space}{},{}", n(point[0]), n(point[1]));
        }
        self.body.push_str("\"/>");
    }

    /// A circle.
    pub(in crate::report) fn circle(&mut self, class: &str, centre: [f64; 2], radius: f64) {
        let _ = write!(
            self.body,
            "<circle class=\"{class}\" cx=\"{}\" cy=\"{}\" r=\"{}\"/>",
            n(centre[0]),
            n(centre[1]),
            n(radius),
        );
    }

    /// A text.
    pub(in crate::report) fn text(
        &mut self,
        class: &str,
        at: [f64; 2],
        anchor: Anchor,
        text: &str,
    ) {
        let _ = write!(
            self.body,
            "<text class=\"{class}\" x=\"{}\" y=\"{}\" text-anchor=\"{}\">{}</text>",
            n(at[0]),
            n(at[1]),
            anchor.term(),
            escaped(text),
        );
    }

    /// The drawing with its title and description; `id` must be unique on the page and ours.
    pub(in crate::report) fn finish(
        self,
        id: &str,
        class: &str,
        title: &str,
        description: &str,
    ) -> String {
        format!(
            "<svg class=\"{class}\" viewBox=\"0 0 {w} {h}\" width=\"{w}\" height=\"{h}\" role=\"img\" aria-labelledby=\"{id}-t {id}-d\"><title id=\"{id}-t\">{}</title><desc id=\"{id}-d\">{}</desc>{}</svg>",
            escaped(title),
            escaped(description),
            self.body,
            w = n(self.width),
            h = n(self.height),
        )
    }
}

/// A coordinate: hundredths, without trailing zeros.
fn n(value: f64) -> String {
    if !value.is_finite() {
        return "0".to_owned();
    }
    let text = format!("{value:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0" } else { text }.to_owned()
}

fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for character in text.chars() {
        match character {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            other if other.is_control() => {}
            other => out.push(other),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::{Anchor, Drawing};

    #[test]
    fn verify_text_is_escaped() {
        let mut drawing = Drawing::new(10.0, 10.0);
        drawing.text("t", [1.0, 2.005], Anchor::Start, "<b>&\"'");
        let svg = drawing.finish("p", "c", "</title><script>", "d");
        assert!(svg.contains("&lt;b&gt;&amp;&quot;&#39;"), "{svg}");
        assert!(!svg.contains("<script"), "{svg}");
    }
}
