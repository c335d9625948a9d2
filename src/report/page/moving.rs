//! What the beam's-eye view adds when a field has several apertures: the
//! meterset-weighted open fluence as a grey picture, the first and the last
//! aperture as outlines over it, and the legend. Axes, blocks and dose point are
//! drawn by `beams_eye`; fluence and positions come from `dose`.

use super::beams_eye::{Axes, LEFT, PLOT, TOP};
use super::outline::outlines;
use crate::dose::{BeamView, FluenceImage, LeafOpening};
use crate::report::number::fixed;
use crate::report::svg::{Anchor, Drawing, grey_picture};

/// Room under the axes for the legend.
pub(super) const LEGEND_HEIGHT: f64 = 42.0;

/// A bank with more leaf pairs is drawn with the first of them; several banks with fewer, because each pair of
/// one is held against every pair of the other.
const MOST_PAIRS: [usize; 2] = [400, 120];

/// The picture of a fluence: its data URI and the greatest share of the meterset, per cent.
pub(super) struct Grey {
    data_uri: String,
    greatest_percent: f64,
    x_cm: [f64; 2],
    y_cm: [f64; 2],
}

/// The picture; `None` when nothing is open or the image does not fit its own numbers.
pub(super) fn grey(image: &FluenceImage) -> Option<Grey> {
    let greatest = image
        .values
        .iter()
        .copied()
        .max()
        .filter(|most| *most > 0)?;
    if image.columns == 0 || image.values.len() != image.columns * image.rows {
        return None;
    }
    let entry = |value: u8| {
        // What is open at all keeps a grey of its own: entry 0 is transparent.
        let share = f64::from(value) / f64::from(greatest);
        if value == 0 {
            0
        } else {
            (share * 255.0).round().clamp(1.0, 255.0) as u8
        }
    };
    // Rows of the image rise with y; a picture begins at the top.
    let from_top: Vec<u8> = image
        .values
        .chunks_exact(image.columns)
        .rev()
        .flatten()
        .map(|value| entry(*value))
        .collect();
    let to_cm = |from_cm: f64, cells: usize| from_cm + image.cell_cm * cells as f64;
    Some(Grey {
        data_uri: grey_picture(image.columns, &from_top)?,
        greatest_percent: 100.0 * f64::from(greatest) / 255.0,
        x_cm: [image.x_from_cm, to_cm(image.x_from_cm, image.columns)],
        y_cm: [image.y_from_cm, to_cm(image.y_from_cm, image.rows)],
    })
}

impl Grey {
    /// Edges of the picture, cm.
    pub(super) fn edges_cm(&self) -> [f64; 4] {
        [self.x_cm[0], self.x_cm[1], self.y_cm[0], self.y_cm[1]]
    }

    pub(super) fn draw(&self, drawing: &mut Drawing, axes: &Axes) {
        let from = axes.at([self.x_cm[0], self.y_cm[0]]);
        let to = axes.at([self.x_cm[1], self.y_cm[1]]);
        drawing.image("bev-fluence", from, to, &self.data_uri);
    }
}

/// One aperture's lines, in picture units.
struct Lines {
    /// Corners of the jaws, when some are known.
    jaws: Option<[[f64; 2]; 2]>,
    /// Outlines of the leaf openings inside the jaws; none where there are no leaves: the jaws are the aperture then.
    leaves: Vec<Vec<[f64; 2]>>,
}

impl Lines {
    fn new(axes: &Axes, jaws_cm: [Option<[f64; 2]>; 2], leaf_banks: &[Vec<LeafOpening>]) -> Self {
        let limits_cm = [-axes.half_cm, axes.half_cm];
        let [x, y] = jaws_cm.map(|sides| sides.unwrap_or(limits_cm));
        let known = jaws_cm.iter().any(Option::is_some) && x[1] > x[0] && y[1] > y[0];
        let most = MOST_PAIRS[usize::from(leaf_banks.len() > 1)];
        let banks: Vec<Vec<LeafOpening>> = leaf_banks
            .iter()
            .map(|bank| bank.iter().take(most).copied().collect())
            .collect();
        let polygons = if banks.is_empty() {
            Vec::new()
        } else {
            outlines(jaws_cm, &banks, limits_cm)
        };
        Self {
            jaws: known.then(|| [axes.at([x[0], y[0]]), axes.at([x[1], y[1]])]),
            leaves: polygons
                .iter()
                .map(|corners| corners.iter().map(|corner| axes.at(*corner)).collect())
                .collect(),
        }
    }

