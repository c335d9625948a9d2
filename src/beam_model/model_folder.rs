//! The files of one model: read inside the model's folder only, bounded in
//! size, and fingerprinted together. What they contain is for the loader.

use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::fs::File;
use std::io::Read as _;
use std::path::{Component, Path, PathBuf};

use sha2::{Digest as _, Sha256};

use super::ModelError;

/// Greatest size of one file of a model. A table of 100 depths and 50 sides takes some 40 kB.
pub(super) const FILE_LIMIT_BYTES: u64 = 4 * 1024 * 1024;

/// The name of the file that makes a folder a model.
pub(super) const MACHINE_FILE: &str = "machine.toml";

/// One model's folder and what was read from it so far.
pub(super) struct ModelFolder {
    root: PathBuf,
    read: BTreeMap<String, Vec<u8>>,
}

impl ModelFolder {
    pub(super) fn new(root: &Path) -> Self {
        Self {
            root: root.to_path_buf(),
            read: BTreeMap::new(),
        }
    }

    /// The path of a file in the folder, for messages.
    pub(super) fn path(&self, relative: &str) -> PathBuf {
        self.root.join(relative)
    }

    /// The `machine.toml`.
    pub(super) fn machine_path(&self) -> PathBuf {
        self.path(MACHINE_FILE)
    }

    /// The text of a file whose name is relative to the folder, without a byte order mark.
    pub(super) fn read_text(&mut self, relative: &str) -> Result<String, ModelError> {
        self.refuse_outside(relative)?;
        let path = self.path(relative);
        let bytes = read_bounded(&path)?;
        let text = std::str::from_utf8(&bytes)
            .map_err(|error| ModelError::NotText {
                path: path.clone(),
                line: line_of(&bytes, error.valid_up_to()),
            })?
            .trim_start_matches('\u{feff}')
            .to_owned();
        self.read.insert(relative.to_owned(), bytes);
        Ok(text)
    }

    /// SHA-256 over every file read, hex: for each, by name, the lengths of
    /// name and content (8 bytes, little-endian), the name, the content. The lengths keep
    /// bytes from moving between files unnoticed.
    pub(super) fn fingerprint(&self) -> String {
        let mut hash = Sha256::new();
        for (name, bytes) in &self.read {
            hash.update((name.len() as u64).to_le_bytes());
            hash.update((bytes.len() as u64).to_le_bytes());
            hash.update(name.as_bytes());
            hash.update(bytes);
        }
        hash.finalize()
            .iter()
            .fold(String::new(), |mut text, byte| {
                let _ = write!(text, "{byte:02x}");
                text
            })
    }

    fn refuse_outside(&self, relative: &str) -> Result<(), ModelError> {
        let outside = || ModelError::Outside {
            path: self.machine_path(),
            named: relative.to_owned(),
        };
        let mut components = Path::new(relative).components().peekable();
        if components.peek().is_none()
            || relative.contains('\\')
            || !components.all(|part| matches!(part, Component::Normal(_)))
        {
            return Err(outside());
        }
        // A link inside the folder could still lead out of it.
        let canonical = |path: &Path| {
            path.canonicalize().map_err(|source| ModelError::Read {
                path: path.to_path_buf(),
                source,
            })
        };
        if canonical(&self.path(relative))?.starts_with(canonical(&self.root)?) {
            Ok(())
        } else {
            Err(outside())
        }
    }
}

fn read_bounded(path: &Path) -> Result<Vec<u8>, ModelError> {
    let failed = |source| ModelError::Read {
        path: path.to_path_buf(),
        source,
    };
    // A device could deliver without end, and a pipe waits for its writer as soon as it is opened.
    if !std::fs::metadata(path).map_err(failed)?.is_file() {
        return Err(failed(std::io::Error::other("not a regular file")));
    }
    let file = File::open(path).map_err(failed)?;
    let mut bytes = Vec::new();
    file.take(FILE_LIMIT_BYTES + 1)
        .read_to_end(&mut bytes)
        .map_err(failed)?;
    if bytes.len() as u64 > FILE_LIMIT_BYTES {
        return Err(ModelError::TooLarge {
            path: path.to_path_buf(),
            limit_bytes: FILE_LIMIT_BYTES,
        });
    }
    Ok(bytes)
}

/// The line, from 1, that a byte offset lies in.
pub(super) fn line_of(bytes: &[u8], offset: usize) -> usize {
    let before = bytes.get(..offset).unwrap_or(bytes);
    1 + before.iter().filter(|&&byte| byte == b'\n').count()
}
