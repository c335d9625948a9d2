//! The factor formalism of AAPM TG-71 for one static photon field, from plain
//! numbers: a beam model's tables, or factors typed by hand, or both.
//!
//! Isocentric form, with S_ref the source distance of the reference point:
//!
//!     D/MU = D'0 Sc(c) Sp(s_d) TPR(d, s_d) OAR(d, r) WF TF CF BF (S_ref / SPD)^2
//!
//! SSD form, the same physics with a depth dose:
//!
//!     D/MU = D'0 Sc(c) Sp(s_d0) PDD(d, s, SSD)/100 OAR WF TF CF BF (S_ref / (SSD + d0))^2
//!
//! A radiological depth enters the TPR only; the SSD form multiplies by
//! TPR(d_eff, s_d)/TPR(d, s_d). With off-axis ratios measured in air the depth of
//! the TPR and of the OAR is the one along the ray; with ratios measured in a flat
//! water phantom the obliquity is in them already and both depths are perpendicular
//! to the surface. On the axis (radius below the position tolerance) the off-axis
//! ratio is 1 by definition. What is outside the method's range though it can be
//! multiplied is told by `limits`; which form a plan calls for by `beam`.

use thiserror::Error;

use super::aperture::{collimator_square, point_square};
use super::text::number;
use super::{Factor, FactorName, Input, RayPoint, Trace};
use crate::beam_model::{
    BeamModel, CouchArc, JawAxis, Lookup, OffAxisKind, OutOfRange, ReferenceOutput, TableKind,
};
use crate::quantity::{CollimatorSquare, PointSquare, tolerance};

/// A beam model with what the collimator exchange needs to know of its machine.
#[derive(Clone, Copy, Debug)]
pub struct FieldModel<'a> {
    /// The beam's tables.
    pub beam: &'a BeamModel,
    /// Which jaw pair is nearer the source.
    pub upper_jaws: JawAxis,
}

/// Which form of the formalism.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Form {
    /// TPR and the point's own distance.
    Isocentric,
    /// Depth dose for a surface at this distance on the axis; the point's plane is at SSD + d = SPD.
    FixedSsd {
        /// SSD on the axis, cm, above 0.
        ssd_cm: f64,
    },
}

/// Depth of the point.
#[derive(Clone, Debug, PartialEq)]
pub struct FieldDepth {
    /// Geometric, perpendicular to a flat surface, cm; `None` when only a radiological depth is known.
    pub perpendicular_cm: Option<f64>,
    /// Radiological, along the ray, cm; equals the geometric one along the ray when nothing else is known.
    pub effective_cm: f64,
    /// On what it stands, for the trace.
    pub source: String,
}

/// A tray in the beam.
#[derive(Clone, Debug, PartialEq)]
pub struct Tray {
    /// Its ID.
    pub id: String,
    /// Its transmission, a share.
    pub transmission: f64,
}

/// A factor given by hand instead of taken from a model.
#[derive(Clone, Debug, PartialEq)]
pub struct Typed {
    /// The value: a ratio; cGy/MU for D'0; a share of 1 (not per cent) for the depth dose.
    pub value: f64,
    /// Where it comes from, for the trace.
    pub source: String,
}

impl Typed {
    /// A value whose source is "typed".
    #[must_use]
    pub fn new(value: f64) -> Self {
        Self {
            value,
            source: "typed".to_owned(),
        }
    }
}

/// One field, complete. Positions are in the collimator system at the isocentre plane.
#[derive(Clone, Debug)]
pub struct FieldInput<'a> {
    /// The tables; `None` when every factor is typed.
    pub model: Option<FieldModel<'a>>,
    /// X jaws, cm.
    pub jaws_x_cm: [f64; 2],
    /// Y jaws, cm.
    pub jaws_y_cm: [f64; 2],
    /// The point on its ray.
    pub ray: RayPoint,
    /// The point's depth.
    pub depth: FieldDepth,
    /// Form.
    pub form: Form,
    /// Tray in the beam.
    pub tray: Option<Tray>,
    /// Couch in the beam.
    pub couch: Option<CouchArc>,
    /// D'0, d0 and `S_ref` typed instead of the model's.
    pub reference: Option<ReferenceOutput>,
    /// Factors typed instead of the model's, and wedge or further transmission, which only come typed.
    pub typed: Vec<(FactorName, Typed)>,
}

