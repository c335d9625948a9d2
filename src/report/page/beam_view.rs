//! One beam: its row in the plan's table and its detail, in finished strings.

use super::attention::beam_name;
use super::beams_eye::{self, Picture};
use super::deviation::{self, Deviation, Standing};
use super::shaped_view::{self, ShapedView};
use super::trace_view::{self, TraceView};
use super::words::{Status, is_result, judgement, status};
use crate::audit::{BeamEntry, Judgement, Verdict};
use crate::dose::{DepthCandidate, DosePoint};
use crate::report::number::{MISSING, fixed, fixed_or_dash, short_or_dash, signed, text_or_dash};
use crate::report::table::judged_percent;

/// A row of the plan's table of beams.
#[derive(Clone, Debug)]
pub(super) struct BeamRowView {
    pub(super) id: String,
    pub(super) has_detail: bool,
    pub(super) group: String,
    pub(super) name: String,
    pub(super) machine: String,
    pub(super) energy: String,
    pub(super) technique: &'static str,
    pub(super) angles: String,
    pub(super) opening: String,
    pub(super) ssd: String,
    pub(super) depth: String,
    pub(super) depth_basis: &'static str,
    pub(super) mu: String,
    pub(super) planned: String,
    pub(super) independent: String,
    pub(super) deviation: String,
    pub(super) no_verification: bool,
    /// What was judged when it was not the deviation itself.
    pub(super) judged: Option<String>,
    pub(super) status: Status,
}

/// A name and a value.
#[derive(Clone, Debug)]
pub(super) struct Fact {
    pub(super) name: &'static str,
    pub(super) value: String,
}

/// A depth that could be used.
#[derive(Clone, Debug)]
pub(super) struct DepthView {
    pub(super) basis: &'static str,
    pub(super) used: bool,
    pub(super) independent: &'static str,
    pub(super) perpendicular: String,
    pub(super) along_ray: String,
    pub(super) effective: String,
    pub(super) ssd: String,
    pub(super) source: String,
}

/// A term of the expected spread.
#[derive(Clone, Debug)]
pub(super) struct SpreadView {
    pub(super) name: &'static str,
    pub(super) percent: String,
    pub(super) source: String,
}

/// The detail of one beam.
#[derive(Clone, Debug)]
pub(super) struct BeamView {
    pub(super) row: BeamRowView,
    pub(super) open: bool,
    /// Whatever number the beam has verifies nothing.
    pub(super) not_a_result: bool,
    pub(super) picture: Option<Picture>,
    pub(super) deviation_svg: Option<String>,
    pub(super) deviation_words: String,
    pub(super) judgement: String,
    pub(super) level_basis: String,
    pub(super) reasons: Vec<String>,
    pub(super) obstacles: Vec<String>,
    pub(super) remarks: Vec<String>,
    pub(super) trace: Option<TraceView>,
    pub(super) shaped: Option<ShapedView>,
    pub(super) depths: Vec<DepthView>,
    pub(super) point: Vec<Fact>,
    pub(super) squares: Vec<Fact>,
    pub(super) spread: Vec<SpreadView>,
    pub(super) spread_total: String,
}

