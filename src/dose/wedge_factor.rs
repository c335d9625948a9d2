//! What a wedge does in the factor formalism: its factor on the axis and its
//! profile, once each; for one that is in for a share of the meterset
//!
//! ```text
//! share * WF(d, s) * p(x) / p(0) + (1 - share)
//! ```
//!
//! the sum of the doses with and without it (AAPM TG-71 gives the wedge factor by depth, side and off-axis
//! position; the product of axis and profile is the usual form where only these are measured). The profile is
//! one of fluence: dose follows it less, because scatter comes from all around. How much that can be is a term of the
//! spread, and beyond a limit an obstacle. Which wedge a plan's beam has is found in `wedge`.

use super::text::number;
use super::{
    Factor, FactorError, FactorName, FieldInput, FieldWedge, Obstacle, ObstacleKind, SpreadTerm,
};
use crate::beam_model::{BeamModel, OutOfRange};
use crate::quantity::tolerance;

/// Uncertainty of where a wedge lies, cm: half of the 2 mm that AAPM TG-40 allows for wedge position (from memory).
pub(super) const POSITION_SIGMA_CM: f64 = 0.1;

/// Dose follows a wedge's fluence less than fully: relative to exp(g x) the dose ratio is off by about this times the share of
/// scatter times |g x|. Integrating the published kernel of `beam_model::kernel` over exponential fluences of 15 to 60 degrees
/// gave 0.30 in the mean and at most 0.39, for 10 x 10 to 20 x 20 fields, 5 to 20 cm deep, to three quarters of the way to the edge.
const FOLLOWS_LESS: f64 = 0.35;

/// Share of scatter in the dose where the tables are too few to tell it (6 MV, large fields, 15 cm deep).
const SCATTER_SHARE: f64 = 0.35;

/// More than this the profile is no substitute for an integration, per cent (an own choice, below the built-in tolerance of
/// wedged fields, 3.5 %).
const FOLLOWS_LESS_LIMIT_PERCENT: f64 = 3.0;

/// A reversed wedge that changes the dose by less than this could pass for a right one, per cent (an own choice: twice the
/// built-in tolerance of wedged fields, which the plan's own deviation may use up on the other side).
pub(super) const REVERSAL_VISIBLE_PERCENT: f64 = 7.0;

fn out_of_range(which: FactorName) -> impl Fn(OutOfRange) -> FactorError {
    move |range| FactorError::OutOfRange { which, range }
}

/// Factor on the axis and profile at the field's point, with where they come from.
struct Parts {
    factor: f64,
    factor_source: String,
    profile: f64,
    profile_source: String,
}

fn parts(field: &FieldInput<'_>, wedge: &FieldWedge<'_>) -> Result<Parts, FactorError> {
    let placed = wedge.placed;
    let (depth_cm, s_d) = (field.tpr_depth_cm(), field.point_square());
    let factor = placed
        .factor_at(depth_cm, s_d)
        .map_err(out_of_range(FactorName::Wedge))?;
    let [x_cm, y_cm] = field.ray.projected_cm;
    let position_cm = placed.position_cm(field.ray.projected_cm);
    let lies = format!(
        "orientation {} degrees: {} cm from the axis towards the {} end",
        number(placed.orientation_deg()),
        number(position_cm.abs()),
        if position_cm < 0.0 { "thick" } else { "thin" }
    );
    let (profile, profile_source) = if position_cm.abs() < tolerance::POSITION_CM {
        let text = "on the axis along the wedge: 1 by definition".to_owned();
        (1.0, text)
    } else {
        let profile = placed
            .profile_at(field.ray.projected_cm)
            .map_err(out_of_range(FactorName::WedgeProfile))?;
        let text = format!(
            "at x {}, y {}, {lies}: {}",
            number(x_cm),
            number(y_cm),
            profile.source()
        );
        (profile.value, text)
    };
    Ok(Parts {
        factor: factor.value,
        factor_source: format!(
            "wedge {} at depth {} cm, s_d = {} cm: {}",
            placed.id(),
            number(depth_cm),
            number(s_d.side_cm()),
            factor.source()
        ),
        profile,
        profile_source,
    })
}

/// The wedge's factors: typed, from the model, or none.
pub(super) fn wedge_factors(field: &FieldInput<'_>) -> Result<Vec<Factor>, FactorError> {
    if let Some(typed) = field.typed(FactorName::Wedge) {
        return Ok(vec![typed]);
    }
    let Some(wedge) = &field.wedge else {
        return Ok(Vec::new());
    };
    let found = parts(field, wedge)?;
    if wedge.share_in >= 1.0 {
        return Ok(vec![
            Factor {
                name: FactorName::Wedge,
                value: found.factor,
                source: found.factor_source,
            },
            Factor {
                name: FactorName::WedgeProfile,
                value: found.profile,
                source: found.profile_source,
            },
        ]);
    }
    let share = wedge.share_in;
    Ok(vec![Factor {
        name: FactorName::Wedge,
        value: with_and_without(share, found.factor, found.profile),
        source: format!(
            "in for {share} of the meterset: {share} * {} * {} + {open}; WF {}; profile {}",
            number(found.factor),
            number(found.profile),
            found.factor_source,
            found.profile_source,
            share = number(share),
            open = number(1.0 - share),
        ),
    }])
}

fn with_and_without(share: f64, factor: f64, profile: f64) -> f64 {
    share * factor * profile + (1.0 - share)
}

