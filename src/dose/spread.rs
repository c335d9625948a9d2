//! Expected spread of a calculated dose, 1 sigma: what the model's stated
//! uncertainties, the depth and the method's own approximations can explain.
//! How a deviation is judged against it is the work of `audit`.

use super::factors::dose_per_mu;
use super::wedge_factor::wedge_terms;
use super::{FieldInput, Form, Spread, SpreadTerm};
use crate::beam_model::{BeamModel, OutOfRange};
use crate::quantity::{PointSquare, sterling_side_cm, tolerance};

/// Half the step of the numerical derivative by depth, cm.
const DEPTH_STEP_CM: f64 = 0.1;

/// Elongation from which the equivalent square becomes doubtful.
pub(super) const ELONGATED: f64 = 2.0;

/// Side over mean radius of a square, (2/pi) asinh(1) (Bjarngard & Siddon 1982).
const MEAN_RADIUS_OF_UNIT_SQUARE: f64 = 0.561_099_852_339_18;

/// The expected spread of a field that could be calculated with `beam`.
/// `depth_sigma_cm` is the 1-sigma uncertainty of its depth, `depth_name` its basis in words.
#[must_use]
pub fn expected_spread(
    field: &FieldInput<'_>,
    beam: &BeamModel,
    depth_sigma_cm: f64,
    depth_name: &str,
) -> Spread {
    let stated = |name, percent| SpreadTerm {
        name,
        percent,
        source: "stated in the beam model".to_owned(),
    };
    let uncertainty = beam.uncertainty;
    let mut terms = vec![
        stated("reference output", uncertainty.output_percent),
        stated("depth table", uncertainty.depth_table_percent),
        stated("collimator scatter", uncertainty.head_scatter_percent),
        stated("phantom scatter", uncertainty.phantom_scatter_percent),
    ];
    if field.ray.off_axis_cm() >= tolerance::POSITION_CM {
        terms.push(stated("off-axis ratio", uncertainty.off_axis_percent));
    }
    if field.tray.is_some() {
        terms.push(stated("tray", uncertainty.transmission_percent));
    }
    if field.couch.is_some() {
        terms.push(stated("couch", uncertainty.transmission_percent));
    }
    terms.extend(wedge_terms(field, beam));
    terms.extend(depth_term(field, depth_sigma_cm, depth_name));
    terms.extend(elongation_term(field, beam));
    terms.extend(off_centre_term(field, beam));
    Spread::new(terms)
}

/// |d ln(dose) / d depth| * sigma. The plan fixes where the point is, so a wrong depth
/// changes attenuation alone; in the SSD form the surface is what is set up, so
/// the point moves with the depth and the inverse square with it.
fn depth_term(field: &FieldInput<'_>, sigma_cm: f64, name: &str) -> Option<SpreadTerm> {
    let dose = |shift_cm: f64| {
        let mut moved = field.clone();
        moved.depth.effective_cm += shift_cm;
        moved.depth.perpendicular_cm = moved.depth.perpendicular_cm.map(|d_cm| d_cm + shift_cm);
        if let Form::FixedSsd { .. } = moved.form {
            moved.ray.spd_cm += shift_cm;
        }
        let trace = dose_per_mu(&moved).ok()?;
        (trace.dose_per_mu_cgy > 0.0).then(|| trace.dose_per_mu_cgy.ln())
    };
    // One-sided at the edge of a table.
    let steps = [
        (-DEPTH_STEP_CM, DEPTH_STEP_CM),
        (-DEPTH_STEP_CM, 0.0),
        (0.0, DEPTH_STEP_CM),
    ];
    let per_cm = steps
        .into_iter()
        .find_map(|(low_cm, high_cm)| Some((dose(high_cm)? - dose(low_cm)?) / (high_cm - low_cm)))?
        .abs();
    Some(SpreadTerm {
        name: "depth",
        percent: 100.0 * per_cm * sigma_cm,
        source: format!(
            "{:.2} % per cm * {sigma_cm} cm for a depth by {name}",
            100.0 * per_cm
        ),
    })
}

