//! The first look at every file: size, fingerprint, kind and identity. Nothing
//! of a file's contents is kept.

use std::path::{Path, PathBuf};

use super::guard::guarded;
use crate::intake::{Contents, FILE_CAP_BYTES, Found, read_file};
use crate::plan::{FileKind, identify};

/// What the survey learnt of one path.
#[derive(Clone, Debug)]
pub(super) struct Surveyed {
    pub(super) path: PathBuf,
    pub(super) seen: Seen,
}

/// What there is at a path.
#[derive(Clone, Debug)]
pub(super) enum Seen {
    /// Not looked at, and why.
    PassedOver(String),
    /// Could not be read, and why.
    Unreadable(String),
    /// A file.
    File {
        size_bytes: u64,
        sha256: String,
        kind: FileKind,
        sop_instance_uid: Option<String>,
        message: Option<String>,
    },
}

/// Looks at one path.
pub(super) fn survey(found: &Found) -> Surveyed {
    match found {
        Found::PassedOver(path, reason) => Surveyed {
            path: path.clone(),
            seen: Seen::PassedOver(reason.clone()),
        },
        Found::ReportFolder(path) => Surveyed {
            path: path.clone(),
            seen: Seen::PassedOver("the folder that this run's report goes to".to_owned()),
        },
        Found::Unreadable(path, reason) => Surveyed {
            path: path.clone(),
            seen: Seen::Unreadable(reason.clone()),
        },
        Found::File(path) => Surveyed {
            path: path.clone(),
            seen: look(path),
        },
    }
}

fn look(path: &Path) -> Seen {
    let file = match read_file(path) {
        Ok(file) => file,
        Err(error) => return Seen::Unreadable(error.to_string()),
    };
    let identified = match guarded(|| identify(file.contents.bytes())) {
        Ok(identified) => identified,
        Err(reason) => return Seen::Unreadable(reason),
    };
    let too_large = matches!(file.contents, Contents::Head(_)) && identified.kind == FileKind::Plan;
    if too_large {
        return Seen::Unreadable(format!(
            "larger than {} MiB, which no RT Plan is",
            FILE_CAP_BYTES / (1024 * 1024)
        ));
    }
    if identified.may_be_plan {
        let reason = identified.message.unwrap_or_default();
        return Seen::Unreadable(format!("damaged before it says what it is: {reason}"));
    }
    Seen::File {
        size_bytes: file.size_bytes,
        sha256: file.sha256,
        kind: identified.kind,
        sop_instance_uid: identified.sop_instance_uid,
        message: identified.message,
    }
}
