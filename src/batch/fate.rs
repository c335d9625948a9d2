//! What is to become of each surveyed file: plans that stand twice are audited
//! once when they are the same bytes, and bar each other when they are not.

use std::collections::HashMap;
use std::collections::hash_map::Entry;

use super::survey::{Seen, Surveyed};
use crate::audit::Rivals;
use crate::plan::FileKind;

/// What is to be done with a file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Fate {
    /// Audit it; the named files have the same UID and other content.
    Audit { rivals: Rivals },
    /// The same plan and bytes as the file of this index.
    DuplicateOf(usize),
    /// Not a plan to audit.
    Leave,
}

/// The fate of every file, in order.
pub(super) fn fates(files: &[Surveyed]) -> Vec<Fate> {
    let mut by_identity: HashMap<&str, Vec<usize>> = HashMap::new();
    for (index, file) in files.iter().enumerate() {
        if let Seen::File {
            kind: FileKind::Plan,
            sop_instance_uid,
            sha256,
            ..
        } = &file.seen
        {
            // A plan without a UID is known by its bytes alone.
            let identity = sop_instance_uid.as_deref().unwrap_or(sha256);
            by_identity.entry(identity).or_default().push(index);
        }
    }
    let sha256_of = |index: usize| match &files[index].seen {
        Seen::File { sha256, .. } => sha256.as_str(),
        _ => "",
    };
    let mut fates = vec![Fate::Leave; files.len()];
    for indices in by_identity.values() {
        let mut originals: Vec<usize> = Vec::new();
        let mut by_content: HashMap<&str, usize> = HashMap::new();
        for &index in indices {
            match by_content.entry(sha256_of(index)) {
                Entry::Occupied(original) => fates[index] = Fate::DuplicateOf(*original.get()),
                Entry::Vacant(place) => {
                    place.insert(index);
                    originals.push(index);
                }
            }
        }
        for &index in &originals {
            let others = originals
                .iter()
                .filter(|&&other| other != index)
                .map(|&other| files[other].path.display().to_string());
            fates[index] = Fate::Audit {
                rivals: Rivals::new(originals.len() - 1, others),
            };
        }
    }
    fates
}

#[cfg(test)]
mod tests {
    use super::{Fate, fates};
    use crate::audit::Rivals;
    use crate::batch::survey::{Seen, Surveyed};
    use crate::plan::FileKind;

    fn plan(path: &str, uid: Option<&str>, sha256: &str) -> Surveyed {
        Surveyed {
            path: path.into(),
            seen: Seen::File {
                size_bytes: 1,
                sha256: sha256.to_owned(),
                kind: FileKind::Plan,
                sop_instance_uid: uid.map(str::to_owned),
                message: None,
            },
        }
    }

    #[test]
    fn verify_same_bytes_are_audited_once_and_other_bytes_bar_each_other() {
        let audit = |rivals: &[&str]| Fate::Audit {
            rivals: Rivals::new(rivals.len(), rivals.iter().map(|&name| name.to_owned())),
        };
        let files = [
            plan("a", Some("1.2"), "x"),
            plan("b", Some("1.2"), "x"),
            plan("c", Some("1.2"), "y"),
            plan("d", None, "z"),
            plan("e", None, "z"),
            plan("f", Some("1.3"), "z"),
        ];
        assert_eq!(
            fates(&files),
            [
                audit(&["c"]),
                Fate::DuplicateOf(0),
                audit(&["a"]),
                audit(&[]),
                Fate::DuplicateOf(3),
                audit(&[]),
            ]
        );
    }

    /// Anonymised plans may all bear one UID: 40,000 of them name a few of their rivals each, not all.
    #[test]
    fn verify_a_uid_on_every_file_does_not_cost_the_square() {
        let files: Vec<Surveyed> = (0..40_000)
            .map(|number| plan(&format!("{number}.dcm"), Some("1.2"), &number.to_string()))
            .collect();
        let all = fates(&files);
        let Fate::Audit { rivals } = &all[0] else {
            panic!("audited");
        };
        assert_eq!(rivals.count(), 39_999);
        assert_eq!(
            rivals.in_words(),
            "1.dcm, 2.dcm, 3.dcm, 4.dcm, 5.dcm and 39994 more"
        );
    }
}
