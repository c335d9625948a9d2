//! Rules around fields that leaves and blocks shape: when they are static,
//! what a model must state, where the point may lie, and that openings compose as they must.

use std::sync::Arc;

use counterfoil::beam_model::{JawAxis, MachineModel};
use counterfoil::dose::{BeamCalculation, FactorName, Method, ObstacleKind, Technique};
use counterfoil::plan::{Block, BlockType, DeviceKind, LeafAxis, Plan};
use counterfoil::quantity::{Given, Point};

use super::shaped_model::{
    LEAF_END_CM, MLCX, TRANSMISSION, bank, fit_head, put_leaves, shaped_machine, tips,
};
use super::{assert_close, calculate_with, kinds, plan_with, tg71, verified_cgy_per_mu};

fn with_leaves(positions_cm: &[f64]) -> Plan {
    plan_with(|plan| put_leaves(plan, MLCX, positions_cm))
}

fn shaped(plan: &Plan) -> BeamCalculation {
    calculate_with(plan, &shaped_machine())
}

/// An input of the trace by its symbol.
fn input(result: &BeamCalculation, symbol: &str) -> f64 {
    let trace = result.trace.as_ref().unwrap();
    trace.input(symbol).unwrap().value
}

/// 10 x 10 with leaves at 6 cm: the jaws alone shape it, 0.8 cGy/MU by definition, and no bank is asked for.
#[test]
fn verify_parked_leaves_leave_a_static_field() {
    let plan = with_leaves(&tips(|_| [-6.0, 6.0]));
    for machine in [shaped_machine(), tg71("tg71-tpr")] {
        let result = calculate_with(&plan, &machine);
        assert_close(verified_cgy_per_mu(&result), 0.8, 1e-12);
        assert_eq!(result.technique, Technique::Static);
        assert_eq!(result.method, Some(Method::Factors));
        assert_eq!(result.shaped, None);
    }
}

/// Leaves a hair inside the jaws: integrated, and nearly the same 0.8. A side shorter by 0.2 cm of 10 takes
/// 0.1 cm off the equivalent square; Sp falls by 0.013 per cm there, so 0.13 % at most.
#[test]
fn verify_leaves_at_the_jaws_nearly_give_the_open_field() {
    let result = shaped(&with_leaves(&tips(|_| [-4.8, 4.8])));
    assert_eq!(result.technique, Technique::Mlc);
    assert_eq!(result.method, Some(Method::ScatterIntegration));
    let cgy_per_mu = verified_cgy_per_mu(&result);
    assert!(
        cgy_per_mu < 0.8 && cgy_per_mu > 0.8 * (1.0 - 0.004),
        "{cgy_per_mu}"
    );
    let shares = result.shaped.unwrap().shares;
    let whole =
        shares.open_primary_percent + shares.open_scatter_percent + shares.transmission_percent;
    assert_close(whole, 100.0, 1e-9);
}

/// The model obstacle of a plan with a machine that lacks something; there is never a number beside it.
fn refusal(plan: &Plan, change: impl FnOnce(&mut MachineModel)) -> String {
    let mut machine = shaped_machine();
    change(&mut machine);
    let result = calculate_with(plan, &machine);
    assert_eq!(
        kinds(&result),
        [ObstacleKind::Model],
        "{:?}",
        result.obstacles
    );
    assert_eq!((result.trace, result.method), (None, None));
    result.obstacles[0].message.clone()
}

