//! What is to become of each surveyed file: plans that stand twice are audited
//! once when they are the same bytes, and bar each other when they are not.

use std::collections::HashMap;

use super::survey::{Seen, Surveyed};
use crate::plan::FileKind;

/// What is to be done with a file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Fate {
    /// Audit it; the named files have the same UID and other content.
    Audit { rivals: Vec<String> },
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
        for &index in indices {
            match originals
                .iter()
                .find(|&&original| sha256_of(original) == sha256_of(index))
            {
                Some(&original) => fates[index] = Fate::DuplicateOf(original),
                None => originals.push(index),
            }
        }
        for &index in &originals {
            let rivals = originals
                .iter()
                .filter(|&&other| other != index)
                .map(|&other| files[other].path.display().to_string())
                .collect();
            fates[index] = Fate::Audit { rivals };
        }
    }
    fates
}

#[cfg(test)]
mod tests {
    use super::{Fate, fates};
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
            rivals: rivals.iter().map(|&name| name.to_owned()).collect(),
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
}
