//! The list of reading notes while it grows: bounded, so that a damaged file
//! with a fault in every item cannot fill the memory.

use crate::plan::{Effect, NoteKind, NoteScope, ReadingNote};

/// Notes of one plan that are kept.
const MAX_NOTES: usize = 2_000;

/// Notes so far.
#[derive(Debug, Default)]
pub(super) struct Notes {
    list: Vec<ReadingNote>,
    dropped: usize,
}

impl Notes {
    /// Adds a note, unless there are too many.
    pub(super) fn add(&mut self, note: ReadingNote) {
        if self.list.len() < MAX_NOTES {
            self.list.push(note);
        } else {
            self.dropped += 1;
        }
    }

    /// Whether some note already speaks of this place.
    pub(super) fn speak_of(&self, place: &str) -> bool {
        self.list.iter().any(|note| note.place == place)
    }

    /// The list. When some were dropped a last note says so and blocks the plan,
    /// because what it would have said is not known.
    pub(super) fn finish(mut self) -> Vec<ReadingNote> {
        if self.dropped > 0 {
            self.list.push(ReadingNote {
                scope: NoteScope::Plan,
                kind: NoteKind::MalformedValue,
                effect: Effect::BlocksPlan,
                place: "the file".to_owned(),
                message: format!(
                    "{} more notes are left out; the file is too faulty to be verified",
                    self.dropped
                ),
                measured: None,
                limit: None,
            });
        }
        self.list
    }
}
