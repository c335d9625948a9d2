//! One file of a run: read again, audited, and made a row; a panic becomes a
//! sentence in that row.

use std::path::Path;

use super::depth_rows::RowsByPlan;
use super::fate::Fate;
use super::guard::guarded;
use super::run::BatchRequest;
use super::survey::{Seen, Surveyed};
use crate::audit::{FileEntry, FileOutcome, PlanEntry, PlanInput, Rivals, audit_plan};
use crate::intake::{Contents, read_file};
use crate::plan::{FileKind, read_plan};

/// What becomes of one file, and the plan's entry when it was audited.
pub(super) fn one_file(
    request: BatchRequest<'_>,
    rows: &RowsByPlan,
    files: &[Surveyed],
    index: usize,
    fate: &Fate,
) -> (FileEntry, Option<PlanEntry>) {
    let file = &files[index];
    let name = file.path.display().to_string();
    let entry = |outcome: FileOutcome, message: String| {
        let (size_bytes, sha256, kind) = match &file.seen {
            Seen::File {
                size_bytes,
                sha256,
                kind,
                ..
            } => (Some(*size_bytes), Some(sha256.clone()), Some(kind.term())),
            Seen::PassedOver(_) | Seen::Unreadable(_) => (None, None, None),
        };
        FileEntry {
            file: name.clone(),
            size_bytes,
            sha256,
            kind,
            outcome,
            message,
        }
    };
    let (kind, sha256, message) = match &file.seen {
        Seen::PassedOver(reason) => return (entry(FileOutcome::PassedOver, reason.clone()), None),
        Seen::Unreadable(reason) => return (entry(FileOutcome::Unreadable, reason.clone()), None),
        Seen::File {
            kind,
            sha256,
            message,
            ..
        } => (*kind, sha256, message.clone().unwrap_or_default()),
    };
    match fate {
        Fate::Leave => (entry(outcome_of(kind), message), None),
        Fate::DuplicateOf(original) => {
            let original = files[*original].path.display().to_string();
            let message = "the same plan and the same bytes, audited once".to_owned();
            (entry(FileOutcome::DuplicateOf(original), message), None)
        }
        Fate::Audit { rivals } => match audit_file(request, rows, &file.path, sha256, rivals) {
            Ok(plan) => (entry(FileOutcome::Audited, message), Some(plan)),
            Err(reason) => (entry(FileOutcome::Unreadable, reason), None),
        },
    }
}

const fn outcome_of(kind: FileKind) -> FileOutcome {
    match kind {
        FileKind::BrachyPlan => FileOutcome::NotApplicable,
        FileKind::IonPlan => FileOutcome::NotSupported,
        _ => FileOutcome::PassedOver,
    }
}

fn audit_file(
    request: BatchRequest<'_>,
    rows: &RowsByPlan,
    path: &Path,
    sha256: &str,
    rivals: &Rivals,
) -> Result<PlanEntry, String> {
    let file = read_file(path).map_err(|error| error.to_string())?;
    let Contents::Whole(bytes) = &file.contents else {
        return Err("grew while it was being read".to_owned());
    };
    if file.sha256 != sha256 {
        return Err("changed while it was being read; run the audit again".to_owned());
    }
    guarded(|| {
        let plan = read_plan(bytes).map_err(|error| chain(&error))?;
        let uid = plan.identity.sop_instance_uid.value();
        Ok(audit_plan(PlanInput {
            file: &path.display().to_string(),
            sha256,
            plan: &plan,
            rivals,
            models: request.models,
            site: request.site,
            depth_rows: rows.of(uid.map(String::as_str)),
        }))
    })?
}

/// An error with its causes on one line.
fn chain(error: &dyn std::error::Error) -> String {
    let mut text = error.to_string();
    let mut cause = error.source();
    while let Some(inner) = cause {
        text.push_str(": ");
        text.push_str(&inner.to_string());
        cause = inner.source();
    }
    text
}
