//! A model against its own measured points: the same formalism that audits
//! plans, on the field that was measured.

use super::{FactorError, FieldDepth, FieldInput, FieldModel, Form, RayPoint, dose_per_mu};
use crate::beam_model::{BeamModel, MachineModel, ProofPoint, TableKind};

/// 100 * (model - measured) / measured for a point on the axis of a symmetric field.
///
/// # Errors
/// When the tables do not reach the point.
pub fn prove(
    machine: &MachineModel,
    beam: &BeamModel,
    point: &ProofPoint,
) -> Result<f64, FactorError> {
    let half = |side_cm: f64| [-side_cm / 2.0, side_cm / 2.0];
    let form = match beam.table_kind {
        TableKind::Pdd { .. } => Form::FixedSsd {
            ssd_cm: point.ssd_cm,
        },
        TableKind::Tpr => Form::Isocentric,
    };
    let trace = dose_per_mu(&FieldInput {
        model: Some(FieldModel {
            beam,
            upper_jaws: machine.upper_jaws,
        }),
        jaws_x_cm: half(point.x_cm),
        jaws_y_cm: half(point.y_cm),
        ray: RayPoint::on_axis(point.ssd_cm + point.depth_cm, machine.sad_cm),
        depth: FieldDepth {
            perpendicular_cm: Some(point.depth_cm),
            effective_cm: point.depth_cm,
            source: "measured point".to_owned(),
        },
        form,
        tray: None,
        wedge: None,
        couch: None,
        reference: None,
        typed: Vec::new(),
    })?;
    let measured = point.measured_cgy_per_mu;
    Ok(100.0 * (trace.dose_per_mu_cgy - measured) / measured)
}