/// The row of a beam.
pub(super) fn row(beam: &BeamEntry, id: String, has_detail: bool) -> BeamRowView {
    let calculation = &beam.calculation;
    let depth = calculation.depths.first();
    let result = is_result(beam.verdict);
    let bracket = |text: String| {
        if result || text == MISSING {
            text
        } else {
            format!("[{text}]")
        }
    };
    let angle = |value: Option<f64>| short_or_dash(value, 1);
    let turns = match (calculation.gantry_deg, calculation.gantry_end_deg) {
        (Some(from), Some(to)) if (from - to).abs() > 0.05 => {
            format!("{}\u{2192}{}", angle(Some(from)), angle(Some(to)))
        }
        (from, _) => angle(from),
    };
    BeamRowView {
        id,
        has_detail,
        group: beam
            .fraction_group
            .map_or_else(|| MISSING.to_owned(), |group| group.to_string()),
        name: beam_name(beam),
        machine: text_or_dash(beam.machine.as_ref()),
        energy: energy(beam),
        technique: calculation.technique.term(),
        angles: format!(
            "{turns} / {} / {}",
            angle(calculation.collimator_deg),
            angle(calculation.couch_deg)
        ),
        opening: format!(
            "{} \u{d7} {}",
            fixed_or_dash(calculation.x_cm, 1),
            fixed_or_dash(calculation.y_cm, 1)
        ),
        ssd: fixed_or_dash(
            depth
                .and_then(|depth| depth.ssd_cm)
                .or(calculation.plan_ssd_cm),
            1,
        ),
        depth: fixed_or_dash(
            depth.and_then(|depth| depth.perpendicular_cm.or(depth.along_ray_cm)),
            2,
        ),
        depth_basis: depth.map_or("none", |depth| depth.basis.term()),
        mu: fixed_or_dash(beam.planned_mu, 1),
        planned: fixed_or_dash(beam.planned_dose_gy, 3),
        independent: bracket(fixed_or_dash(beam.independent_dose_gy, 3)),
        deviation: bracket(
            beam.deviation_percent
                .map_or_else(|| MISSING.to_owned(), |percent| signed(percent, 1)),
        ),
        no_verification: !result
            && (beam.independent_dose_gy.is_some() || beam.deviation_percent.is_some()),
        judged: judged_otherwise(beam),
        status: status(beam.verdict),
    }
}

fn judged_otherwise(beam: &BeamEntry) -> Option<String> {
    match beam.judgement.as_ref()? {
        Judgement::Alone => None,
        Judgement::ShareOfTotal {
            percent_of_total, ..
        } => Some(format!(
            "judged: {} % of total",
            signed(*percent_of_total, 1)
        )),
        Judgement::FractionSum {
            sum_deviation_percent,
        } => Some(format!(
            "judged: sum {} %",
            signed(*sum_deviation_percent, 1)
        )),
    }
}

fn energy(beam: &BeamEntry) -> String {
    let unit = match beam.radiation.as_deref() {
        Some("PHOTON") => "MV photons",
        Some("ELECTRON") => "MeV electrons",
        Some(other) => other,
        None => "radiation not stated",
    };
    format!("{} {unit}", text_or_dash(beam.energy.as_ref()))
}

/// The detail of a beam.
pub(super) fn view(beam: &BeamEntry, id: &str) -> BeamView {
    let calculation = &beam.calculation;
    let drawn = drawn_deviation(beam);
    let obstacles = calculation
        .obstacles
        .iter()
        .filter(|obstacle| !beam.reasons.contains(&obstacle.message))
        .map(|obstacle| obstacle.message.clone())
        .collect();
    let mut remarks = beam.remarks.clone();
    for remark in &calculation.remarks {
        if !remarks.contains(remark) {
            remarks.push(remark.clone());
        }
    }
    let spread = calculation.spread.as_ref();
    BeamView {
        row: row(beam, id.to_owned(), true),
        not_a_result: !is_result(beam.verdict),
        open: !matches!(beam.verdict, Verdict::Within | Verdict::NotTreated),
        picture: beams_eye::picture(calculation, &format!("{id}-view")),
        deviation_words: drawn.as_ref().map_or_else(String::new, deviation::words),
        deviation_svg: drawn.map(|drawn| deviation::picture(&drawn, &format!("{id}-dev"))),
        judgement: judgement(beam),
        level_basis: beam.level_basis.clone().unwrap_or_default(),
        reasons: beam.reasons.clone(),
        obstacles,
        remarks,
        trace: calculation
            .trace
            .as_ref()
            .map(|trace| trace_view::view(trace, beam)),
        shaped: calculation
            .shaped
            .as_ref()
            .map(|shaped| shaped_view::view(shaped, calculation.trace.as_ref())),
        depths: calculation
            .depths
            .iter()
            .enumerate()
            .map(|(index, depth)| depth_view(depth, index == 0))
            .collect(),
        point: calculation
            .point
            .as_ref()
            .map_or_else(Vec::new, point_facts),
        squares: square_facts(beam),
        spread: spread.map_or_else(Vec::new, |spread| {
            spread
                .terms
                .iter()
                .map(|term| SpreadView {
                    name: term.name,
                    percent: fixed(term.percent, 2),
                    source: term.source.clone(),
                })
                .collect()
        }),
        spread_total: spread.map_or_else(String::new, |spread| fixed(spread.percent, 2)),
    }
}

