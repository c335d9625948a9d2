//! The trace of a scatter integration. For a moving field each factor is a mean
//! over the meterset, weighted with the factors before it, so that their product
//! is the sum itself.

use super::depth_track::DepthAt;
use super::standing::Standing;
use super::sum::Sums;
use crate::beam_model::{BeamModel, JawAxis, OffAxisKind, Penumbra};
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

/// The trace; `scatter_weight` is the off-axis weight of the scatter, `equivalent_side_cm` the side of the
/// square with as much scatter per primary.
pub(super) fn trace_of(
    sums: &Sums,
    standing: &Standing<'_>,
    (scatter_weight, equivalent_side_cm): (f64, f64),
    tray: Option<&Tray>,
) -> Trace {
    let output = standing.model.beam.output;
    let in_phantom = sums.in_phantom.total(scatter_weight);
    let off_axis = sums.off_axis.total(scatter_weight);
    let wedged = sums.wedge.total(scatter_weight);
    let couch = sums.couch.total(scatter_weight);
    let ratio = |a: f64, b: f64| if b == 0.0 { 0.0 } else { a / b };
    let several = sums.moments > 1;
    let mean = if several {
        format!("; mean over the meterset of {} moments", sums.moments)
    } else {
        String::new()
    };
    // The factor is a weighted mean of products; the numbers beside it are means of their own.
    let means = if several {
        format!(
            "; the factor is the mean of {} moments weighted with the meterset and the factors before it, the numbers here are plain means",
            sums.moments
        )
    } else {
        String::new()
    };
    let head_scatter = ratio(sums.head, sums.inverse_square);
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
            value: head_scatter,
            source: format!(
                "{} * {}: Sc of the jaws (c = {} cm, {}) times the two-source head scatter of the aperture over that of the jaws{means}",
                number(sums.jaw_sc),
                number(ratio(head_scatter, sums.jaw_sc)),
                number(sums.jaw_side_cm),
                standing.model.beam.output_factors.sc.name()
            ),
        },
        Factor {
            name: FactorName::ApertureInPhantom,
            value: ratio(in_phantom, sums.head),
            source: format!(
                "K(d,0) * (Phi_open + Phi_leak) + {}(S_open + S_leak) = {} * {} + {}{}{means}",
                if scatter_weight == 1.0 { "" } else { "G * " },
                number(sums.primary),
                number(sums.exposure.open_fluence + sums.exposure.leak_fluence),
                if scatter_weight == 1.0 {
                    String::new()
                } else {
                    format!("{} * ", number(scatter_weight))
                },
                number(sums.exposure.open_scatter + sums.exposure.leak_scatter)
            ),
        },
        Factor {
            name: FactorName::OffAxisRatio,
            value: ratio(off_axis, in_phantom),
            source: if sums.off_axis_cm == 0.0 {
                "on the axis: 1 by definition".to_owned()
            } else {
                format!(
                    "{}, at r = {} cm{mean}",
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
    if sums.wedge_share > 0.0
        && let Some((wedge, _)) = &standing.wedge
    {
        factors.push(Factor {
            name: FactorName::Wedge,
            value: ratio(wedged, off_axis),
            source: format!(
                "beam model, wedge {} at {} degrees: factor on the axis for the square s times the profile at the point, in for {} % of the meterset{means}",
                wedge.id(),
                number(wedge.orientation_deg()),
                number(100.0 * sums.wedge_share)
            ),
        });
    }
    if sums.couch_share > 0.0 {
        factors.push(Factor {
            name: FactorName::Couch,
            value: ratio(couch, wedged),
            source: format!(
                "beam model, by gantry angle: the couch is in the beam for {:.1} % of the meterset",
                100.0 * sums.couch_share
            ),
        });
    }
    factors.push(Factor {
        name: FactorName::InverseSquare,
        value: sums.inverse_square,
        source: format!(
            "({} / {})^2: S_ref over SPD{mean}",
            number(output.source_distance_cm),
            number(sums.spd_cm)
        ),
    });
    let symbols: Vec<&str> = factors.iter().map(|factor| factor.name.symbol()).collect();
    Trace::new(
        symbols.join(" * "),
        "scatter integration (Clarkson 1941, Cunningham 1972) with the model's tables",
        inputs(sums, standing, equivalent_side_cm),
        factors,
    )
}

/// The jaws' own square, in the words of its formula.
fn jaw_square(sums: &Sums, standing: &Standing<'_>) -> String {
    let model = standing.model;
    let (upper, lower) = match model.upper_jaws {
        JawAxis::X => ("x", "y"),
        JawAxis::Y => ("y", "x"),
    };
    let formula = format!(
        "(1 + k) L U / (k L + U) of the jaws, U {upper} and L {lower}, k {}",
        number(model.beam.exchange_k)
    );
    if sums.moments > 1 {
        return format!("{formula}; mean over the meterset");
    }
    let [x_cm, y_cm] = sums.opening.jaws_cm.map(|jaw| jaw[1] - jaw[0]);
    format!("{formula}, x {} cm, y {} cm", number(x_cm), number(y_cm))
}

fn inputs(sums: &Sums, standing: &Standing<'_>, equivalent_side_cm: f64) -> Vec<Input> {
    let of_field = |what: &str| {
        if sums.moments > 1 {
            format!("{what}, mean over the meterset")
        } else {
            what.to_owned()
        }
    };
    let input = |name, symbol, value, unit, source: String| Input {
        name,
        symbol,
        value,
        unit,
        source,
    };
    let exposure = &sums.exposure;
    vec![
        input(
            "equivalent square of the jaws for head scatter",
            "c",
            sums.jaw_side_cm,
            "cm",
            jaw_square(sums, standing),
        ),
        input(
            "source-point distance along the axis",
            "SPD",
            sums.spd_cm,
            "cm",
            of_field("from the place of the point below the source"),
        ),
        input(
            "off-axis radius projected to the isocentre plane",
            "r",
            sums.off_axis_cm,
            "cm",
            of_field("from the place of the point below the source"),
        ),
        input(
            "effective depth along the ray",
            "d_eff",
            sums.effective_cm,
            "cm",
            of_field("from the depth used, see below"),
        ),
        input(
            "dose by the primary alone, per unit in-air fluence",
            "K(d,0)",
            sums.primary,
            "",
            of_field("TPR * Sp of the squares carried on to zero field, drawn by counterfoil model show"),
        ),
        input(
            "in-air fluence at the point through the opening",
            "Phi_open",
            exposure.open_fluence,
            "",
            of_field(&format!(
                "1 in the open; edges blurred by {}",
                penumbra_text(&standing.penumbra)
            )),
        ),
        input(
            "in-air fluence at the point through leaves and blocks",
            "Phi_leak",
            exposure.leak_fluence,
            "",
            of_field("transmission of the model's leaves and of the plan's blocks"),
        ),
        input(
            "phantom scatter of the open fluence",
            "S_open",
            exposure.open_scatter,
            "",
            of_field("integral of the differential scatter kernel over the opening, in the plane of the point"),
        ),
        input(
            "phantom scatter of the transmitted fluence",
            "S_leak",
            exposure.leak_scatter,
            "",
            of_field("the same over what leaves and blocks let through"),
        ),
        input(
            "square with as much scatter per primary",
            "s",
            equivalent_side_cm,
            "cm",
            "in the plane of the point: TPR(d_eff, s) * Sp(s) times the fluence at the point is about F(A)"
                .to_owned(),
        ),
    ]
}

/// The penumbra in words.
fn penumbra_text(penumbra: &Penumbra) -> String {
    let main = number(penumbra.sigma_cm);
    if penumbra.tail_share == 0.0 {
        return format!("a Gaussian of sigma {main} cm");
    }
    format!(
        "two Gaussians, {} of sigma {main} cm and {} of sigma {} cm",
        number(1.0 - penumbra.tail_share),
        number(penumbra.tail_share),
        number(penumbra.tail_sigma_cm)
    )
}
