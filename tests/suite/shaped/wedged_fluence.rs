//! The factor formalism's product of wedge factor and fluence profile against
//! the published kernel integrated over the wedged fluence itself: how far off the
//! product is, and that the expected spread and the method's limit cover it.

use counterfoil::beam_model::{
    DepthInterpolation, Grid, MachineModel, WedgeBody, WedgeModel, WedgeTables,
};
use counterfoil::dose::{StepLimits, Technique};
use counterfoil::plan::{Plan, Wedge, WedgeKind, WedgePosition};
use counterfoil::quantity::{Given, Point};

use super::field::calculate;
use super::kernel_model::{Spoilt, kernel, kernel_machine};
use super::quantiles;
use super::reference::kernel_dose;
use crate::dose::plain_plan;

/// Gradients of the logarithm of fluence of 15, 30 and 60 degrees at 6 MV, per cm: tan(angle) times the fall of dose with depth
/// about 10 cm deep, 5.5 % per cm.
const PER_CM: [f64; 3] = [0.015, 0.032, 0.096];

/// Kernel dose at a place of a square field whose fluence is exp(g y), by strips of 0.05 cm.
fn exact(side_cm: f64, per_cm: f64, y_cm: f64, depth_cm: f64) -> f64 {
    let kernel = kernel();
    let half_cm = side_cm / 2.0;
    let strips = (side_cm / 0.05).round() as u32;
    (0..strips)
        .map(|strip| {
            let low_cm = f64::from(strip) * 0.05 - half_cm;
            let place = ([-half_cm, half_cm], [low_cm - y_cm, low_cm + 0.05 - y_cm]);
            (per_cm * (low_cm + 0.025)).exp() * kernel_dose(&kernel, &[place], depth_cm)
        })
        .sum()
}

/// The kernel's machine with a wedge as a clinic would measure it: the factor is dose with the wedge over dose without it on the
/// axis of this field, the profile is the fluence.
fn wedged_machine(side_cm: f64, per_cm: f64, depth_cm: f64) -> MachineModel {
    let mut machine = kernel_machine(Spoilt::No);
    let factor = 0.4 * exact(side_cm, per_cm, 0.0, depth_cm) / exact(side_cm, 0.0, 0.0, depth_cm);
    let positions_cm: Vec<f64> = (-60..=60).map(|step| f64::from(step) * 0.25).collect();
    let ratios = positions_cm
        .iter()
        .map(|position_cm| (per_cm * position_cm).exp());
    let ratios: Vec<f64> = ratios.collect();
    machine.beams[0].wedges = vec![WedgeModel {
        id: "W".to_owned(),
        further_ids: Vec::new(),
        angle_deg: 60.0,
        body: WedgeBody::Fixed(WedgeTables {
            factor: Grid::new(
                "6/wedge-W.csv",
                ("depth_cm", vec![0.0, 40.0]),
                ("factor", vec![0.0]),
                vec![factor, factor],
                DepthInterpolation::Linear,
            )
            .unwrap(),
            profile: Grid::new(
                "6/wedge-W-profile.csv",
                ("position_cm", positions_cm),
                ("ratio", vec![0.0]),
                ratios,
                DepthInterpolation::Linear,
            )
            .unwrap(),
        }),
    }];
    machine
}

fn plan(side_cm: f64, y_cm: f64, depth_cm: f64, is_in: bool) -> Plan {
    let mut plan = plain_plan();
    let half_cm = side_cm / 2.0;
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0, -2.0, 30.0 + y_cm));
    let beam = &mut plan.beams[0];
    beam.machine = Given::stated("KERNEL".to_owned());
    beam.wedges = vec![Wedge {
        number: Given::stated(1),
        kind: Given::stated(WedgeKind::Standard),
        id: Given::stated("W".to_owned()),
        angle_deg: Given::stated(60.0),
        orientation_deg: Given::stated(0.0),
        ..Wedge::default()
    }];
    for point in &mut beam.control_points {
        point.jaws_x_cm = Given::stated([-half_cm, half_cm]);
        point.jaws_y_cm = Given::stated([-half_cm, half_cm]);
        // The depth along the ray is what the kernel is asked at.
        point.ssd_cm = Given::stated(100.0 - depth_cm * 100.0 / 100.0_f64.hypot(y_cm));
        point.wedges = vec![WedgePosition {
            wedge_number: Given::stated(1),
            in_beam: Given::stated(is_in),
        }];
    }
    plan
}

#[test]
fn validate_the_product_of_factor_and_profile_against_the_wedged_kernel() {
    let mut judged = Vec::new();
    let mut refused = 0;
    let mut shares = Vec::new();
    for per_cm in PER_CM {
        for side_cm in [10.0, 15.0, 20.0] {
            for depth_cm in [5.0, 10.0, 20.0] {
                let machine = wedged_machine(side_cm, per_cm, depth_cm);
                for share in [-0.75, -0.5, -0.25, 0.0, 0.25, 0.5, 0.75] {
                    let y_cm = share * side_cm / 2.0;
                    let of = |is_in| {
                        let plan = plan(side_cm, y_cm, depth_cm, is_in);
                        calculate(&plan, &machine, StepLimits::default())
                    };
                    let (wedged, open) = (of(true), of(false));
                    assert_eq!(wedged.technique, Technique::Wedge);
                    let dose = |result: &counterfoil::dose::BeamCalculation| {
                        result.trace.as_ref().unwrap().dose_per_mu_cgy
                    };
                    let found = dose(&wedged) / dose(&open);
                    let expected = 0.4 * exact(side_cm, per_cm, y_cm, depth_cm)
                        / exact(side_cm, 0.0, y_cm, depth_cm);
                    let percent = 100.0 * (found / expected - 1.0);
                    let spread = wedged.spread.as_ref().unwrap();
                    let term = spread
                        .terms
                        .iter()
                        .find(|term| term.name == "wedge profile");
                    let term_percent = term.map_or(0.0, |term| term.percent);
                    if share.abs() > 0.0 {
                        shares.push(percent.abs() / term_percent);
                    }
                    if wedged.obstacles.is_empty() {
                        judged.push(percent);
                    } else {
                        refused += 1;
                    }
                }
            }
        }
    }
    let found = quantiles(&judged);
    let mean_share = shares.iter().sum::<f64>() / shares.len() as f64;
    let greatest_share = shares.iter().copied().fold(0.0, f64::max);
    println!("product beside the wedged kernel, per cent: {found:?}; {refused} refused");
    println!(
        "difference over the spread's term: mean {mean_share:.2}, greatest {greatest_share:.2}"
    );
    // What is judged stays within the limit and a fifth; what is refused is little.
    assert!(
        found.median <= 0.6 && found.p99 <= 3.6 && found.maximum <= 3.6,
        "{found:?}"
    );
    assert!(refused > 0 && refused < judged.len() / 4, "{refused}");
    // The term covers the difference, with a fifth to spare, and is not idle.
    assert!(greatest_share <= 1.2, "{greatest_share}");
    assert!((0.6..=1.1).contains(&mean_share), "{mean_share}");
}
