//! The factor formalism of AAPM TG-71 for one static photon field, from plain
//! numbers: a beam model's tables, or factors typed by hand, or both.
//!
//! Isocentric form, with S_ref the source distance of the reference point:
//!
//! ```text
//! D/MU = D'0 Sc(c) Sp(s_d) TPR(d, s_d) OAR(d, r) WF TF CF BF (S_ref / SPD)^2
//! ```
//!
//! SSD form, the same physics with a depth dose:
//!
//! ```text
//! D/MU = D'0 Sc(c) Sp(s_d0) PDD(d, s, SSD)/100 OAR WF TF CF BF (S_ref / (SSD + d0))^2
//! ```
//!
//! A radiological depth enters the TPR only; the SSD form multiplies by
//! TPR(d_eff, s_d)/TPR(d, s_d). With off-axis ratios measured in air the depth of
//! the TPR and of the OAR is the one along the ray; with ratios measured in a flat
//! water phantom the obliquity is in them already and both depths are perpendicular
//! to the surface. On the axis (radius below the position tolerance) the off-axis
//! ratio is 1 by definition. What is outside the method's range though it can be
//! multiplied is told by `limits`; what a wedge does by `wedge_factor`; which form a plan calls for by `beam`.

use super::text::number;
use super::wedge_factor::wedge_factors;
use super::{Factor, FactorError, FactorName, FieldInput, Form, Input, Trace};
use crate::beam_model::{BeamModel, JawAxis, Lookup, OffAxisKind, OutOfRange, TableKind};
use crate::quantity::{PointSquare, tolerance};

/// The dose per MU of a field with all its factors.
///
/// # Errors
/// When a table does not reach, a factor is missing, or a number makes no field.
pub fn dose_per_mu(field: &FieldInput<'_>) -> Result<Trace, FactorError> {
    field.check()?;
    let s_d = field.point_square();
    let mut inputs = geometry_inputs(field);
    let mut factors = vec![reference_factor(field)?, collimator_factor(field)?];
    match field.form {
        Form::Isocentric => {
            factors.push(phantom_factor(
                field,
                s_d.side_cm(),
                "s_d",
                "at the point's plane",
            )?);
            factors.push(tpr_factor(field, s_d)?);
        }
        Form::FixedSsd { ssd_cm } => {
            inputs.push(Input {
                name: "source-surface distance on the axis",
                symbol: "SSD",
                value: ssd_cm,
                unit: "cm",
                source: "the surface of the SSD form".to_owned(),
            });
            let reference = field.reference(FactorName::InverseSquare)?;
            let at_d0 = s_d.at_reference_depth(ssd_cm, reference.depth_cm, field.ray.spd_cm);
            inputs.push(Input {
                name: "equivalent square at the normalisation depth",
                symbol: "s_d0",
                value: at_d0.side_cm(),
                unit: "cm",
                source: format!(
                    "{} * ({} + {}) / {}",
                    number(s_d.side_cm()),
                    number(ssd_cm),
                    number(reference.depth_cm),
                    number(field.ray.spd_cm)
                ),
            });
            factors.push(phantom_factor(
                field,
                at_d0.side_cm(),
                "s_d0",
                "at the normalisation depth",
            )?);
            factors.extend(depth_dose_factors(field, s_d, ssd_cm)?);
        }
    }
    factors.push(off_axis_factor(field)?);
    factors.extend(wedge_factors(field)?);
    factors.extend(tray_factor(field));
    factors.extend(couch_factor(field));
    factors.extend(field.typed(FactorName::OtherTransmission));
    factors.push(inverse_square_factor(field)?);
    let symbols: Vec<&str> = factors.iter().map(|factor| factor.name.symbol()).collect();
    let formula_source = match field.form {
        Form::Isocentric => "AAPM TG-71, isocentric form",
        Form::FixedSsd { .. } => "AAPM TG-71, SSD form",
    };
    Ok(Trace::new(
        symbols.join(" * "),
        formula_source,
        inputs,
        factors,
    ))
}

