//! Reading one file with a bound on memory, and its fingerprint.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use sha2::{Digest, Sha256};

use crate::quantity::hex;

/// Larger files are fingerprinted but not held in memory: no plan is that large.
pub const FILE_CAP_BYTES: u64 = 64 * 1024 * 1024;

/// How much of a larger file is kept, enough to tell what it is.
const HEAD_BYTES: usize = 256 * 1024;

/// What was kept of a file.
#[derive(Clone, Debug)]
pub enum Contents {
    /// All of it.
    Whole(Vec<u8>),
    /// Only its beginning, because it is larger than [`FILE_CAP_BYTES`].
    Head(Vec<u8>),
}

/// A file as read.
#[derive(Clone, Debug)]
pub struct FileBytes {
    /// Bytes kept.
    pub contents: Contents,
    /// Size, bytes.
    pub size_bytes: u64,
    /// SHA-256 of the whole file, hex.
    pub sha256: String,
}

impl Contents {
    /// The bytes kept.
    #[must_use]
    pub fn bytes(&self) -> &[u8] {
        match self {
            Self::Whole(bytes) | Self::Head(bytes) => bytes,
        }
    }
}

/// Reads and fingerprints a file.
///
/// # Errors
/// What the operating system says.
pub fn read_file(path: &Path) -> io::Result<FileBytes> {
    let mut file = File::open(path)?;
    // One byte over the cap tells a file that is too large, whatever its metadata say.
    let mut bytes = Vec::new();
    file.by_ref()
        .take(FILE_CAP_BYTES + 1)
        .read_to_end(&mut bytes)?;
    let mut hash = Sha256::new();
    hash.update(&bytes);
    let mut size_bytes = bytes.len() as u64;
    let contents = if size_bytes > FILE_CAP_BYTES {
        bytes.truncate(HEAD_BYTES);
        bytes.shrink_to_fit();
        let mut block = vec![0_u8; 1024 * 1024];
        loop {
            let count = file.read(&mut block)?;
            if count == 0 {
                break;
            }
            hash.update(&block[..count]);
            size_bytes += count as u64;
        }
        Contents::Head(bytes)
    } else {
        Contents::Whole(bytes)
    };
    Ok(FileBytes {
        contents,
        size_bytes,
        sha256: hex(&hash.finalize()),
    })
}