    fn draw(&self, drawing: &mut Drawing, [jaws, leaves]: [&str; 2]) {
        if let Some([from, to]) = self.jaws {
            drawing.rectangle(jaws, from, to);
        }
        for polygon in &self.leaves {
            drawing.outline(leaves, polygon);
        }
    }
}

/// First and last aperture. Both halos lie under both lines, and the dashes over the solid line, so that both show
/// where they coincide.
pub(super) fn draw_apertures(drawing: &mut Drawing, axes: &Axes, view: &BeamView) {
    let first_jaws = [view.jaws_x_cm, view.jaws_y_cm];
    let first = Lines::new(axes, first_jaws, &view.leaf_banks);
    let last = view.last.as_ref().map(|last| {
        let jaws = [last.jaws_x_cm, last.jaws_y_cm];
        let mut lines = Lines::new(axes, jaws, &last.leaf_banks);
        if jaws == first_jaws {
            lines.jaws = None;
        }
        lines
    });
    let halos = ["bev-halo"; 2];
    first.draw(drawing, halos);
    if let Some(last) = &last {
        last.draw(drawing, halos);
    }
    first.draw(drawing, ["bev-jaws", "bev-first"]);
    if let Some(last) = &last {
        last.draw(drawing, ["bev-jaws-last", "bev-last"]);
    }
}

/// What the lines and greys mean, under the axes.
pub(super) fn draw_legend(drawing: &mut Drawing, view: &BeamView, grey: Option<&Grey>) {
    let at = TOP + PLOT + 48.0;
    let (first, last) = if view.leaf_banks.is_empty() {
        ("bev-jaws", "bev-jaws-last")
    } else {
        ("bev-first", "bev-last")
    };
    drawing.line(first, [LEFT, at], [LEFT + 26.0, at]);
    let words = if view.last.is_some() {
        "first aperture"
    } else {
        "first and last aperture alike"
    };
    drawing.text("label", [LEFT + 32.0, at + 3.5], Anchor::Start, words);
    if view.last.is_some() {
        let from = LEFT + PLOT / 2.0;
        drawing.line(last, [from, at], [from + 26.0, at]);
        drawing.text(
            "label",
            [from + 32.0, at + 3.5],
            Anchor::Start,
            "last aperture",
        );
    }
    let Some(grey) = grey else { return };
    let at = at + 12.0;
    // Every fourth entry is as fine as the eye sees here.
    let entries: Vec<u8> = (1..=255).step_by(4).collect();
    if let Some(ramp) = grey_picture(entries.len(), &entries) {
        let corners = [[LEFT, at], [LEFT + 62.0, at + 10.0]];
        drawing.image("bev-fluence", corners[0], corners[1], &ramp);
        drawing.rectangle("bev-frame", corners[0], corners[1]);
        let words = format!(
            "open 0 to {} % of the meterset",
            fixed(grey.greatest_percent, 0)
        );
        drawing.text("label", [LEFT + 68.0, at + 8.5], Anchor::Start, &words);
    }
}

/// For the caption: what the picture shows of a field with several apertures.
pub(super) fn words(view: &BeamView, grey: Option<&Grey>) -> Vec<String> {
    let mut parts = Vec::new();
    if let Some(grey) = grey {
        parts.push(format!(
            "grey: share of the meterset for which a place is open, white {} %, hatched never; leaf-end offset and blocks are in it",
            fixed(grey.greatest_percent, 0)
        ));
    }
    let lines = match (&view.last, view.leaf_banks.len()) {
        (None, _) => "outline: the aperture, the same where dose begins and where it ends",
        (Some(_), 0) => "solid: the jaws where dose begins; dashed: where it ends",
        (Some(_), 1) => {
            "solid: leaf openings inside the jaws where dose begins; dashed: where it ends"
        }
        (Some(_), _) => {
            "solid: where all leaf banks are open inside the jaws where dose begins; dashed: where it ends"
        }
    };
    parts.push(lines.to_owned());
    if view.leaf_banks.len() > 1 {
        parts.push(format!("{} leaf banks", view.leaf_banks.len()));
    }
    parts
}

/// Whether a bank has more pairs than are drawn.
pub(super) fn is_abridged(leaf_banks: &[Vec<LeafOpening>]) -> bool {
    let most = MOST_PAIRS[usize::from(leaf_banks.len() > 1)];
    leaf_banks.iter().any(|bank| bank.len() > most)
}