fn geometry_inputs(field: &FieldInput<'_>) -> Vec<Input> {
    let (x_cm, y_cm) = (field.x_cm(), field.y_cm());
    let ray = field.ray;
    let exchange = field.model.map_or_else(
        || format!("2 * {0} * {1} / ({0} + {1})", number(x_cm), number(y_cm)),
        |model| {
            let (upper, lower, pair) = match model.upper_jaws {
                JawAxis::X => (x_cm, y_cm, "X"),
                JawAxis::Y => (y_cm, x_cm, "Y"),
            };
            let k = model.beam.exchange_k;
            format!(
                "(1 + {k}) * {lower} * {upper} / ({k} * {lower} + {upper}), upper jaws {pair}",
                k = number(k),
                lower = number(lower),
                upper = number(upper),
            )
        },
    );
    let mut inputs = vec![
        Input {
            name: "equivalent square of the collimator",
            symbol: "c",
            value: field.collimator_square().side_cm(),
            unit: "cm",
            source: exchange,
        },
        Input {
            name: "source-point distance along the axis",
            symbol: "SPD",
            value: ray.spd_cm,
            unit: "cm",
            source: distance_text(ray.sad_cm, ray.sad_cm - ray.spd_cm),
        },
        Input {
            name: "equivalent square at the point's plane",
            symbol: "s_d",
            value: field.point_square().side_cm(),
            unit: "cm",
            source: format!(
                "2ab/(a+b) with a = {} * {scale}, b = {} * {scale}",
                number(x_cm),
                number(y_cm),
                scale = format_args!("{}/{}", number(ray.spd_cm), number(ray.sad_cm)),
            ),
        },
        Input {
            name: "off-axis radius projected to the isocentre plane",
            symbol: "r",
            value: ray.off_axis_cm(),
            unit: "cm",
            source: format!(
                "point at x {}, y {} in the isocentre plane",
                number(ray.projected_cm[0]),
                number(ray.projected_cm[1])
            ),
        },
    ];
    if let Some(depth_cm) = field.depth.perpendicular_cm {
        inputs.push(Input {
            name: "depth perpendicular to the surface",
            symbol: "d",
            value: depth_cm,
            unit: "cm",
            source: field.depth.source.clone(),
        });
    }
    inputs.push(Input {
        name: "effective depth along the ray",
        symbol: "d_eff",
        value: field.depth.effective_cm,
        unit: "cm",
        source: format!(
            "{} (radiological where known, else geometric)",
            field.depth.source
        ),
    });
    inputs
}

fn distance_text(sad_cm: f64, nearer_cm: f64) -> String {
    let place = if nearer_cm.abs() < tolerance::POSITION_CM {
        "in the isocentre plane".to_owned()
    } else if nearer_cm > 0.0 {
        format!(
            "{} cm nearer the source than the isocentre",
            number(nearer_cm)
        )
    } else {
        format!(
            "{} cm farther from the source than the isocentre",
            number(-nearer_cm)
        )
    };
    format!("SAD {} cm, the point {place}", number(sad_cm))
}

fn reference_factor(field: &FieldInput<'_>) -> Result<Factor, FactorError> {
    let which = FactorName::ReferenceOutput;
    if let Some(factor) = field.typed(which) {
        return Ok(factor);
    }
    let reference = field.reference(which)?;
    let standing = if field.reference.is_some() {
        "typed"
    } else {
        "beam model"
    };
    Ok(Factor {
        name: which,
        value: reference.dose_per_mu_cgy,
        source: format!(
            "{standing}: depth {} cm, source distance {} cm, 10 cm x 10 cm",
            number(reference.depth_cm),
            number(reference.source_distance_cm)
        ),
    })
}

fn looked_up(
    which: FactorName,
    lookup: Result<Lookup, OutOfRange>,
    at: &str,
) -> Result<Factor, FactorError> {
    let lookup = lookup.map_err(|range| FactorError::OutOfRange { which, range })?;
    Ok(Factor {
        name: which,
        value: lookup.value,
        source: format!("{at}: {}", lookup.source()),
    })
}

