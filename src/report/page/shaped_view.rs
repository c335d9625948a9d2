//! What a scatter integration found besides the dose, in finished strings: where
//! the dose comes from, how even the fluence is around the point, how finely it
//! was summed, and what the intervals between control points add.

use super::beam_view::Fact;
use super::words::counted;
use crate::dose::{ControlPointDose, FactorName, IntervalSource, ShapedResult, Trace};
use crate::report::number::{MISSING, fixed, fixed_or_dash, short};

/// So many intervals are shown, spread evenly, with the first and the last.
const INTERVALS: usize = 12;

/// A part of the dose.
#[derive(Clone, Debug)]
pub(super) struct PartView {
    pub(super) name: &'static str,
    pub(super) percent: String,
    pub(super) what: &'static str,
}

/// An interval between two control points.
#[derive(Clone, Debug)]
pub(super) struct IntervalView {
    pub(super) control_point: String,
    pub(super) meterset: String,
    pub(super) gantry: String,
    pub(super) depth: String,
    pub(super) spd: String,
    pub(super) fluence: String,
    pub(super) head_scatter: String,
    pub(super) in_phantom: String,
    pub(super) dose: String,
}

/// The intervals of a moving field.
#[derive(Clone, Debug)]
pub(super) struct IntervalsView {
    pub(super) caption: String,
    /// Of the first column.
    pub(super) heading: &'static str,
    pub(super) rows: Vec<IntervalView>,
    /// Sums over all intervals, also those not shown.
    pub(super) total_meterset: String,
    pub(super) total_dose: String,
    pub(super) total_words: String,
}

/// The part of a beam's detail.
#[derive(Clone, Debug)]
pub(super) struct ShapedView {
    pub(super) parts: Vec<PartView>,
    pub(super) facts: Vec<Fact>,
    pub(super) intervals: Option<IntervalsView>,
}

/// The view; `trace` is the beam's own.
pub(super) fn view(shaped: &ShapedResult, trace: Option<&Trace>) -> ShapedView {
    let shares = shaped.shares;
    let part = |name, percent: f64, what| PartView {
        name,
        // A transmission of some hundredths per cent is no zero.
        percent: fixed(percent, if percent.abs() < 1.0 { 2 } else { 1 }),
        what,
    };
    ShapedView {
        parts: vec![
            part(
                "open primary",
                shares.open_primary_percent,
                "primary that came through the opening",
            ),
            part(
                "scatter",
                shares.open_scatter_percent,
                "phantom scatter of what came through the opening",
            ),
            part(
                "transmission",
                shares.transmission_percent,
                "primary and scatter of what leaves and blocks let through",
            ),
        ],
        facts: facts(shaped),
        intervals: (shaped.intervals.len() > 1).then(|| intervals(shaped, trace)),
    }
}

fn facts(shaped: &ShapedResult) -> Vec<Fact> {
    let fact = |name, value| Fact { name, value };
    let mut facts = Vec::new();
    if let Some(gap_cm) = shaped.mean_leaf_gap_cm {
        facts.push(fact(
            "mean leaf gap",
            format!(
                "{} cm at the isocentre plane, over open leaf pairs, their widths and the meterset",
                fixed(gap_cm, 2)
            ),
        ));
    }
    facts.push(fact(
        "fluence around the point",
        if shaped.fluence_change_percent.is_finite() {
            format!(
                "changes by at most {} % within the edge margin",
                fixed(shaped.fluence_change_percent, 1)
            )
        } else {
            "none of it open at the point itself".to_owned()
        },
    ));
    let steps = shaped.steps;
    facts.push(fact(
        "summed over",
        format!(
            "{}: in one step no leaf or jaw moves more than {} cm (for head scatter no leaf more than {} cm) and the gantry not more than {} degrees",
            counted(shaped.moments as u64, "moment", "moments"),
            short(steps.leaf_cm, 3),
            short(steps.aperture_cm, 3),
            short(steps.gantry_deg, 2)
        ),
    ));
    facts
}

fn intervals(shaped: &ShapedResult, trace: Option<&Trace>) -> IntervalsView {
    let all = shaped.intervals.as_slice();
    let (of, heading) = match shaped.intervals_from {
        IntervalSource::ControlPoints => ("Intervals between control points", "Control points"),
        IntervalSource::ModelSweep => (
            "Stretches of the jaw's sweep, taken from the beam model and not stated in the plan",
            "Stretch",
        ),
    };
    let chosen = evenly(all.len(), INTERVALS);
    let caption = if chosen.len() < all.len() {
        format!(
            "{of}, {} of {} evenly picked; audit.json has all",
            chosen.len(),
            all.len()
        )
    } else {
        format!("{of}, all {}", all.len())
    };
    let rows = chosen
        .into_iter()
        .filter_map(|index| all.get(index))
        .map(|interval| row(interval, shaped.intervals_from))
        .collect();
    let meterset_percent: f64 = all.iter().map(|interval| interval.meterset_percent).sum();
    let dose: f64 = all.iter().map(|interval| interval.dose_per_mu_cgy).sum();
    let tray = trace.and_then(|trace| trace.factor(FactorName::Tray));
    IntervalsView {
        caption,
        heading,
        rows,
        total_meterset: fixed(meterset_percent, 1),
        total_dose: fixed(dose, 4),
        total_words: tray.map_or_else(
            || format!("all {}: the product of the trace", all.len()),
            |tray| {
                format!(
                    "all {}, times the tray factor {}: the product of the trace",
                    all.len(),
                    fixed(tray.value, 4)
                )
            },
        ),
    }
}

fn row(interval: &ControlPointDose, from: IntervalSource) -> IntervalView {
    IntervalView {
        // Items count from 1, as in the list of control points.
        control_point: match from {
            IntervalSource::ControlPoints => format!(
                "{}\u{2013}{}",
                interval.from_control_point + 1,
                interval.from_control_point + 2
            ),
            IntervalSource::ModelSweep => (interval.from_control_point + 1).to_string(),
        },
        meterset: fixed(interval.meterset_percent, 2),
        gantry: interval.gantry_deg.map_or_else(
            || MISSING.to_owned(),
            |deg| fixed_or_dash(Some(deg.rem_euclid(360.0)), 1),
        ),
        depth: fixed(interval.effective_depth_cm, 2),
        spd: fixed(interval.spd_cm, 2),
        fluence: fixed(interval.point_fluence, 3),
        head_scatter: fixed(interval.head_scatter, 4),
        in_phantom: fixed(interval.in_phantom, 4),
        dose: fixed(interval.dose_per_mu_cgy, 5),
    }
}

/// Places of at most `most` of `count` things, spread evenly, with the first and the last.
fn evenly(count: usize, most: usize) -> Vec<usize> {
    if count <= most {
        return (0..count).collect();
    }
    let (last, gaps) = (count - 1, most - 1);
    (0..most)
        .map(|index| (index * last + gaps / 2) / gaps)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::evenly;

    #[test]
    fn verify_rows_are_picked_evenly() {
        assert_eq!(evenly(3, 12), [0, 1, 2]);
        // By hand: 177 / 11 = 16.09 steps between the twelve.
        assert_eq!(
            evenly(178, 12),
            [0, 16, 32, 48, 64, 80, 97, 113, 129, 145, 161, 177]
        );
        assert_eq!(evenly(13, 12).len(), 12);
    }
}