/// Why a dose per MU could not be calculated.
#[derive(Clone, Debug, Error, PartialEq)]
pub enum FactorError {
    /// A table does not reach that far.
    #[error("{}: {range}", .which.title())]
    OutOfRange {
        /// The factor that was looked up.
        which: FactorName,
        /// The range.
        range: OutOfRange,
    },
    /// Neither a model nor a typed value gives a factor.
    #[error("{} ({}) is neither typed nor given by a beam model", .which.title(), .which.symbol())]
    MissingFactor {
        /// The factor.
        which: FactorName,
    },
    /// A number with which no field can be calculated.
    #[error("{name} is {value}, which makes no field")]
    Unusable {
        /// What.
        name: &'static str,
        /// Its value.
        value: f64,
    },
}

impl FieldInput<'_> {
    /// Opening along x at the isocentre plane, cm.
    #[must_use]
    pub fn x_cm(&self) -> f64 {
        self.jaws_x_cm[1] - self.jaws_x_cm[0]
    }

    /// Opening along y at the isocentre plane, cm.
    #[must_use]
    pub fn y_cm(&self) -> f64 {
        self.jaws_y_cm[1] - self.jaws_y_cm[0]
    }

    /// Equivalent square for phantom scatter at the point's plane.
    #[must_use]
    pub fn point_square(&self) -> PointSquare {
        point_square(self.x_cm(), self.y_cm(), self.ray)
    }

    /// Equivalent square for collimator scatter; without a model both jaw pairs count alike.
    #[must_use]
    pub fn collimator_square(&self) -> CollimatorSquare {
        let (upper, k) = self.model.map_or((JawAxis::Y, 1.0), |model| {
            (model.upper_jaws, model.beam.exchange_k)
        });
        collimator_square(self.x_cm(), self.y_cm(), upper, k)
    }

    /// The depth that the TPR is taken at, cm.
    #[must_use]
    pub fn tpr_depth_cm(&self) -> f64 {
        match self.model.map(|model| model.beam.off_axis.kind) {
            Some(OffAxisKind::InWater) => self.depth.effective_cm * self.ray.cosine(),
            Some(OffAxisKind::InAir) | None => self.depth.effective_cm,
        }
    }

    fn typed(&self, which: FactorName) -> Option<Factor> {
        let (_, typed) = self.typed.iter().find(|(name, _)| *name == which)?;
        Some(Factor {
            name: which,
            value: typed.value,
            source: typed.source.clone(),
        })
    }

    fn beam(&self, which: FactorName) -> Result<&BeamModel, FactorError> {
        let model = self.model.ok_or(FactorError::MissingFactor { which })?;
        Ok(model.beam)
    }

    fn reference(&self, which: FactorName) -> Result<ReferenceOutput, FactorError> {
        match self.reference {
            Some(reference) => Ok(reference),
            None => Ok(self.beam(which)?.output),
        }
    }

    fn check(&self) -> Result<(), FactorError> {
        let mut positive = vec![
            ("the opening along x, cm,", self.x_cm()),
            ("the opening along y, cm,", self.y_cm()),
            ("the source-point distance, cm,", self.ray.spd_cm),
            ("the source-axis distance, cm,", self.ray.sad_cm),
        ];
        if let Form::FixedSsd { ssd_cm } = self.form {
            positive.push(("the SSD, cm,", ssd_cm));
        }
        let depths = [
            Some(("the effective depth, cm,", self.depth.effective_cm)),
            self.depth
                .perpendicular_cm
                .map(|depth_cm| ("the depth, cm,", depth_cm)),
        ];
        let not_positive = positive
            .into_iter()
            .find(|(_, value)| !(value.is_finite() && *value > 0.0));
        let negative = depths
            .into_iter()
            .flatten()
            .find(|(_, value)| !(value.is_finite() && *value >= 0.0));
        if let (Form::FixedSsd { ssd_cm }, Some(depth_cm)) =
            (self.form, self.depth.perpendicular_cm)
            && (self.ray.spd_cm - ssd_cm - depth_cm).abs() > tolerance::POSITION_CM
        {
            return Err(FactorError::Unusable {
                name: "SPD - SSD - d, cm, which must be 0,",
                value: self.ray.spd_cm - ssd_cm - depth_cm,
            });
        }
        match not_positive.or(negative) {
            Some((name, value)) => Err(FactorError::Unusable { name, value }),
            None => Ok(()),
        }
    }
}

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
    factors.extend(field.typed(FactorName::Wedge));
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
            source: format!(
                "SAD {} cm, the point {} cm nearer the source than the isocentre",
                number(ray.sad_cm),
                number(ray.sad_cm - ray.spd_cm)
            ),
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
