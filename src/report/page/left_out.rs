//! Files that were not audited: counted all, listed up to a limit for each
//! outcome. `files.csv` has every one.

use crate::audit::{FileEntry, FileOutcome};
use crate::report::table::file_message;

/// So many files are listed for each outcome.
const LISTED: usize = 100;

/// A file, in finished strings.
#[derive(Clone, Debug)]
pub(super) struct LeftOutFile {
    pub(super) file: String,
    pub(super) kind: &'static str,
    pub(super) message: String,
}

/// The files of one outcome.
#[derive(Debug)]
pub(super) struct LeftOutGroup {
    pub(super) title: &'static str,
    pub(super) count: u64,
    pub(super) files: Vec<LeftOutFile>,
}

impl LeftOutGroup {
    /// How many are counted and not listed.
    pub(super) fn unlisted(&self) -> u64 {
        self.count.saturating_sub(self.files.len() as u64)
    }
}

/// The files of every outcome but `audited` and `used`.
#[derive(Debug)]
pub(super) struct LeftOut {
    groups: Vec<LeftOutGroup>,
}

impl LeftOut {
    pub(super) fn new() -> Self {
        let titles = [
            "unreadable",
            "not supported",
            "not applicable",
            "duplicates, audited once",
            "passed over",
        ];
        let groups = titles.into_iter().map(|title| LeftOutGroup {
            title,
            count: 0,
            files: Vec::new(),
        });
        Self {
            groups: groups.collect(),
        }
    }

    pub(super) fn file(&mut self, file: &FileEntry) {
        let place = match file.outcome {
            FileOutcome::Audited | FileOutcome::Used => return,
            FileOutcome::Unreadable => 0,
            FileOutcome::NotSupported => 1,
            FileOutcome::NotApplicable => 2,
            FileOutcome::DuplicateOf(_) => 3,
            FileOutcome::PassedOver => 4,
        };
        let Some(group) = self.groups.get_mut(place) else {
            return;
        };
        group.count += 1;
        if group.files.len() < LISTED {
            group.files.push(LeftOutFile {
                file: file.file.clone(),
                kind: file.kind.unwrap_or("unknown"),
                message: file_message(file),
            });
        }
    }

    /// The outcomes that occurred.
    pub(super) fn groups(self) -> Vec<LeftOutGroup> {
        let mut groups = self.groups;
        groups.retain(|group| group.count > 0);
        groups
    }
}
