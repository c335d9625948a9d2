//! What the outputs say of the run itself: models on offer, options, and the
//! identifier over everything that they depend on.

use super::run::BatchRequest;
use super::survey::{Seen, Surveyed};
use crate::audit::{ModelUse, Run};
use crate::beam_model::{DataOrigin, ModelSet};
use crate::quantity::sha256_hex;

/// The models on offer, and whether each is approved on the day of the run.
pub(super) fn model_uses(models: &ModelSet, day: jiff::civil::Date) -> Vec<ModelUse> {
    models
        .machines
        .iter()
        .map(|model| {
            let provenance = &model.provenance;
            ModelUse {
                name: model.name.clone(),
                serves: model.serves.clone(),
                fingerprint: model.fingerprint.clone(),
                origin: match provenance.origin {
                    DataOrigin::Measured => "measured",
                    DataOrigin::Published => "published",
                    DataOrigin::Invented => "invented",
                },
                provenance: format!("{}, {}", provenance.by, provenance.on),
                approval: model.approval.as_ref().map_or_else(
                    || "not approved".to_owned(),
                    |approval| {
                        format!(
                            "by {} on {}, until {}",
                            approval.by, approval.on, approval.until
                        )
                    },
                ),
                approved: model.is_approved_on(day),
            }
        })
        .collect()
}

/// What is known of the run before its first plan; the identifier comes later.
pub(super) fn run_record(request: BatchRequest<'_>, models: &[ModelUse]) -> Run {
    let facts = request.facts;
    Run {
        run_id: String::new(),
        version: facts.version.clone(),
        started: facts.started.to_string(),
        inputs: facts.inputs.clone(),
        options: facts.options.clone(),
        site_source: facts.site_source.clone(),
        site: request.site.clone(),
        models: models.to_vec(),
    }
}

/// Sixteen hex digits over everything that the outputs depend on.
pub(super) fn run_id(run: &Run, files: &[Surveyed]) -> String {
    let mut text = format!("{run:?}");
    for file in files {
        let fingerprint = match &file.seen {
            Seen::File { sha256, .. } => sha256,
            Seen::PassedOver(reason) | Seen::Unreadable(reason) => reason,
        };
        text.push_str(&format!("\n{} {fingerprint}", file.path.display()));
    }
    let mut id = sha256_hex(text.as_bytes());
    id.truncate(16);
    id
}
