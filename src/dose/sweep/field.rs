//! The dose of a field with a dynamic wedge whose motion comes from the beam
//! model: the sweep goes through the scatter integration, and beside the result
//! stands what a person needs to check it: the fluence at the point, the dose
//! over that of the open field, the measured factor where the model has one, and whether the point would show a wedge
//! turned round. The motion itself is worked out in `motion`.

use super::motion::JawMotion;
use super::planned::PlannedSweep;
use crate::dose::aperture::view_between;
use crate::dose::delivery::Interval;
use crate::dose::shaped::{IntervalSource, ShapedField, calculate_shaped};
use crate::dose::text::number;
use crate::dose::wedge_factor::{POSITION_SIGMA_CM, REVERSAL_VISIBLE_PERCENT};
use crate::dose::{BeamCalculation, Input, Obstacle, ObstacleKind, Spread, SpreadTerm};
use crate::plan::ControlPoint;
use crate::quantity::tolerance;

/// A measured factor on the axis that differs by more than this from what the sweep gives makes the model doubtful, per
/// cent (an own choice, above the 1 % at which `model check` warns).
const MEASURED_LIMIT_PERCENT: f64 = 2.0;

/// Calculates the field, whose jaws stand as at a control point, and writes what was found into `result`; `name` is the
/// wedge in words.
pub(in crate::dose) fn calculate_swept(
    field: &ShapedField<'_>,
    (planned, name): (&PlannedSweep<'_>, &str),
    at: &ControlPoint,
    result: &mut BeamCalculation,
) {
    let motion = match planned.motion(field.machine, at) {
        Ok(motion) => motion,
        Err(obstacle) => return result.obstacles.push(obstacle),
    };
    let blank = BeamCalculation {
        obstacles: Vec::new(),
        remarks: Vec::new(),
        ..result.clone()
    };
    let intervals = motion.intervals();
    calculate_shaped(
        &ShapedField {
            delivered: &intervals,
            ..*field
        },
        result,
    );
    result.remarks.push(motion.in_words(name));
    if let Some(shaped) = &mut result.shaped {
        shaped.intervals_from = IntervalSource::ModelSweep;
        // The picture shows where the jaw ends, which no control point states.
        let ends = motion.last_point();
        result.view.last = ends.and_then(|last| view_between(field.beam, at, last).last);
    }
    let Some(swept) = result.trace.as_ref().map(|trace| trace.dose_per_mu_cgy) else {
        return;
    };
    let open = calculated(field, &motion.open(), &blank);
    let Some(projected_cm) = result.view.point_cm else {
        return;
    };
    let position_cm = planned.position_cm(projected_cm);
    tell_shares(&motion, position_cm, (swept, &open), result);
    widen_spread(field, &motion, position_cm, result);
    measured_factor(planned, &motion, projected_cm, (swept, &open), result);
    result
        .remarks
        .extend(reversal(field, planned, at, (swept, &blank)));
}

/// The same field with another motion.
fn calculated(
    field: &ShapedField<'_>,
    delivered: &[Interval<'_>],
    blank: &BeamCalculation,
) -> BeamCalculation {
    let mut result = blank.clone();
    calculate_shaped(
        &ShapedField {
            delivered,
            ..*field
        },
        &mut result,
    );
    result
}

fn dose_of(result: &BeamCalculation) -> Option<f64> {
    let dose = result.trace.as_ref()?.dose_per_mu_cgy;
    (dose > 0.0).then_some(dose)
}

/// Puts what can be checked by hand among the numbers of the trace.
fn tell_shares(
    motion: &JawMotion<'_>,
    position_cm: f64,
    (swept, open): (f64, &BeamCalculation),
    result: &mut BeamCalculation,
) {
    let Some(trace) = &mut result.trace else {
        return;
    };
    trace.inputs.push(Input {
        name: "position of the point along the wedge",
        symbol: "p",
        value: position_cm,
        unit: "cm",
        source: "at the isocentre plane, positive towards the thin end".to_owned(),
    });
    trace.inputs.push(Input {
        name: "share of the meterset before the jaw passes the point",
        symbol: "S'(p)/S'(e)",
        value: motion.share(position_cm),
        unit: "",
        source: format!(
            "{}; Phi_open is this, blurred by the penumbra",
            motion.share_in_words(position_cm)
        ),
    });
    if let Some(open) = dose_of(open) {
        trace.inputs.push(Input {
            name: "dose over that of the open field",
            symbol: "WF_eff",
            value: swept / open,
            unit: "",
            source: format!(
                "{} / {} cGy/MU, both by scatter integration; no factor of the product",
                number(swept),
                number(open)
            ),
        });
    }
}

/// What a sweep adds to the expected spread.
fn widen_spread(
    field: &ShapedField<'_>,
    motion: &JawMotion<'_>,
    position_cm: f64,
    result: &mut BeamCalculation,
) {
    const HALF_CM: f64 = 0.5;
    let Some(spread) = result.spread.take() else {
        return;
    };
    let mut terms = spread.terms;
    terms.push(SpreadTerm {
        name: "wedge sweep",
        percent: field.model.beam.uncertainty.transmission_percent,
        source: "transmissions, stated in the beam model".to_owned(),
    });
    let ends_cm = [position_cm - HALF_CM, position_cm + HALF_CM]
        .map(|cm| cm.clamp(motion.from_cm, motion.to_cm));
    let [low, high] = ends_cm.map(|cm| motion.share(cm).ln());
    let per_cm = (high - low) / (ends_cm[1] - ends_cm[0]);
    if per_cm.is_finite() {
        terms.push(SpreadTerm {
            name: "wedge position",
            percent: 100.0 * per_cm.abs() * POSITION_SIGMA_CM,
            source: format!(
                "{:.2} % per cm along the wedge * {POSITION_SIGMA_CM} cm",
                100.0 * per_cm
            ),
        });
    }
    let pair = field
        .machine
        .collimation
        .jaw(motion.planned.sweep.moves_along);
    let share = motion.share(position_cm);
    if let Some(transmission) = pair.and_then(|pair| pair.transmission)
        && share > 0.0
    {
        terms.push(SpreadTerm {
            name: "transmission of the moving jaw",
            percent: 100.0 * transmission * (1.0 - share) / share,
            source: format!(
                "not in the dose: {} of the model for the {:.0} % of the meterset after the jaw has passed the point",
                number(transmission),
                100.0 * (1.0 - share)
            ),
        });
    }
    result.spread = Some(Spread::new(terms));
}

/// The model's own measured factor, which holds on the axis of squares for the sweep's own angle; told, and never put in
/// the place of the sweep.
fn measured_factor(
    planned: &PlannedSweep<'_>,
    motion: &JawMotion<'_>,
    projected_cm: [f64; 2],
    (swept, open): (f64, &BeamCalculation),
    result: &mut BeamCalculation,
) {
    let on_axis = projected_cm
        .iter()
        .all(|cm| cm.abs() < tolerance::POSITION_CM);
    let Some(factor) = planned.sweep().factor.as_ref() else {
        return;
    };
    if !on_axis || motion.weight < 1.0 || !motion.is_symmetric() {
        return;
    }
    let depth_cm = result.trace.as_ref().and_then(|trace| trace.input("d_eff"));
    let square = open.squares.and_then(|squares| squares.phantom);
    let (Some(depth), Some(square), Some(open)) = (depth_cm, square, dose_of(open)) else {
        return;
    };
    let depth_cm = depth.value;
    let Ok(measured) = factor.at(depth_cm, square.side_cm()) else {
        return result.remarks.push(format!(
            "the measured factor of the wedge {} on the axis ({}) does not reach depth {} cm and side {} cm: the sweep is not held against it",
            planned.id(),
            factor.name(),
            number(depth_cm),
            number(square.side_cm())
        ));
    };
    let percent = 100.0 * (swept / open / measured.value - 1.0);
    let words = format!(
        "the sweep of the wedge {} comes to {} of the open field on the axis, the measured factor is {} ({}): {percent:+.1} %",
        planned.id(),
        number(swept / open),
        number(measured.value),
        measured.source()
    );
    // NaN must not pass.
    let agrees = percent.abs() <= MEASURED_LIMIT_PERCENT;
    if agrees {
        result
            .remarks
            .push(format!("{words}; the dose rests on the sweep"));
    } else {
        result.obstacles.push(Obstacle {
            kind: ObstacleKind::Model,
            message: format!(
                "{words}, more than {MEASURED_LIMIT_PERCENT} %: the beam model contradicts itself, find out which is right"
            ),
        });
    }
}

/// What the wedge turned round would do at this point, when that is too little to be seen.
fn reversal(
    field: &ShapedField<'_>,
    planned: &PlannedSweep<'_>,
    at: &ControlPoint,
    (swept, blank): (f64, &BeamCalculation),
) -> Option<String> {
    // A field that the machine could not deliver the other way round is no error to be looked for.
    let motion = planned.reversed().motion(field.machine, at).ok()?;
    let turned = dose_of(&calculated(field, &motion.intervals(), blank))?;
    // Rounded to what is shown, so that no change is not a negative one.
    let percent = (1000.0 * (turned / swept - 1.0)).round() / 10.0 + 0.0;
    (percent.abs() < REVERSAL_VISIBLE_PERCENT).then(|| {
        format!(
            "the wedge {} turned round would change the dose at this point by {percent:+.1} %: the point is a weak check of its orientation",
            planned.id()
        )
    })
}
