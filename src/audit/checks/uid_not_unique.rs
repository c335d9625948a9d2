//! One SOP Instance UID over different contents.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;
#[cfg(test)]
use crate::audit::Rivals;

check! {
    /// What it looks at: files of this run that bear the same SOP Instance UID.
    ///
    /// Why it matters: the UID is the plan's identity; with two contents nobody can tell which one will be treated.
    ///
    /// Silent when: the UID is unique, or every file that bears it holds the same bytes.
    ///
    /// What to do: find out which file is the plan in the treatment record, and remove the other.
    ///
    /// Source: DICOM PS3.3 C.12.1, SOP Instance UID (0008,0018) identifies one instance.
    "uid-not-unique", Action, look,
    fires on || example::changed(|example| {
        example.rivals = Rivals::new(1, ["another.dcm".to_owned()]);
    }),
    silent on example::ordinary
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    if input.rivals.count() == 0 {
        return Vec::new();
    }
    vec![Observation {
        message: format!(
            "the same SOP Instance UID (0008,0018) with different content in: {}; find out which is the plan",
            input.rivals.in_words()
        ),
        measured: Some(format!("{} contents", input.rivals.count() + 1)),
        limit: Some("1 content".to_owned()),
        ..Observation::default()
    }]
}