/// Sp * TPR at the point's depth: what the choice of the equivalent square changes.
fn scatter(field: &FieldInput<'_>, beam: &BeamModel, side_cm: f64) -> Result<f64, OutOfRange> {
    let square = PointSquare::new(side_cm);
    Ok(beam.sp(square)?.value * beam.tpr(field.tpr_depth_cm(), square)?.value)
}

/// A long field: 2ab/(a+b) against the square of the same mean radius.
fn elongation_term(field: &FieldInput<'_>, beam: &BeamModel) -> Option<SpreadTerm> {
    let a_cm = field.x_cm() * field.ray.scale();
    let b_cm = field.y_cm() * field.ray.scale();
    let elongation = a_cm.max(b_cm) / a_cm.min(b_cm);
    if elongation <= ELONGATED {
        return None;
    }
    let by_radius_cm = mean_radius_cm(a_cm, b_cm) / MEAN_RADIUS_OF_UNIT_SQUARE;
    let sterling_cm = sterling_side_cm(a_cm, b_cm);
    let ratio =
        scatter(field, beam, by_radius_cm).ok()? / scatter(field, beam, sterling_cm).ok()?;
    Some(SpreadTerm {
        name: "elongated field",
        percent: 100.0 * ratio.ln().abs(),
        source: format!(
            "elongation {elongation:.1}: phantom scatter for a side of {by_radius_cm:.1} cm (same mean radius) against {sterling_cm:.1} cm"
        ),
    })
}

/// Mean distance from the centre of an a x b rectangle to its edge, over all directions, cm:
/// (2/pi) [p asinh(q/p) + q asinh(p/q)] with p, q the half sides.
fn mean_radius_cm(a_cm: f64, b_cm: f64) -> f64 {
    let (p, q) = (0.5 * a_cm, 0.5 * b_cm);
    std::f64::consts::FRAC_2_PI * (p * (q / p).asinh() + q * (p / q).asinh())
}

/// A point off the field's centre: the whole field's equivalent square against the mean of
/// the four fields that have the point as centre and one corner in common with it (Day 1950).
/// An estimate, so sides outside the table are taken at its edge and the text says so.
fn off_centre_term(field: &FieldInput<'_>, beam: &BeamModel) -> Option<SpreadTerm> {
    let scale = field.ray.scale();
    let [x_cm, y_cm] = field.ray.projected_cm;
    let halves = |jaws_cm: [f64; 2], at_cm: f64| [at_cm - jaws_cm[0], jaws_cm[1] - at_cm];
    let (left_right, down_up) = (halves(field.jaws_x_cm, x_cm), halves(field.jaws_y_cm, y_cm));
    let centred =
        |[low, high]: [f64; 2]| (high - low).abs() * 0.5 * scale < tolerance::SHARED_POINT_CM;
    let inside = left_right
        .iter()
        .chain(&down_up)
        .all(|&half_cm| half_cm > 0.0);
    if !inside || (centred(left_right) && centred(down_up)) {
        return None;
    }
    let sides = beam.output_factors.sp.rows();
    let columns = beam.depth_table.columns();
    let least = sides.first()?.max(*columns.first()?);
    let greatest = sides.last()?.min(*columns.last()?);
    let mut clamped = false;
    let mut sum = 0.0;
    for half_x_cm in left_right {
        for half_y_cm in down_up {
            let side_cm = sterling_side_cm(2.0 * half_x_cm * scale, 2.0 * half_y_cm * scale);
            let within_cm = side_cm.clamp(least, greatest.max(least));
            clamped |= (within_cm - side_cm).abs() > f64::EPSILON;
            sum += scatter(field, beam, within_cm).ok()?;
        }
    }
    let whole = scatter(field, beam, field.point_square().side_cm()).ok()?;
    let note = if clamped {
        ", a side beyond the table taken at its edge"
    } else {
        ""
    };
    Some(SpreadTerm {
        name: "point off the field's centre",
        percent: 100.0 * (0.25 * sum / whole).ln().abs(),
        source: format!(
            "mean of four fields centred on the point against the whole field's equivalent square{note}"
        ),
    })
}