/// Share of the dose that comes with the wedge in.
fn dose_share(wedge: &FieldWedge<'_>, found: &Parts) -> f64 {
    let share = wedge.share_in;
    share * found.factor * found.profile / with_and_without(share, found.factor, found.profile)
}

/// What the wedge adds to the expected spread.
pub(super) fn wedge_terms(field: &FieldInput<'_>, beam: &BeamModel) -> Vec<SpreadTerm> {
    let Some(wedge) = &field.wedge else {
        return Vec::new();
    };
    let Ok(found) = parts(field, wedge) else {
        return Vec::new();
    };
    let dose_share = dose_share(wedge, &found);
    let mut terms = vec![SpreadTerm {
        name: "wedge factor",
        percent: dose_share * beam.uncertainty.transmission_percent,
        source: format!(
            "transmissions, stated in the beam model, for {:.0} % of the dose",
            100.0 * dose_share
        ),
    }];
    if let Some(per_cm) = steepness_per_cm(field, wedge) {
        terms.push(SpreadTerm {
            name: "wedge position",
            percent: 100.0 * dose_share * per_cm * POSITION_SIGMA_CM,
            source: format!(
                "{:.2} % per cm along the wedge * {POSITION_SIGMA_CM} cm, for {:.0} % of the dose",
                100.0 * per_cm,
                100.0 * dose_share
            ),
        });
    }
    let percent = follows_less_percent(field, beam, dose_share, &found);
    if percent > 0.0 {
        terms.push(SpreadTerm {
            name: "wedge profile",
            percent,
            source: format!(
                "the profile is one of fluence, {:.4} here; scattered dose follows it less",
                found.profile
            ),
        });
    }
    terms
}

/// Relative change of the profile per cm around the point, one-sided at the table's ends.
fn steepness_per_cm(field: &FieldInput<'_>, wedge: &FieldWedge<'_>) -> Option<f64> {
    const HALF_CM: f64 = 0.5;
    let (sine, cosine) = wedge.placed.orientation_deg().to_radians().sin_cos();
    let [x_cm, y_cm] = field.ray.projected_cm;
    let log_at = |along_cm: f64| {
        let place_cm = [x_cm - along_cm * sine, y_cm + along_cm * cosine];
        let found = wedge.placed.profile_at(place_cm).ok()?;
        Some(found.value.ln())
    };
    [(-HALF_CM, HALF_CM), (-HALF_CM, 0.0), (0.0, HALF_CM)]
        .into_iter()
        .find_map(|(low, high)| Some((log_at(high)? - log_at(low)?) / (high - low)))
        .map(f64::abs)
}

fn follows_less_percent(
    field: &FieldInput<'_>,
    beam: &BeamModel,
    dose_share: f64,
    found: &Parts,
) -> f64 {
    let scatter_share = beam
        .scatter_at(field.tpr_depth_cm())
        .map(|kernel| {
            let (least_cm, greatest_cm) = kernel.sides_cm();
            let side_cm = field.point_square().side_cm();
            let side_cm = side_cm.min(greatest_cm).max(least_cm);
            1.0 - kernel.primary() / kernel.square(side_cm)
        })
        .ok()
        .filter(|share| (0.0..1.0).contains(share))
        .unwrap_or(SCATTER_SHARE);
    100.0 * dose_share * FOLLOWS_LESS * scatter_share * found.profile.ln().abs()
}

/// Where the product of axis and profile is too far from what an integration would give.
pub(super) fn wedge_limit(field: &FieldInput<'_>, beam: &BeamModel) -> Option<Obstacle> {
    let wedge = field.wedge.as_ref()?;
    let found = parts(field, wedge).ok()?;
    let percent = follows_less_percent(field, beam, dose_share(wedge, &found), &found);
    // NaN must not pass.
    let within = percent <= FOLLOWS_LESS_LIMIT_PERCENT;
    (!within).then(|| Obstacle {
        kind: ObstacleKind::TableRange,
        message: format!(
            "outside the method's range: so far along the wedge and so deep its fluence profile may differ from the dose's by {percent:.1} % (limit {FOLLOWS_LESS_LIMIT_PERCENT} %)"
        ),
    })
}

/// What a wedge turned round would do at this point, when that is too little to be seen.
pub(super) fn reversal_remark(field: &FieldInput<'_>) -> Option<String> {
    let wedge = field.wedge.as_ref()?;
    let found = parts(field, wedge).ok()?;
    let turned = FieldWedge {
        placed: wedge.placed.reversed(),
        ..*wedge
    };
    let position_cm = wedge.placed.position_cm(field.ray.projected_cm);
    if position_cm.abs() < tolerance::POSITION_CM {
        return Some(format!(
            "the point lies on the axis along the wedge {}: a wedge turned round would give the same dose here, so this point does not show it",
            wedge.placed.id()
        ));
    }
    let other = parts(field, &turned).ok()?;
    let here = with_and_without(wedge.share_in, found.factor, found.profile);
    let there = with_and_without(wedge.share_in, other.factor, other.profile);
    let percent = 100.0 * (there / here - 1.0);
    (percent.abs() < REVERSAL_VISIBLE_PERCENT).then(|| {
        format!(
            "a wedge {} turned round would change the dose at this point by {percent:+.1} % only: the point is a weak check of its orientation",
            wedge.placed.id()
        )
    })
}
