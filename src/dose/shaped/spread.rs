//! Expected spread of a scatter integration, 1 sigma.

use super::results::ShapedResult;
use super::standing::Standing;
use super::sum::Sums;
use crate::beam_model::scatter::ScatterAtDepth;
use crate::dose::{Spread, SpreadTerm};
use crate::quantity::tolerance;

/// Fields smaller than this are small fields, cm: lateral equilibrium and source size begin to matter (IAEA TRS-483).
const SMALL_FIELD_CM: f64 = 3.0;

/// What a small field adds, per cent for each cm below [`SMALL_FIELD_CM`]: an own choice, from a spread of some
/// per cent between published output factors of 1 cm to 2 cm fields (common practice).
const SMALL_FIELD_PERCENT_PER_CM: f64 = 1.5;

/// Uncertainty of a leaf's radiation edge, cm: half a millimetre (common practice; tolerances of leaf
/// positions are 1 mm).
const LEAF_EDGE_CM: f64 = 0.05;

/// Uncertainty of a transmission, as a share of it (an own choice).
const TRANSMISSION_SHARE: f64 = 0.2;

/// What the depth is known to.
pub(super) struct DepthSpread<'a> {
    pub(super) sigma_cm: f64,
    pub(super) name: &'a str,
}

/// The spread.
pub(super) fn spread_of(
    standing: &Standing<'_>,
    sums: &Sums,
    result: &ShapedResult,
    (kernel, equivalent_side_cm): (&ScatterAtDepth<'_>, f64),
    depth: &DepthSpread<'_>,
    has_tray: bool,
) -> Spread {
    let beam = standing.model.beam;
    let uncertainty = beam.uncertainty;
    let stated = |name, percent| SpreadTerm {
        name,
        percent,
        source: "stated in the beam model".to_owned(),
    };
    let mut terms = vec![
        stated("reference output", uncertainty.output_percent),
        stated("depth table", uncertainty.depth_table_percent),
        stated("head scatter", uncertainty.head_scatter_percent),
        stated("phantom scatter", uncertainty.phantom_scatter_percent),
    ];
    if sums.off_axis_cm >= tolerance::POSITION_CM {
        terms.push(stated("off-axis ratio", uncertainty.off_axis_percent));
    }
    if has_tray {
        terms.push(stated("tray", uncertainty.transmission_percent));
    }
    if sums.wedge_share > 0.0 {
        terms.push(stated("wedge", uncertainty.transmission_percent));
    }
    if sums.couch_share > 0.0 {
        terms.push(stated("couch", uncertainty.transmission_percent));
    }
    terms.extend(depth_term(standing, sums, equivalent_side_cm, depth));
    terms.extend(edge_term(standing, sums, result));
    let transmitted = result.shares.transmission_percent;
    if transmitted > 0.0 {
        terms.push(SpreadTerm {
            name: "transmission of leaves and blocks",
            percent: TRANSMISSION_SHARE * transmitted,
            source: format!(
                "{transmitted:.2} % of the dose comes through leaves or blocks; a fifth of it"
            ),
        });
    }
    let smallest_cm = smallest_opening_cm(result, equivalent_side_cm, kernel);
    if smallest_cm < SMALL_FIELD_CM {
        terms.push(SpreadTerm {
            name: "small opening",
            percent: SMALL_FIELD_PERCENT_PER_CM * (SMALL_FIELD_CM - smallest_cm),
            source: format!(
                "openings of {smallest_cm:.1} cm, below {SMALL_FIELD_CM} cm: {SMALL_FIELD_PERCENT_PER_CM} % for each cm"
            ),
        });
    }
    Spread::new(terms)
}

/// The mean leaf gap, where there is one, else the equivalent square.
fn smallest_opening_cm(
    result: &ShapedResult,
    equivalent_side_cm: f64,
    kernel: &ScatterAtDepth<'_>,
) -> f64 {
    let bounded_cm = equivalent_side_cm.min(kernel.sides_cm().1);
    result
        .mean_leaf_gap_cm
        .map_or(bounded_cm, |gap_cm| gap_cm.min(bounded_cm))
}

/// |d ln TPR / d depth| * sigma at the mean depth.
fn depth_term(
    standing: &Standing<'_>,
    sums: &Sums,
    side_cm: f64,
    depth: &DepthSpread<'_>,
) -> Option<SpreadTerm> {
    const STEP_CM: f64 = 0.1;
    let beam = standing.model.beam;
    let dose = |depth_cm: f64| {
        let kernel = beam.scatter_at(depth_cm).ok()?;
        let dose = kernel.square(side_cm.max(kernel.sides_cm().0));
        (dose > 0.0).then(|| dose.ln())
    };
    let at_cm = sums.effective_cm;
    // One-sided at the edge of a table.
    let steps = [(-STEP_CM, STEP_CM), (-STEP_CM, 0.0), (0.0, STEP_CM)];
    let per_cm = steps
        .into_iter()
        .find_map(|(low, high)| Some((dose(at_cm + high)? - dose(at_cm + low)?) / (high - low)))?
        .abs();
    Some(SpreadTerm {
        name: "depth",
        percent: 100.0 * per_cm * depth.sigma_cm,
        source: format!(
            "{:.2} % per cm * {} cm for a depth by {}",
            100.0 * per_cm,
            depth.sigma_cm,
            depth.name
        ),
    })
}

/// What half a millimetre of every leaf edge changes: the change of fluence around the point for a field that
/// stands still is far from it; a moving gap gains or loses the same on both sides.
fn edge_term(standing: &Standing<'_>, sums: &Sums, result: &ShapedResult) -> Option<SpreadTerm> {
    let gap_cm = result.mean_leaf_gap_cm?;
    if standing.banks.is_empty() || sums.moments < 2 || gap_cm <= 0.0 {
        return None;
    }
    // An open fluence of 1 means that no gap closes over the point: then its width does not matter.
    let modulated = (1.0 - sums.exposure.open_fluence).clamp(0.0, 1.0);
    let percent = 100.0 * modulated * 2.0 * LEAF_EDGE_CM / gap_cm;
    (percent > 0.0).then(|| SpreadTerm {
        name: "leaf positions",
        percent,
        source: format!(
            "gaps of {gap_cm:.1} cm on the average with {LEAF_EDGE_CM} cm at either end, for the {:.0} % of the meterset in which the point is covered",
            100.0 * modulated
        ),
    })
}