#[test]
fn verify_what_a_model_must_state_is_named() {
    let plan = with_leaves(&tips(|_| [-4.0, 4.0]));
    let jaw = |axis: JawAxis| {
        move |machine: &mut MachineModel| {
            let jaws = &mut machine.collimation.jaws;
            let pair = jaws.iter_mut().find(|jaw| jaw.moves_along == axis);
            pair.unwrap().source_distance_cm = None;
            fit_head(machine);
        }
    };
    for (message, wanted) in [
        (
            refusal(&plan, |machine| machine.beams[0].penumbra = None),
            "penumbra_sigma_cm",
        ),
        (
            refusal(&plan, |machine| {
                machine.beams[0].extra_focal_distance_cm = None;
                fit_head(machine);
            }),
            "extra_focal_distance_cm",
        ),
        (
            refusal(&plan, |machine| {
                machine.collimation.leaf_banks[0].source_distance_cm = None;
            }),
            "leaf_banks.source_distance_cm",
        ),
        (
            refusal(&plan, jaw(JawAxis::X)),
            "jaws.source_distance_cm of the x pair",
        ),
        (
            refusal(&plan, jaw(JawAxis::Y)),
            "jaws.source_distance_cm of the y pair",
        ),
        (
            refusal(&plan, |machine| machine.collimation.leaf_banks.clear()),
            "leaf bank MLCX",
        ),
        (
            refusal(&plan, |machine| {
                machine.collimation.leaf_banks = vec![bank(LeafAxis::Y)];
            }),
            "leaf bank MLCX",
        ),
        (
            refusal(&plan, |machine| {
                machine.collimation.leaf_banks[0].boundaries_cm.remove(0);
            }),
            "MLCX has 21 leaf boundaries, the beam model tg71-tpr has 20",
        ),
        (
            refusal(&plan, |machine| {
                machine.collimation.leaf_banks[0].boundaries_cm[10] = 0.25;
            }),
            "MLCX is at 0.00 cm in the plan and at 0.25 cm in the beam model",
        ),
    ] {
        assert!(message.contains(wanted), "{wanted}: {message}");
    }
    // To 0.1 mm the same: plans round.
    let mut machine = shaped_machine();
    machine.collimation.leaf_banks[0].boundaries_cm[10] = 0.01;
    verified_cgy_per_mu(&calculate_with(&plan, &machine));
}

fn block(name: &str, kind: BlockType, outline_cm: &[[f64; 2]], transmission: f64) -> Block {
    Block {
        name: Given::stated(name.to_owned()),
        block_type: Given::stated(kind),
        transmission: Given::stated(transmission),
        outline_cm: Given::stated(Arc::from(outline_cm)),
        ..Block::default()
    }
}

/// A square of 2 half sides around a place.
fn square(centre_cm: [f64; 2], half_cm: f64) -> [[f64; 2]; 4] {
    [[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]]
        .map(|sign| [0, 1].map(|axis| centre_cm[axis] + half_cm * sign[axis]))
}

fn with_block(block: Block) -> Plan {
    plan_with(|plan| plan.beams[0].blocks.push(block))
}

#[test]
fn verify_what_a_block_must_state_is_named() {
    let whole = block(
        "Corner",
        BlockType::Shielding,
        &square([4.0, 4.0], 1.0),
        0.05,
    );
    verified_cgy_per_mu(&shaped(&with_block(whole.clone())));
    for (changed, tag) in [
        (
            Block {
                transmission: Given::Absent,
                ..whole.clone()
            },
            "(300A,0102)",
        ),
        (
            Block {
                block_type: Given::Absent,
                ..whole.clone()
            },
            "(300A,00F8)",
        ),
        (
            Block {
                outline_cm: Given::Absent,
                ..whole
            },
            "(300A,0106)",
        ),
    ] {
        let result = shaped(&with_block(changed));
        assert_eq!(result.technique, Technique::Blocked);
        assert_eq!(kinds(&result), [ObstacleKind::Reading]);
        let message = &result.obstacles[0].message;
        assert!(
            message.contains("Corner") && message.contains(tag),
            "{message}"
        );
        assert_eq!(result.trace, None);
    }
}

/// An aperture block of 6 x 6 in a jaw opening of 10 x 10 that lets nothing through scatters and transmits as the
/// 6 x 6 field: 0.8 * Sc(10) 1 * Sp(6) 0.944, head scatter that of the jaws, TPR(10) = 1.
#[test]
fn verify_an_aperture_block_by_hand() {
    let cut = block("Cut", BlockType::Aperture, &square([0.0, 0.0], 3.0), 0.0);
    let result = shaped(&with_block(cut));
    assert_close(
        verified_cgy_per_mu(&result),
        0.8 * 0.944,
        0.002 * 0.8 * 0.944,
    );
}

