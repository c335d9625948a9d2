//! Finer steps change nothing: moving leaves and jaws, a turning gantry, blocks
//! cut into strips. And a jaw that sweeps as an ideal dynamic wedge does, against the
//! kernel weighted with the exponential fluence itself.

use std::sync::Arc;

use counterfoil::beam_model::MachineModel;
use counterfoil::dose::{StepLimits, Technique};
use counterfoil::plan::{Block, BlockType, ControlPoint, DeviceKind, LeafPositions, Plan};
use counterfoil::quantity::{Given, Point};

use super::field::{Aperture, Field, calculate, cgy_per_mu};
use super::kernel_model::{Spoilt, kernel, kernel_machine};
use super::random::Random;
use super::reference::kernel_dose;
use crate::dose::plain_plan;

fn halved() -> StepLimits {
    let whole = StepLimits::default();
    StepLimits {
        leaf_cm: whole.leaf_cm / 2.0,
        aperture_cm: whole.aperture_cm / 2.0,
        gantry_deg: whole.gantry_deg / 2.0,
        strip_cm: whole.strip_cm / 2.0,
    }
}

/// Change of the dose, per cent, when every step is halved.
fn change_percent(plan: &Plan, machine: &MachineModel, technique: Technique) -> f64 {
    let whole = calculate(plan, machine, StepLimits::default());
    assert_eq!(whole.technique, technique);
    let half = calculate(plan, machine, halved());
    100.0 * (cgy_per_mu(&half) / cgy_per_mu(&whole) - 1.0)
}

fn leaves(point: &mut ControlPoint, positions_cm: Vec<f64>) {
    point.leaves = vec![LeafPositions {
        kind: DeviceKind::Mlcx { layer: 0 },
        positions_cm: Given::stated(Arc::from(positions_cm)),
    }];
}

/// A window that slides over the point, its ends at places of their own for every pair.
fn sliding(random: &mut Random) -> Plan {
    let field = Field {
        class: "sliding",
        apertures: vec![Aperture::closed(1.0).open([-5.0, 5.0], [-6.0, 6.0])],
        point_cm: [random.between(-2.0, 2.0), random.between(-2.0, 2.0)],
        spd_cm: 100.0,
        depth_cm: random.between(4.0, 20.0),
    };
    let mut plan = field.plan();
    let beam = &mut plan.beams[0];
    let first = beam.control_points[0].clone();
    let count = random.whole(4, 9);
    beam.control_points = (0..=count)
        .map(|index| {
            let share = index as f64 / count as f64;
            let mut point = first.clone();
            point.cumulative_weight = Given::stated(share);
            let mut lower = Vec::new();
            let mut upper = Vec::new();
            for pair in 0..80 {
                let low_cm = f64::from(pair) * 0.5 - 20.0;
                if (-6.0..6.0).contains(&low_cm) {
                    let start = -6.0 + 9.0 * share + random.between(-0.4, 0.4);
                    lower.push(start);
                    upper.push(start + random.between(1.0, 3.0));
                } else {
                    lower.push(-19.0);
                    upper.push(-19.0);
                }
            }
            leaves(&mut point, lower.into_iter().chain(upper).collect());
            point
        })
        .collect();
    beam.final_cumulative_weight = Given::stated(1.0);
    plan
}

/// The same leaves while the gantry turns, the SSD stated at every control point as on a cylinder of 15 cm whose
/// middle lies 3 cm from the isocentre.
fn arc(random: &mut Random) -> Plan {
    let mut plan = sliding(random);
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0, -2.0, 30.0));
    let beam = &mut plan.beams[0];
    let count = beam.control_points.len() - 1;
    for (index, point) in beam.control_points.iter_mut().enumerate() {
        let gantry_deg = 40.0 * index as f64 / count as f64 + 330.0;
        let to_middle_cm = 3.0 * gantry_deg.to_radians().cos();
        let across_cm = 3.0 * gantry_deg.to_radians().sin();
        let depth_cm = to_middle_cm + (15.0_f64.powi(2) - across_cm.powi(2)).sqrt();
        point.gantry_deg = Given::stated(gantry_deg.rem_euclid(360.0));
        point.gantry_direction =
            Given::stated(if index == count { "NONE" } else { "CW" }.to_owned());
        point.ssd_cm = Given::stated(100.0 - depth_cm);
    }
    plan
}

