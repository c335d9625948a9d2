//! The columns of `files.csv`.

use super::{Cell, Column};
use crate::audit::{FileEntry, FileOutcome};

/// What a row is made of.
#[derive(Clone, Copy, Debug)]
pub(in crate::report) struct FileRow<'a> {
    pub(in crate::report) run_id: &'a str,
    pub(in crate::report) file: &'a FileEntry,
}

type Getter = for<'a, 'b> fn(&'b FileRow<'a>) -> Cell;

const fn column(name: &'static str, meaning: &'static str, cell: Getter) -> Column<Getter> {
    Column {
        name,
        meaning,
        cell,
    }
}

/// The columns, in order.
pub(in crate::report) const FILE_COLUMNS: &[Column<Getter>] = &[
    column("file", "the file as it was given or found", |r| {
        Cell::word(&r.file.file)
    }),
    column("size_bytes", "size, bytes", |r| {
        let size = r.file.size_bytes;
        Cell::whole(size.map(|bytes| i64::try_from(bytes).unwrap_or(i64::MAX)))
    }),
    column("sha256", "SHA-256 of the file, hexadecimal", |r| {
        Cell::text(r.file.sha256.as_ref())
    }),
    column(
        "kind",
        "plan, brachy-plan, ion-plan, structure-set, ct, dose, record, other-dicom, not-dicom, or empty when it could not be told",
        |r| r.file.kind.map_or(Cell::Missing, Cell::word),
    ),
    column(
        "outcome",
        "audited, used, not-applicable, not-supported, duplicate-of, unreadable or passed-over",
        |r| Cell::word(r.file.outcome.term()),
    ),
    column(
        "message",
        "why; for a duplicate, the file that was audited",
        |r| Cell::Text(message(r.file)),
    ),
    column(
        "run_id",
        "identifier of the run, the same in every file of the report",
        |r| Cell::word(r.run_id),
    ),
];

/// The message of a file; a duplicate names its original even when the message does not.
pub(in crate::report) fn message(file: &FileEntry) -> String {
    match &file.outcome {
        FileOutcome::DuplicateOf(original) if !file.message.contains(original.as_str()) => {
            if file.message.is_empty() {
                format!("the same as {original}")
            } else {
                format!("the same as {original}: {}", file.message)
            }
        }
        _ => file.message.clone(),
    }
}