/// The point on the axis, leaf tips at 0.7 cm, the radiation edge another 0.1 cm out: 0.8 cm, 1 cm is needed.
/// With the point 5 cm nearer to the source its plane is at 0.95 of the distance: 0.76 cm.
#[test]
fn verify_a_point_near_a_leaf_edge() {
    let edge_cm = 0.8 - LEAF_END_CM;
    let mut plan = with_leaves(&tips(|_| [-4.0, edge_cm]));
    let near = shaped(&plan);
    assert_eq!(kinds(&near), [ObstacleKind::FieldEdge]);
    let message = &near.obstacles[0].message;
    assert!(message.contains("0.80 cm from a field edge"), "{message}");
    assert!(near.is_calculated());
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0, -7.0, 30.0));
    let nearer = shaped(&plan);
    let message = &nearer.obstacles[0].message;
    assert!(message.contains("0.76 cm from a field edge"), "{message}");
    // 1 cm and a little is enough.
    let far = with_leaves(&tips(|_| [-4.0, 1.01 - LEAF_END_CM]));
    assert_eq!(kinds(&shaped(&far)), []);
    // One pair that reaches to 0.5 cm beside the point, 1 cm wide: sqrt(0.6^2 + 0^2) from the point at y = 0.
    let one_pair = tips(|y_cm| [-4.0, if y_cm == 0.5 { 0.5 } else { 4.0 }]);
    let message = shaped(&with_leaves(&one_pair)).obstacles[0].message.clone();
    assert!(message.contains("0.60 cm from a field edge"), "{message}");
}

/// Under a closed pair, a shielding block, outside an aperture block: a number, and no verification. Under
/// leaves alone only their share of the primary arrives.
#[test]
fn verify_a_point_under_leaf_or_block() {
    let under_leaf = tips(|_| [1.0, 4.0]);
    let shield = block(
        "Middle",
        BlockType::Shielding,
        &square([0.0, 0.0], 1.0),
        0.05,
    );
    let beside = block(
        "Beside",
        BlockType::Aperture,
        &square([3.0, 3.0], 1.5),
        0.05,
    );
    for (plan, leak) in [
        (with_leaves(&under_leaf), TRANSMISSION),
        (with_block(shield), 0.05),
        (with_block(beside), 0.05),
    ] {
        let result = shaped(&plan);
        assert_eq!(kinds(&result), [ObstacleKind::UnderDevice]);
        assert!(result.is_calculated());
        // Six sigmas (1.08 cm) from any opening but the leaf case (0.9 cm), where 3e-7 of the blur lies beyond.
        assert_close(input(&result, "Phi_leak"), leak, 1e-6);
        assert_close(input(&result, "Phi_open"), 0.0, 1e-6);
    }
}

/// A block over closed leaves: what they let through multiplies.
#[test]
fn verify_transmissions_of_leaf_and_block_multiply() {
    let mut plan = with_leaves(&tips(|y_cm| {
        if y_cm.abs() < 3.0 {
            [0.0; 2]
        } else {
            [-4.0, 4.0]
        }
    }));
    let shield = block("Over", BlockType::Shielding, &square([0.0, 0.0], 2.5), 0.05);
    plan.beams[0].blocks.push(shield);
    let result = shaped(&plan);
    assert_close(input(&result, "Phi_leak"), TRANSMISSION * 0.05, 1e-9);
}

fn layered(first: &[f64], second: &[f64]) -> Plan {
    plan_with(|plan| {
        put_leaves(plan, DeviceKind::Mlcx { layer: 1 }, first);
        put_leaves(plan, DeviceKind::Mlcx { layer: 2 }, second);
    })
}

fn two_layers(transmissions: [f64; 2]) -> MachineModel {
    let mut machine = shaped_machine();
    machine.collimation.leaf_banks = transmissions
        .map(|transmission| {
            let mut layer = bank(LeafAxis::X);
            layer.transmission = transmission;
            layer
        })
        .into();
    machine
}

/// Stacked layers are closed where either is closed: with leaves that let nothing through, two layers give what
/// one layer with their intersection gives.
#[test]
fn verify_stacked_layers_intersect() {
    let first = tips(|y_cm| [-3.0, 4.0 + 0.1 * y_cm]);
    let second = tips(|y_cm| if y_cm < -4.0 { [0.0; 2] } else { [-6.0, 3.5] });
    let both = tips(|y_cm| {
        if y_cm < -4.0 {
            [0.0; 2]
        } else {
            [-3.0, (4.0 + 0.1 * y_cm).min(3.5)]
        }
    });
    let stacked = calculate_with(&layered(&first, &second), &two_layers([0.0, 0.0]));
    let mut machine = shaped_machine();
    machine.collimation.leaf_banks[0].transmission = 0.0;
    let single = calculate_with(&with_leaves(&both), &machine);
    assert_close(
        verified_cgy_per_mu(&stacked) / verified_cgy_per_mu(&single),
        1.0,
        1e-9,
    );
    let gap_cm = |result: &BeamCalculation| result.shaped.as_ref().unwrap().mean_leaf_gap_cm;
    assert_close(gap_cm(&stacked).unwrap(), gap_cm(&single).unwrap(), 1e-9);
    // A plan with two layers and a model with one.
    let machine = shaped_machine();
    let refused = calculate_with(&layered(&first, &second), &machine);
    assert_eq!(kinds(&refused), [ObstacleKind::Model]);
    assert!(refused.obstacles[0].message.contains("leaf bank MLCX2"));
}