fn blocked(random: &mut Random) -> Plan {
    let mut plan = plain_plan();
    let beam = &mut plan.beams[0];
    for point in &mut beam.control_points {
        point.jaws_x_cm = Given::stated([-8.0, 8.0]);
        point.jaws_y_cm = Given::stated([-8.0, 8.0]);
    }
    let mut corner = |sign_x: f64, sign_y: f64| {
        [
            sign_x * random.between(2.0, 7.0),
            sign_y * random.between(2.0, 7.0),
        ]
    };
    let outline = [
        corner(1.0, 1.0),
        corner(-1.0, 1.0),
        corner(-1.0, -1.0),
        corner(1.0, -1.0),
    ];
    beam.blocks = vec![Block {
        number: Given::stated(1),
        name: Given::stated("Cut-out".to_owned()),
        block_type: Given::stated(BlockType::Aperture),
        transmission: Given::stated(0.04),
        outline_cm: Given::stated(Arc::from(outline)),
        ..Block::default()
    }];
    plan
}

/// Makes a plan.
type Maker = fn(&mut Random) -> Plan;

#[test]
fn validate_halving_every_step_changes_nothing() {
    let machine = kernel_machine(Spoilt::No);
    let mut random = Random::new(7);
    let makers: [(&str, Technique, Maker); 3] = [
        ("sliding window", Technique::Dynamic, sliding),
        ("arc", Technique::Arc, arc),
        ("block", Technique::Blocked, blocked),
    ];
    for (name, technique, maker) in makers {
        let changes: Vec<f64> = (0..40)
            .map(|_| change_percent(&maker(&mut random), &machine, technique).abs())
            .collect();
        let greatest = changes.iter().copied().fold(0.0, f64::max);
        println!("{name}: greatest change {greatest:.4} %");
        assert!(greatest <= 0.05, "{name} {greatest}");
    }
}

/// A jaw closes from +8 to -8 cm so that a place y stays open for exp(m (y - 8)) of the meterset: the ideal fluence of a
/// wedge whose thin end... is where the jaw stays longest, towards +y being the last covered when the jaw comes from
/// -y. Here the lower jaw moves up: a place is covered when it passes. The reference is the published kernel, integrated
/// over strips of 0.05 cm weighted with that fluence.
#[test]
fn validate_a_sweeping_jaw_against_an_exponential_fluence() {
    let machine = kernel_machine(Spoilt::No);
    let kernel = kernel();
    for per_cm in [0.03, 0.06, 0.1] {
        for (point_y_cm, depth_cm) in [(0.0, 10.0), (-4.0, 5.0), (4.0, 15.0)] {
            // Open until the jaw passes: the share of the meterset when the jaw stands at y is the fluence at y.
            let fluence = |y_cm: f64| (per_cm * (y_cm - 8.0)).exp();
            let mut plan = plain_plan();
            plan.fraction_groups[0].beams[0].specification_point =
                Given::stated(Point::new(1.0, -2.0, 30.0 + point_y_cm));
            let beam = &mut plan.beams[0];
            beam.machine = Given::stated("KERNEL".to_owned());
            let first = beam.control_points[0].clone();
            let slant = 100.0_f64.hypot(point_y_cm) / 100.0;
            let at = |jaw_cm: f64, weight: f64| ControlPoint {
                cumulative_weight: Given::stated(weight),
                jaws_x_cm: Given::stated([-8.0, 8.0]),
                jaws_y_cm: Given::stated([jaw_cm, 8.0]),
                ssd_cm: Given::stated(100.0 - depth_cm / slant),
                ..first.clone()
            };
            // What is never covered but by the edge of the field: the whole field is open first.
            beam.control_points = vec![at(-8.0, 0.0)];
            let mut jaw_cm = -8.0;
            while jaw_cm <= 7.0 {
                beam.control_points.push(at(jaw_cm, fluence(jaw_cm)));
                jaw_cm += 0.25;
            }
            beam.final_cumulative_weight = Given::stated(fluence(7.0));
            // The last stretch is not delivered: places above 7 cm stay open to the end.
            let open = |y_cm: f64| fluence(y_cm.min(7.0)) / fluence(7.0);
            let mut exact = 0.0;
            let mut y_cm = -8.0;
            while y_cm < 8.0 - 1e-9 {
                let strip = ([-8.0, 8.0], [y_cm - point_y_cm, y_cm + 0.05 - point_y_cm]);
                exact += open(y_cm + 0.025) * kernel_dose(&kernel, &[strip], depth_cm);
                y_cm += 0.05;
            }
            let expected = 0.8 * exact / kernel.square_dose(10.0, 10.0);
            let calculation = calculate(&plan, &machine, StepLimits::default());
            assert_eq!(calculation.technique, Technique::Dynamic);
            let percent = 100.0 * (cgy_per_mu(&calculation) / expected - 1.0);
            println!("{per_cm} per cm, y {point_y_cm} cm, depth {depth_cm} cm: {percent:+.3} %");
            assert!(percent.abs() <= 0.3, "{per_cm} {point_y_cm} {percent}");
        }
    }
}
