//! Walking files and folders in a stable order: arguments as given, folders by
//! name. Links are followed, loops and special files are passed over with a
//! reason, and the folder that the report goes to is not looked into.

use std::fs;
use std::path::{Path, PathBuf};

use thiserror::Error;
use walkdir::WalkDir;

/// One path that was found.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Found {
    /// A regular file to look at.
    File(PathBuf),
    /// Something that could not be looked at: its path and why.
    Unreadable(PathBuf, String),
    /// Something that was left alone on purpose: its path and why.
    PassedOver(PathBuf, String),
    /// The folder that the report goes to, which was not looked into.
    ReportFolder(PathBuf),
}

/// Why the inputs were refused.
#[derive(Debug, Error)]
pub enum IntakeError {
    /// A path that the user named is not there: more likely a slip than an empty folder.
    #[error("{path}: no such file or folder; check the path")]
    Missing {
        /// The path.
        path: String,
    },
    /// A list of paths could not be read.
    #[error("list of paths {list}: cannot be read")]
    List {
        /// The list.
        list: String,
        /// Cause.
        source: std::io::Error,
    },
}

/// Every file under `paths`, folders walked by name order. `report_folder` is left out of the walk.
///
/// # Errors
/// When a named path does not exist.
pub fn find_files(paths: &[PathBuf], report_folder: &Path) -> Result<Vec<Found>, IntakeError> {
    let report_folder = fs::canonicalize(report_folder).ok();
    let mut found = Vec::new();
    for path in paths {
        if fs::symlink_metadata(path).is_err() {
            return Err(IntakeError::Missing {
                path: path.display().to_string(),
            });
        }
        walk(path, report_folder.as_deref(), &mut found);
    }
    Ok(found)
}

fn walk(top: &Path, report_folder: Option<&Path>, found: &mut Vec<Found>) {
    let mut entries = WalkDir::new(top)
        .follow_links(true)
        .sort_by_file_name()
        .into_iter();
    while let Some(entry) = entries.next() {
        let entry = match entry {
            Ok(entry) => entry,
            Err(error) => {
                let path = error.path().unwrap_or(top).to_path_buf();
                found.push(if error.loop_ancestor().is_some() {
                    let reason = "a link that leads back to a folder above it";
                    Found::PassedOver(path, reason.to_owned())
                } else {
                    let reason = error
                        .io_error()
                        .map_or_else(|| "cannot be looked at".to_owned(), ToString::to_string);
                    Found::Unreadable(path, reason)
                });
                continue;
            }
        };
        let kind = entry.file_type();
        if kind.is_dir() {
            let is_report = report_folder.is_some()
                && fs::canonicalize(entry.path()).ok().as_deref() == report_folder;
            if is_report {
                found.push(Found::ReportFolder(entry.into_path()));
                entries.skip_current_dir();
            }
        } else if kind.is_file() {
            found.push(Found::File(entry.into_path()));
        } else {
            let reason = "neither a file nor a folder".to_owned();
            found.push(Found::PassedOver(entry.into_path(), reason));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::{Found, find_files};
    use std::fs;
    use std::path::PathBuf;

    #[test]
    fn verify_order_is_by_name_and_the_report_folder_is_left_out() {
        let folder = tempfile::tempdir().unwrap();
        let inside = |name: &str| folder.path().join(name);
        for name in ["b.dcm", "a.dcm", ".hidden"] {
            fs::write(inside(name), name).unwrap();
        }
        fs::create_dir(inside("out")).unwrap();
        fs::write(inside("out/report.html"), "x").unwrap();
        let found = find_files(&[folder.path().to_path_buf()], &inside("out")).unwrap();
        let files: Vec<PathBuf> = found
            .iter()
            .filter_map(|entry| match entry {
                Found::File(path) => Some(path.clone()),
                _ => None,
            })
            .collect();
        assert_eq!(files, [inside(".hidden"), inside("a.dcm"), inside("b.dcm")]);
        assert_eq!(found.last(), Some(&Found::ReportFolder(inside("out"))));
    }

    #[test]
    fn verify_a_missing_path_is_an_error() {
        let missing = PathBuf::from("no-such-folder-here");
        assert!(find_files(&[missing], &PathBuf::from("out")).is_err());
    }

    #[cfg(unix)]
    #[test]
    fn verify_a_link_loop_ends() {
        let folder = tempfile::tempdir().unwrap();
        std::os::unix::fs::symlink(folder.path(), folder.path().join("round")).unwrap();
        let found = find_files(&[folder.path().to_path_buf()], &PathBuf::from("out")).unwrap();
        assert!(
            matches!(found.as_slice(), [Found::PassedOver(_, reason)] if reason.contains("leads back"))
        );
    }
}
