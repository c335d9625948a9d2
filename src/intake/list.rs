//! Lists of paths: one a line, from a file or from standard input.

use std::io::BufRead;
use std::path::PathBuf;

use super::IntakeError;

/// The paths of a list, one a line; empty lines are skipped. `name` is for messages.
///
/// # Errors
/// When the list cannot be read (or is not UTF-8).
pub fn paths_from_list(list: impl BufRead, name: &str) -> Result<Vec<PathBuf>, IntakeError> {
    let mut paths = Vec::new();
    for line in list.lines() {
        let line = line.map_err(|source| IntakeError::List {
            list: name.to_owned(),
            source,
        })?;
        let path = line.trim_end_matches('\r');
        if !path.is_empty() {
            paths.push(PathBuf::from(path));
        }
    }
    Ok(paths)
}