fn collimator_factor(field: &FieldInput<'_>) -> Result<Factor, FactorError> {
    let which = FactorName::CollimatorScatter;
    if let Some(factor) = field.typed(which) {
        return Ok(factor);
    }
    let square = field.collimator_square();
    let at = format!("at c = {} cm", number(square.side_cm()));
    looked_up(which, field.beam(which)?.sc(square), &at)
}

fn phantom_factor(
    field: &FieldInput<'_>,
    side_cm: f64,
    symbol: &str,
    plane: &str,
) -> Result<Factor, FactorError> {
    let which = FactorName::PhantomScatter;
    if let Some(factor) = field.typed(which) {
        return Ok(factor);
    }
    // The table is one: which plane the side belongs to is the form's matter.
    let sp = field.beam(which)?.sp(PointSquare::new(side_cm));
    let at = format!("at {symbol} = {} cm {plane}", number(side_cm));
    looked_up(which, sp, &at)
}

fn tpr_factor(field: &FieldInput<'_>, s_d: PointSquare) -> Result<Factor, FactorError> {
    let which = FactorName::TissuePhantomRatio;
    if let Some(factor) = field.typed(which) {
        return Ok(factor);
    }
    let beam = field.beam(which)?;
    let depth_cm = field.tpr_depth_cm();
    let at = format!(
        "at depth {} cm, s_d = {} cm{}",
        number(depth_cm),
        number(s_d.side_cm()),
        conversion_text(beam, depth_cm, s_d)
    );
    looked_up(which, beam.tpr(depth_cm, s_d), &at)
}

/// How a TPR came from a depth dose, in numbers; empty for a TPR table.
fn conversion_text(beam: &BeamModel, depth_cm: f64, s_d: PointSquare) -> String {
    let TableKind::Pdd { ssd_cm } = beam.table_kind else {
        return String::new();
    };
    let d0_cm = beam.output.depth_cm;
    let spd_cm = ssd_cm + depth_cm;
    let surface = s_d.at_surface(ssd_cm, spd_cm);
    let at_d0 = s_d.at_reference_depth(ssd_cm, d0_cm, spd_cm);
    let parts = (
        beam.depth_table.at(depth_cm, surface.side_cm()),
        beam.sp_at_d0(at_d0),
        beam.sp(s_d),
    );
    let (Ok(pdd), Ok(sp_d0), Ok(sp_d)) = parts else {
        return String::new();
    };
    format!(
        " = PDD {} (side {} cm, SSD {} cm)/100 * ({}/{})^2 * {}/{}",
        number(pdd.value),
        number(surface.side_cm()),
        number(ssd_cm),
        number(spd_cm),
        number(ssd_cm + d0_cm),
        number(sp_d0.value),
        number(sp_d.value)
    )
}

/// PDD/100 and, where the radiological depth differs, TPR(d_eff)/TPR(d).
fn depth_dose_factors(
    field: &FieldInput<'_>,
    s_d: PointSquare,
    ssd_cm: f64,
) -> Result<Vec<Factor>, FactorError> {
    // The form fixes the point's plane: d = SPD - SSD.
    let depth_cm = field.ray.spd_cm - ssd_cm;
    let which = FactorName::PercentDepthDose;
    let pdd = match field.typed(which) {
        Some(factor) => factor,
        None => {
            let surface = s_d.at_surface(ssd_cm, field.ray.spd_cm);
            let pdd = field.beam(which)?.pdd_percent(depth_cm, surface, ssd_cm);
            let at = format!(
                "at depth {} cm, side {} cm at the surface, SSD {} cm",
                number(depth_cm),
                number(surface.side_cm()),
                number(ssd_cm)
            );
            let mut factor = looked_up(which, pdd, &at)?;
            factor.value /= 100.0;
            factor
        }
    };
    let mut factors = vec![pdd];
    let which = FactorName::EffectiveDepth;
    if let Some(factor) = field.typed(which) {
        factors.push(factor);
        return Ok(factors);
    }
    let tpr_depth_cm = field.tpr_depth_cm();
    if (tpr_depth_cm - depth_cm).abs() > tolerance::TABLE_EDGE_CM {
        let beam = field.beam(which)?;
        let out_of_range = |range| FactorError::OutOfRange { which, range };
        let effective = beam.tpr(tpr_depth_cm, s_d).map_err(out_of_range)?;
        let geometric = beam.tpr(depth_cm, s_d).map_err(out_of_range)?;
        factors.push(Factor {
            name: which,
            value: effective.value / geometric.value,
            source: format!(
                "{} at {} cm / {} at {} cm, s_d = {} cm",
                number(effective.value),
                number(tpr_depth_cm),
                number(geometric.value),
                number(depth_cm),
                number(s_d.side_cm())
            ),
        });
    }
    Ok(factors)
}

