//! The deviation on a scale with tolerance and action level on both sides of
//! zero and the expected spread as an error bar. What the levels are and what
//! was judged is decided in `audit`.

use crate::report::number::{short, signed};
use crate::report::svg::{Anchor, Drawing, Scale, tick_step};

/// What is drawn, per cent.
#[derive(Clone, Copy, Debug)]
pub(super) struct Deviation {
    /// What was compared with the levels, or what would have been.
    pub(super) shown_percent: f64,
    /// Expected spread, 1 standard deviation.
    pub(super) spread_percent: Option<f64>,
    pub(super) tolerance_percent: Option<f64>,
    pub(super) action_percent: Option<f64>,
    pub(super) standing: Standing,
}

/// Whether the number is a result.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Standing {
    Judged,
    NotAVerification,
}

const WIDTH: f64 = 520.0;
const HEIGHT: f64 = 74.0;
const MARGIN: f64 = 14.0;
const BAND: [f64; 2] = [22.0, 50.0];
const MIDDLE: f64 = 36.0;
/// Beyond this the mark stands at the picture's edge and the words say so.
const GREATEST_PERCENT: f64 = 100.0;

/// The picture.
pub(super) fn picture(deviation: &Deviation, id: &str) -> String {
    let half = half_width_percent(deviation);
    let scale = Scale::new([-half, half], [MARGIN, WIDTH - MARGIN]);
    let mut drawing = Drawing::new(WIDTH, HEIGHT);
    draw_bands(&mut drawing, scale, deviation);
    draw_ticks(&mut drawing, scale, half);
    draw_mark(&mut drawing, scale, deviation);
    drawing.finish(
        id,
        "deviation",
        "Deviation against tolerance and action level",
        &words(deviation),
    )
}

fn half_width_percent(deviation: &Deviation) -> f64 {
    let reach = deviation.shown_percent.abs()
        + deviation
            .spread_percent
            .filter(|s| s.is_finite())
            .unwrap_or(0.0);
    let levels = deviation.action_percent.unwrap_or(5.0) * 1.6;
    let wanted = (reach * 1.15).max(levels).min(GREATEST_PERCENT);
    let step = tick_step(2.0 * wanted, 10.0);
    (wanted / step).ceil() * step
}

fn draw_bands(drawing: &mut Drawing, scale: Scale, deviation: &Deviation) {
    let band = |drawing: &mut Drawing, class: &str, level: f64| {
        drawing.rectangle(
            class,
            [scale.at(-level), BAND[0]],
            [scale.at(level), BAND[1]],
        );
    };
    if let Some(action) = deviation.action_percent {
        band(drawing, "band-action", action);
    }
    if let Some(tolerance) = deviation.tolerance_percent {
        band(drawing, "band-tolerance", tolerance);
    }
    // Words of the tolerance run inward and those of the action level outward, so that they never meet.
    let room = deviation
        .tolerance_percent
        .map_or(0.0, |tolerance| scale.at(tolerance) - scale.at(0.0));
    let tolerance_name = match room {
        room if room >= 58.0 => "tolerance",
        room if room >= 24.0 => "tol.",
        _ => "",
    };
    let inward = [Anchor::Start, Anchor::End];
    let outward = [Anchor::End, Anchor::Start];
    let edges = [
        (deviation.tolerance_percent, tolerance_name, inward),
        (deviation.action_percent, "action", outward),
    ];
    for (level, name, anchors) in edges {
        let Some(level) = level else { continue };
        for (side, anchor) in [-level, level].into_iter().zip(anchors) {
            let x = scale.at(side);
            drawing.line("band-edge", [x, BAND[0] - 5.0], [x, BAND[1]]);
            if !name.is_empty() {
                drawing.text("label", [x, BAND[0] - 8.0], anchor, name);
            }
        }
    }
}

fn draw_ticks(drawing: &mut Drawing, scale: Scale, half: f64) {
    let base = BAND[1];
    drawing.line("rule", [scale.at(-half), base], [scale.at(half), base]);
    for tick in scale.ticks(tick_step(2.0 * half, 10.0)) {
        let x = scale.at(tick);
        drawing.line("tick", [x, base], [x, base + 5.0]);
        let label = if tick == 0.0 {
            "0 %".to_owned()
        } else {
            let text = short(tick, 1);
            if tick > 0.0 { format!("+{text}") } else { text }
        };
        drawing.text("label", [x, base + 17.0], Anchor::Middle, &label);
    }
    let zero = scale.at(0.0);
    drawing.line("zero", [zero, BAND[0] - 6.0], [zero, base]);
}

fn draw_mark(drawing: &mut Drawing, scale: Scale, deviation: &Deviation) {
    let zero = scale.at(0.0);
    let x = scale.at(deviation.shown_percent);
    let (bar, point) = match deviation.standing {
        Standing::Judged => ("bar", "bar-end"),
        Standing::NotAVerification => ("bar-hollow", "bar-end-hollow"),
    };
    drawing.rectangle(bar, [zero, MIDDLE - 5.0], [x, MIDDLE + 5.0]);
    if let Some(spread) = deviation.spread_percent {
        let [from, to] = [
            scale.at(deviation.shown_percent - spread),
            scale.at(deviation.shown_percent + spread),
        ];
        drawing.line("error", [from, MIDDLE], [to, MIDDLE]);
        for end in [from, to] {
            drawing.line("error", [end, MIDDLE - 4.0], [end, MIDDLE + 4.0]);
        }
    }
    drawing.outline(
        point,
        &[
            [x, MIDDLE - 6.0],
            [x + 6.0, MIDDLE],
            [x, MIDDLE + 6.0],
            [x - 6.0, MIDDLE],
        ],
    );
    if !scale.holds(deviation.shown_percent) {
        let (anchor, inward) = if deviation.shown_percent > 0.0 {
            (Anchor::End, -12.0)
        } else {
            (Anchor::Start, 12.0)
        };
        drawing.text(
            "label-strong",
            [x + inward, MIDDLE - 8.0],
            anchor,
            "off the scale",
        );
    }
}

/// What the picture shows, in words.
pub(super) fn words(deviation: &Deviation) -> String {
    let mut text = format!("{} %", signed(deviation.shown_percent, 2));
    if let Some(spread) = deviation.spread_percent {
        text.push_str(&format!(", expected spread {} %", short(spread, 2)));
    }
    if let (Some(tolerance), Some(action)) = (deviation.tolerance_percent, deviation.action_percent)
    {
        text.push_str(&format!(
            ", tolerance {} %, action level {} %",
            short(tolerance, 2),
            short(action, 2)
        ));
    }
    if deviation.standing == Standing::NotAVerification {
        text.push_str("; not a verification");
    }
    text
}
