//! Leaf banks: the plan's boundaries joined with what the model knows of the
//! same bank. Where the leaves stand is the work of `opening`.

use super::super::{Obstacle, ObstacleKind};
use crate::beam_model::{LeafBank, MachineModel};
use crate::plan::{Beam, LeafAxis};

/// Plan and model may state a leaf boundary this far apart, cm: plans round to 0.1 mm, and a bank of
/// another layout differs by millimetres.
const BOUNDARY_CM: f64 = 0.05;

/// A bank of the beam.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bank<'a> {
    /// Its place in every control point's `leaves`.
    pub(super) index: usize,
    /// The axis its leaves move along.
    pub(super) axis: LeafAxis,
    /// Between leaves, cm at the isocentre plane.
    pub(super) boundaries_cm: &'a [f64],
    /// The model's bank.
    pub(super) model: &'a LeafBank,
}

/// Every leaf bank of the beam, with the model's bank of the same axis and order.
pub(super) fn banks<'a>(
    beam: &'a Beam,
    machine: &'a MachineModel,
) -> Result<Vec<Bank<'a>>, Obstacle> {
    let mut found: Vec<Bank<'a>> = Vec::new();
    for device in &beam.devices {
        let Some(axis) = device.kind.leaf_axis() else {
            continue;
        };
        let term = device.kind.term();
        let Some(boundaries_cm) = device.boundaries_cm.value() else {
            return Err(Obstacle {
                kind: ObstacleKind::Reading,
                message: format!("Leaf Position Boundaries (300A,00BE) of {term} are not given"),
            });
        };
        // Layers are numbered from 1 when there are several; a single bank has none.
        let layer = usize::from(device.kind.leaf_layer()).saturating_sub(1);
        let banks = machine.collimation.leaf_banks.iter();
        let Some(model) = banks.filter(|bank| bank.moves_along == axis).nth(layer) else {
            return Err(Obstacle::model(format!(
                "the plan has the leaf bank {term}, the beam model {} has none like it: no transmission is known",
                machine.name
            )));
        };
        refuse_other_layout(term, boundaries_cm, model, &machine.name)?;
        found.push(Bank {
            index: found.len(),
            axis,
            boundaries_cm,
            model,
        });
    }
    Ok(found)
}

fn refuse_other_layout(
    term: &str,
    boundaries_cm: &[f64],
    model: &LeafBank,
    name: &str,
) -> Result<(), Obstacle> {
    if boundaries_cm.len() != model.boundaries_cm.len() {
        return Err(Obstacle::model(format!(
            "the plan's {term} has {} leaf boundaries, the beam model {name} has {}",
            boundaries_cm.len(),
            model.boundaries_cm.len()
        )));
    }
    let apart = boundaries_cm
        .iter()
        .zip(&model.boundaries_cm)
        .find(|(plan, model)| (**plan - **model).abs() > BOUNDARY_CM);
    if let Some((plan_cm, model_cm)) = apart {
        return Err(Obstacle::model(format!(
            "a leaf boundary of {term} is at {plan_cm:.2} cm in the plan and at {model_cm:.2} cm in the beam model {name}"
        )));
    }
    Ok(())
}