/// Under both layers 0.02 * 0.03 gets through, under one of them its own share.
#[test]
fn verify_transmissions_of_layers_multiply() {
    let machine = two_layers([0.02, 0.03]);
    let open = tips(|_| [-4.0, 4.0]);
    let away = tips(|_| [2.0, 4.0]);
    for (first, second, leak) in [
        (&away, &away, 0.02 * 0.03),
        (&away, &open, 0.02),
        (&open, &away, 0.03),
    ] {
        let result = calculate_with(&layered(first, second), &machine);
        assert_eq!(kinds(&result), [ObstacleKind::UnderDevice]);
        assert_close(input(&result, "Phi_leak"), leak, 1e-9);
    }
}

/// The opening of the exchange test: nothing about it is symmetric, and it is well inside the jaws, which otherwise
/// hide the leaves from the extra-focal source.
fn lopsided(across_cm: f64) -> [f64; 2] {
    [-1.4 + 0.2 * across_cm, 2.1 + 0.15 * across_cm]
}

/// With the collimator at 90 degrees x_b = Y_G and y_b = -X_G (IEC 61217, turned counter-clockwise seen from the source).
/// Leaves along y then stand where leaves along x stood: an opening from l to r in X_G lies from -r to -l in y_b.
/// With jaws and leaves of the model exchanged too, the machine is the same and so is the dose.
#[test]
fn verify_a_quarter_turn_with_everything_exchanged() {
    let point = Given::stated(Point::new(1.7, -2.0, 31.1));
    let place = |plan: &mut Plan| {
        plan.fraction_groups[0].beams[0].specification_point = point.clone();
    };
    let straight = plan_with(|plan| {
        place(plan);
        put_leaves(plan, MLCX, &tips(lopsided));
        for at in &mut plan.beams[0].control_points {
            at.jaws_x_cm = Given::stated([-4.5, 4.0]);
            at.jaws_y_cm = Given::stated([-3.5, 6.0]);
        }
    });
    let turned = plan_with(|plan| {
        place(plan);
        let along = tips(|across_cm| {
            let [left, right] = lopsided(across_cm);
            [-right, -left]
        });
        put_leaves(plan, DeviceKind::Mlcy { layer: 0 }, &along);
        for at in &mut plan.beams[0].control_points {
            at.collimator_deg = Given::stated(90.0);
            at.jaws_x_cm = Given::stated([-3.5, 6.0]);
            at.jaws_y_cm = Given::stated([-4.0, 4.5]);
        }
    });
    let mut exchanged = shaped_machine();
    exchanged.collimation.leaf_banks = vec![bank(LeafAxis::Y)];
    let only_leaves = exchanged.clone();
    exchanged.upper_jaws = JawAxis::X;
    for jaw in &mut exchanged.collimation.jaws {
        jaw.source_distance_cm = Some(match jaw.moves_along {
            JawAxis::X => 28.0,
            JawAxis::Y => 37.0,
        });
    }
    fit_head(&mut exchanged);
    let straight = shaped(&straight);
    let same = calculate_with(&turned, &exchanged);
    let ratio = verified_cgy_per_mu(&same) / verified_cgy_per_mu(&straight);
    assert_close(ratio, 1.0, 1e-9);
    // The jaws not exchanged: head scatter alone tells the difference.
    let other = calculate_with(&turned, &only_leaves);
    let head = |result: &BeamCalculation| {
        let trace = result.trace.as_ref().unwrap();
        trace.factor(FactorName::ApertureHeadScatter).unwrap().value
    };
    let ratio = verified_cgy_per_mu(&other) / verified_cgy_per_mu(&straight);
    assert_close(ratio, head(&other) / head(&straight), 1e-9);
    assert!(
        (ratio - 1.0).abs() > 1e-6 && (ratio - 1.0).abs() < 0.01,
        "{ratio}"
    );
    // The field not turned with the collimator is another field.
    let point_cm = same.point.unwrap().projected_cm.unwrap();
    let straight_cm = straight.point.unwrap().projected_cm.unwrap();
    assert_close(point_cm[0], straight_cm[1], 1e-9);
    assert_close(point_cm[1], -straight_cm[0], 1e-9);
}
