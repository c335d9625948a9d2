//! The TG-71 model with what shaped fields need besides its tables: distances,
//! a leaf bank, penumbra, extra-focal plane. These are invented for the tests; no
//! expected number rests on them unless the test says so.

use std::sync::Arc;

use counterfoil::beam_model::{HeadScatter, JawAxis, LeafBank, MachineModel, Penumbra, Travel};
use counterfoil::plan::{ControlPoint, DeviceKind, LeafAxis, LeafPositions, LimitingDevice, Plan};
use counterfoil::quantity::Given;

use super::tg71;

/// Twenty leaf pairs of 1 cm.
pub(super) const PAIRS: usize = 20;

/// Transmission of the leaves.
pub(super) const TRANSMISSION: f64 = 0.015;

/// How far the radiation edge lies behind a leaf's tip, cm.
pub(super) const LEAF_END_CM: f64 = 0.1;

/// Boundaries of the leaves, cm.
pub(super) fn boundaries_cm() -> Vec<f64> {
    (-10..=10).map(f64::from).collect()
}

/// A bank along an axis.
pub(super) fn bank(axis: LeafAxis) -> LeafBank {
    LeafBank {
        moves_along: axis,
        source_distance_cm: Some(50.0),
        boundaries_cm: boundaries_cm(),
        transmission: TRANSMISSION,
        leaf_end_offset_cm: LEAF_END_CM,
        travel: Travel::default(),
    }
}

/// Y jaws above at 28 cm, X jaws at 37 cm, one bank along x at 50 cm.
pub(super) fn shaped_machine() -> MachineModel {
    let mut machine = tg71("tg71-tpr");
    for jaw in &mut machine.collimation.jaws {
        jaw.source_distance_cm = Some(match jaw.moves_along {
            JawAxis::X => 37.0,
            JawAxis::Y => 28.0,
        });
    }
    machine.collimation.leaf_banks = vec![bank(LeafAxis::X)];
    machine.beams[0].penumbra = Some(Penumbra {
        sigma_cm: 0.18,
        tail_share: 0.0,
        tail_sigma_cm: 0.18,
    });
    machine.beams[0].extra_focal_distance_cm = Some(12.0);
    fit_head(&mut machine);
    machine
}

/// Fits head scatter again after a distance has changed.
pub(super) fn fit_head(machine: &mut MachineModel) {
    let fitted = HeadScatter::fit(machine.sad_cm, &machine.collimation, &machine.beams[0]);
    machine.beams[0].head_scatter = fitted;
}

/// The positions of a bank whose pairs are open from and to where the function says for the middle of their width.
pub(super) fn tips(open: impl Fn(f64) -> [f64; 2]) -> Vec<f64> {
    let middles = (0..PAIRS).map(|pair| pair as f64 - 9.5);
    let sides: Vec<[f64; 2]> = middles.map(open).collect();
    let lower = sides.iter().map(|side| side[0]);
    lower.chain(sides.iter().map(|side| side[1])).collect()
}

/// Declares a bank and puts it at one place at every control point.
pub(super) fn put_leaves(plan: &mut Plan, kind: DeviceKind, positions_cm: &[f64]) {
    let beam = &mut plan.beams[0];
    beam.devices.push(LimitingDevice {
        kind: kind.clone(),
        pairs: Given::stated(20),
        source_distance_cm: Given::Absent,
        boundaries_cm: Given::stated(boundaries_cm()),
    });
    for point in &mut beam.control_points {
        point.leaves.push(LeafPositions {
            kind: kind.clone(),
            positions_cm: Given::stated(Arc::from(positions_cm)),
        });
    }
}

/// Moves the first bank at one control point.
pub(super) fn move_leaves(point: &mut ControlPoint, positions_cm: &[f64]) {
    point.leaves[0].positions_cm = Given::stated(Arc::from(positions_cm));
}

/// The usual bank.
pub(super) const MLCX: DeviceKind = DeviceKind::Mlcx { layer: 0 };