fn drawn_deviation(beam: &BeamEntry) -> Option<Deviation> {
    let finite = |value: Option<f64>| value.filter(|value| value.is_finite());
    let result = is_result(beam.verdict);
    let judged = finite(judged_percent(beam)).filter(|_| result);
    let shown_percent = judged.or(finite(beam.deviation_percent))?;
    // The spread belongs to the beam's own deviation.
    let own = judged.is_none_or(|judged| beam.deviation_percent == Some(judged));
    Some(Deviation {
        shown_percent,
        spread_percent: finite(beam.expected_spread_percent).filter(|_| own),
        tolerance_percent: finite(beam.tolerance_percent),
        action_percent: finite(beam.action_percent),
        standing: if result {
            Standing::Judged
        } else {
            Standing::NotAVerification
        },
    })
}

fn depth_view(depth: &DepthCandidate, used: bool) -> DepthView {
    DepthView {
        basis: depth.basis.term(),
        used,
        independent: if depth.independent {
            "independent"
        } else {
            "the planning system's word"
        },
        perpendicular: fixed_or_dash(depth.perpendicular_cm, 2),
        along_ray: fixed_or_dash(depth.along_ray_cm, 2),
        effective: fixed(depth.effective_cm, 2),
        ssd: fixed_or_dash(depth.ssd_cm, 2),
        source: depth.source.clone(),
    }
}

fn point_facts(point: &DosePoint) -> Vec<Fact> {
    let fact = |name, value| Fact { name, value };
    let three = |x: f64, y: f64, z: f64| {
        format!("({}, {}, {}) cm", signed(x, 2), signed(y, 2), signed(z, 2))
    };
    let mut facts = vec![
        fact("basis", point.basis.term().to_owned()),
        fact("from", point.source.clone()),
        fact(
            "in the patient",
            three(point.patient.x_cm, point.patient.y_cm, point.patient.z_cm),
        ),
    ];
    if let Some(collimator) = point.collimator {
        facts.push(fact(
            "collimator system",
            three(collimator.x_cm, collimator.y_cm, collimator.z_cm),
        ));
    }
    if let Some([x, y]) = point.projected_cm {
        facts.push(fact(
            "at the isocentre plane",
            format!("({}, {}) cm", signed(x, 2), signed(y, 2)),
        ));
    }
    if let Some(distance) = point.spd_cm {
        facts.push(fact(
            "source-point distance",
            format!("{} cm", fixed(distance, 2)),
        ));
    }
    if let Some(radius) = point.off_axis_cm {
        facts.push(fact("off axis", format!("{} cm", fixed(radius, 2))));
    }
    facts
}

fn square_facts(beam: &BeamEntry) -> Vec<Fact> {
    let Some(squares) = beam.calculation.squares else {
        return Vec::new();
    };
    let mut facts = vec![Fact {
        name: "square, collimator scatter",
        value: format!("{} cm", fixed(squares.collimator.side_cm(), 2)),
    }];
    if let Some(phantom) = squares.phantom {
        facts.push(Fact {
            name: "square, phantom scatter",
            value: format!("{} cm", fixed(phantom.side_cm(), 2)),
        });
    }
    facts
}
