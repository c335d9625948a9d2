//! The trace of a scatter integration. For a moving field each factor is a mean
//! over the meterset, weighted with the factors before it, so that their product
//! is the sum itself.

use super::depth_track::DepthAt;
use super::sum::{Standing, Sums};
use crate::beam_model::{BeamModel, OffAxisKind};
use crate::dose::text::number;
use crate::dose::{Factor, FactorName, Input, RayPoint, Trace, Tray};

/// The depth at which the off-axis ratio is taken, cm: along the ray in air, perpendicular in water.
pub(super) fn off_axis_depth_cm(
    depth: DepthAt,
    tpr_depth_cm: f64,
    beam: &BeamModel,
    ray: RayPoint,
) -> f64 {
    match (beam.off_axis.kind, depth.perpendicular_cm) {
        (OffAxisKind::InAir, Some(depth_cm)) => depth_cm / ray.cosine(),
        (OffAxisKind::InWater, Some(depth_cm)) => depth_cm,
        (_, None) => tpr_depth_cm,
    }
}

/// The trace; `scatter_weight` is the off-axis weight of the scatter.
pub(super) fn trace_of(
    sums: &Sums,
    standing: &Standing<'_>,
    scatter_weight: f64,
    tray: Option<&Tray>,
) -> Trace {
    let output = standing.model.beam.output;
    let in_phantom = sums.in_phantom.total(scatter_weight);
    let off_axis = sums.off_axis.total(scatter_weight);
    let couch = sums.couch.total(scatter_weight);
    let ratio = |a: f64, b: f64| if b == 0.0 { 0.0 } else { a / b };
    let moving = if sums.moments > 1 {
        format!(", mean over the meterset of {} moments", sums.moments)
    } else {
        String::new()
    };
    let mut factors = vec![
        Factor {
            name: FactorName::ReferenceOutput,
            value: output.dose_per_mu_cgy,
            source: format!(
                "beam model: depth {} cm, source distance {} cm, 10 cm x 10 cm",
                number(output.depth_cm),
                number(output.source_distance_cm)
            ),
        },
        Factor {
            name: FactorName::ApertureHeadScatter,
            value: ratio(sums.head, sums.inverse_square),
            source: format!(
                "Sc of the jaws {} (c = {} cm) times two-source head scatter of the aperture over that of the jaws{moving}",
                number(sums.jaw_sc),
                number(sums.jaw_side_cm)
            ),
        },
        Factor {
            name: FactorName::ApertureInPhantom,
            value: ratio(in_phantom, sums.head),
            source: format!(
                "K(d,0) * Phi_p + G * S with K(d,0) {}, Phi_p {}, S {}, G {}{moving}",
                number(sums.primary),
                number(sums.exposure.open_fluence + sums.exposure.leak_fluence),
                number(sums.exposure.open_scatter + sums.exposure.leak_scatter),
                number(scatter_weight)
            ),
        },
        Factor {
            name: FactorName::OffAxisRatio,
            value: ratio(off_axis, in_phantom),
            source: if sums.off_axis_cm == 0.0 {
                "on the axis: 1 by definition".to_owned()
            } else {
                format!(
                    "{}, at r = {} cm{moving}",
                    standing.model.beam.off_axis.grid.name(),
                    number(sums.off_axis_cm)
                )
            },
        },
    ];
    if let Some(tray) = tray {
        factors.push(Factor {
            name: FactorName::Tray,
            value: tray.transmission,
            source: format!("beam model, tray {}", tray.id),
        });
    }
    if sums.couch_share > 0.0 {
        factors.push(Factor {
            name: FactorName::Couch,
            value: ratio(couch, off_axis),
            source: format!(
                "beam model, by gantry angle: the couch is in the beam for {} % of the meterset",
                number(100.0 * sums.couch_share)
            ),
        });
    }
    factors.push(Factor {
        name: FactorName::InverseSquare,
        value: sums.inverse_square,
        source: format!(
            "({} / SPD)^2 with SPD {} cm{moving}",
            number(output.source_distance_cm),
            number(sums.spd_cm)
        ),
    });
    let symbols: Vec<&str> = factors.iter().map(|factor| factor.name.symbol()).collect();
    Trace::new(
        symbols.join(" * "),
        "scatter integration (Clarkson 1941, Cunningham 1972) with the model's tables",
        inputs(sums),
        factors,
    )
}

fn inputs(sums: &Sums) -> Vec<Input> {
    let mean = if sums.moments > 1 {
        "mean over the meterset"
    } else {
        "of the field"
    };
    let input = |name, symbol, value, unit, source: &str| Input {
        name,
        symbol,
        value,
        unit,
        source: source.to_owned(),
    };
    vec![
        input(
            "equivalent square of the jaws for head scatter",
            "c",
            sums.jaw_side_cm,
            "cm",
            mean,
        ),
        input(
            "source-point distance along the axis",
            "SPD",
            sums.spd_cm,
            "cm",
            mean,
        ),
        input(
            "off-axis radius projected to the isocentre plane",
            "r",
            sums.off_axis_cm,
            "cm",
            mean,
        ),
        input(
            "effective depth along the ray",
            "d_eff",
            sums.effective_cm,
            "cm",
            mean,
        ),
        input(
            "primary dose per unit fluence (zero field)",
            "K(d,0)",
            sums.primary,
            "",
            "zero-field end of TPR * Sp",
        ),
        input(
            "open primary fluence at the point",
            "Phi_open",
            sums.exposure.open_fluence,
            "",
            "blurred by the penumbra",
        ),
        input(
            "fluence through leaves and blocks at the point",
            "Phi_leak",
            sums.exposure.leak_fluence,
            "",
            "transmission of the beam model and of the plan's blocks",
        ),
        input(
            "scatter of the open fluence",
            "S_open",
            sums.exposure.open_scatter,
            "",
            "integral of the differential scatter kernel over the opening",
        ),
        input(
            "scatter of the transmitted fluence",
            "S_leak",
            sums.exposure.leak_scatter,
            "",
            "the same over what lets through",
        ),
    ]
}
