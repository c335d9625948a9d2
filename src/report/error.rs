//! What can go wrong while a report is written, each with its place.

use std::path::PathBuf;

use thiserror::Error;

/// Why a report could not be written.
#[derive(Debug, Error)]
pub enum ReportError {
    /// A file or folder could not be created, written, renamed or read.
    #[error("report {}: cannot be {action}; check that the folder is writable and not full", path.display())]
    Io {
        /// The file or folder.
        path: PathBuf,
        /// What was tried: `created`, `written`, `read` ...
        action: &'static str,
        /// Cause.
        source: std::io::Error,
    },
    /// Another run writes its report into the folder at this moment.
    #[error("report {}: another audit is writing there; wait for it, or choose another folder with --out", path.display())]
    Busy {
        /// The folder.
        path: PathBuf,
    },
    /// A table's row could not be written.
    #[error("report {}: a row cannot be written", path.display())]
    Csv {
        /// The file.
        path: PathBuf,
        /// Cause.
        source: csv::Error,
    },
    /// A record could not be written as JSON.
    #[error("report {}: a record cannot be written", path.display())]
    Json {
        /// The file.
        path: PathBuf,
        /// Cause.
        source: serde_json::Error,
    },
    /// A part of the page could not be rendered.
    #[error("report {}: {part} cannot be rendered", path.display())]
    Page {
        /// The file.
        path: PathBuf,
        /// Which part.
        part: &'static str,
        /// Cause.
        source: askama::Error,
    },
}
