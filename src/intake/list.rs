//! Lists of paths: one a line, from a file or from standard input.

use std::io::{self, BufRead};
use std::path::PathBuf;

use super::IntakeError;

/// The paths of a list, one a line; empty lines and a byte order mark are skipped. `name` is for messages.
///
/// # Errors
/// When the list cannot be read (or, where paths are text, is not UTF-8).
pub fn paths_from_list(list: impl BufRead, name: &str) -> Result<Vec<PathBuf>, IntakeError> {
    let fault = |source| IntakeError::List {
        list: name.to_owned(),
        source,
    };
    let mut paths = Vec::new();
    for line in list.split(b'\n') {
        let line = line.map_err(fault)?;
        let line = match line.strip_prefix(b"\xEF\xBB\xBF") {
            Some(rest) if paths.is_empty() => rest,
            _ => &line,
        };
        let line = line.strip_suffix(b"\r").unwrap_or(line);
        if !line.is_empty() {
            paths.push(path(line).map_err(fault)?);
        }
    }
    Ok(paths)
}

/// File names are bytes, in whatever character set.
#[cfg(unix)]
fn path(line: &[u8]) -> io::Result<PathBuf> {
    use std::os::unix::ffi::OsStrExt;
    Ok(PathBuf::from(std::ffi::OsStr::from_bytes(line)))
}

#[cfg(not(unix))]
fn path(line: &[u8]) -> io::Result<PathBuf> {
    std::str::from_utf8(line)
        .map(PathBuf::from)
        .map_err(|error| io::Error::new(io::ErrorKind::InvalidData, error))
}

#[cfg(test)]
mod tests {
    use super::paths_from_list;
    use std::path::PathBuf;

    #[test]
    fn verify_lists_of_either_line_ending_are_read() {
        let read = |list: &[u8]| paths_from_list(list, "list").unwrap();
        let two = ["a", "b c"].map(PathBuf::from);
        assert_eq!(read(b"a\nb c\n"), two);
        assert_eq!(read(b"\xEF\xBB\xBFa\r\n\r\nb c"), two);
        assert_eq!(read(b"\n\n"), Vec::<PathBuf>::new());
    }

    /// A name in an old character set is a path like any other.
    #[cfg(unix)]
    #[test]
    fn verify_a_name_that_is_not_utf8_does_not_end_the_run() {
        use std::os::unix::ffi::OsStrExt;
        let paths = paths_from_list(&b"caf\xE9.dcm\nb\n"[..], "list").unwrap();
        assert_eq!(paths.len(), 2);
        assert_eq!(paths[0].as_os_str().as_bytes(), b"caf\xE9.dcm");
    }
}