fn off_axis_factor(field: &FieldInput<'_>) -> Result<Factor, FactorError> {
    let which = FactorName::OffAxisRatio;
    if let Some(factor) = field.typed(which) {
        return Ok(factor);
    }
    let radius_cm = field.ray.off_axis_cm();
    if radius_cm < tolerance::POSITION_CM {
        return Ok(Factor {
            name: which,
            value: 1.0,
            source: "on the axis: 1 by definition".to_owned(),
        });
    }
    let beam = field.beam(which)?;
    let (depth_cm, convention) = match (beam.off_axis.kind, field.depth.perpendicular_cm) {
        (OffAxisKind::InAir, Some(depth_cm)) => (depth_cm / field.ray.cosine(), "along the ray"),
        (OffAxisKind::InWater, Some(depth_cm)) => (depth_cm, "perpendicular"),
        (_, None) => (
            field.tpr_depth_cm(),
            "effective, no geometric one being known",
        ),
    };
    let kind = match beam.off_axis.kind {
        OffAxisKind::InAir => "in air",
        OffAxisKind::InWater => "in water",
    };
    let at = format!(
        "{kind}, at r = {} cm, depth {} cm {convention}",
        number(radius_cm),
        number(depth_cm)
    );
    looked_up(which, beam.off_axis_ratio(radius_cm, depth_cm), &at)
}

fn tray_factor(field: &FieldInput<'_>) -> Option<Factor> {
    field.typed(FactorName::Tray).or_else(|| {
        let tray = field.tray.as_ref()?;
        Some(Factor {
            name: FactorName::Tray,
            value: tray.transmission,
            source: format!("beam model, tray {}", tray.id),
        })
    })
}

fn couch_factor(field: &FieldInput<'_>) -> Option<Factor> {
    field.typed(FactorName::Couch).or_else(|| {
        let arc = field.couch?;
        Some(Factor {
            name: FactorName::Couch,
            value: arc.transmission,
            source: format!(
                "beam model, couch for gantry {} to {} degrees",
                number(arc.from_deg),
                number(arc.to_deg)
            ),
        })
    })
}

fn inverse_square_factor(field: &FieldInput<'_>) -> Result<Factor, FactorError> {
    let which = FactorName::InverseSquare;
    if let Some(factor) = field.typed(which) {
        return Ok(factor);
    }
    let reference = field.reference(which)?;
    let s_ref_cm = reference.source_distance_cm;
    let (distance_cm, text) = match field.form {
        Form::Isocentric => (field.ray.spd_cm, number(field.ray.spd_cm)),
        Form::FixedSsd { ssd_cm } => (
            ssd_cm + reference.depth_cm,
            format!("({} + {})", number(ssd_cm), number(reference.depth_cm)),
        ),
    };
    Ok(Factor {
        name: which,
        value: (s_ref_cm / distance_cm).powi(2),
        source: format!("({} / {text})^2", number(s_ref_cm)),
    })
}
