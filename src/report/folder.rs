//! The folder of a report while it is written: temporary files, one writer at
//! a time, and the order of renaming that makes `audit.json` the mark of a
//! complete report. What may be replaced is decided in `target`, what the files
//! hold is written elsewhere.

use std::fs::{self, File, TryLockError};
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

use tempfile::{Builder, NamedTempFile};

use super::ReportError;

/// The record of everything; its presence marks a complete report.
pub(super) const AUDIT_JSON: &str = "audit.json";
/// One row per beam.
pub(super) const BEAMS_CSV: &str = "beams.csv";
/// One row per plan.
pub(super) const PLANS_CSV: &str = "plans.csv";
/// One row per finding.
pub(super) const FINDINGS_CSV: &str = "findings.csv";
/// One row per file.
pub(super) const FILES_CSV: &str = "files.csv";
/// The page.
pub(super) const REPORT_HTML: &str = "report.html";

/// Every file of a report, in the order of renaming.
pub const REPORT_FILES: [&str; 6] = [
    BEAMS_CSV,
    PLANS_CSV,
    FINDINGS_CSV,
    FILES_CSV,
    REPORT_HTML,
    AUDIT_JSON,
];

const TEMPORARY_PREFIX: &str = ".counterfoil-";
const TEMPORARY_SUFFIX: &str = ".tmp";

pub(super) fn is_temporary(name: &str) -> bool {
    name.starts_with(TEMPORARY_PREFIX) && name.ends_with(TEMPORARY_SUFFIX)
}

pub(super) fn fault(path: &Path, action: &'static str, source: io::Error) -> ReportError {
    ReportError::Io {
        path: path.to_path_buf(),
        action,
        source,
    }
}

/// The folder while a report is written into it. Dropped without `keep`, it
/// disappears again when this run made it and nothing stands in it.
#[derive(Debug)]
pub(super) struct ReportFolder {
    path: PathBuf,
    remove_when_dropped: bool,
    /// Held while this run writes; the system lets go of it however the run ends.
    _lock: Option<File>,
}

impl ReportFolder {
    /// Opens the folder, creates it when absent (readable by its owner alone),
    /// and clears temporary files that an interrupted audit left behind.
    pub(super) fn open(path: &Path) -> Result<Self, ReportError> {
        let created = if path.is_dir() {
            false
        } else {
            match create_private(path) {
                Ok(()) => true,
                // Another run was a moment faster.
                Err(_) if path.is_dir() => false,
                Err(error) => return Err(fault(path, "created", error)),
            }
        };
        let lock = lock(path)?;
        for item in fs::read_dir(path).map_err(|error| fault(path, "read", error))? {
            let item = item.map_err(|error| fault(path, "read", error))?;
            if is_temporary(&item.file_name().to_string_lossy()) {
                let left_behind = item.path();
                fs::remove_file(&left_behind)
                    .map_err(|error| fault(&left_behind, "removed", error))?;
            }
        }
        Ok(Self {
            path: path.to_path_buf(),
            remove_when_dropped: created,
            _lock: lock,
        })
    }

    pub(super) fn path(&self) -> &Path {
        &self.path
    }

    /// A temporary file (readable by its owner alone) that will become `name`.
    pub(super) fn file(&self, name: &'static str) -> Result<PendingFile, ReportError> {
        let path = self.path.join(name);
        let file = Builder::new()
            .prefix(TEMPORARY_PREFIX)
            .suffix(TEMPORARY_SUFFIX)
            .tempfile_in(&self.path)
            .map_err(|error| fault(&path, "created", error))?;
        Ok(PendingFile {
            path,
            out: BufWriter::with_capacity(64 * 1024, file),
        })
    }

    /// Renames the files in the order given. An earlier report's `audit.json`
    /// goes first and the new one must be last in `files`, so that its presence
    /// marks a complete report.
    pub(super) fn publish(mut self, files: Vec<PendingFile>) -> Result<Vec<PathBuf>, ReportError> {
        let mut ready = Vec::new();
        for file in files {
            ready.push(file.close()?);
        }
        for (path, _) in &ready {
            // Seen before anything is renamed, so that an earlier report stays whole.
            if path.is_dir() {
                let error = io::Error::from(io::ErrorKind::IsADirectory);
                return Err(fault(path, "replaced", error));
            }
        }
        let mark = self.path.join(AUDIT_JSON);
        match fs::remove_file(&mark) {
            Err(error) if error.kind() != io::ErrorKind::NotFound => {
                return Err(fault(&mark, "replaced", error));
            }
            _ => {}
        }
        self.remove_when_dropped = false;
        let mut written = Vec::new();
        for (path, file) in ready {
            file.persist(&path)
                .map_err(|error| fault(&path, "renamed into place", error.error))?;
            written.push(path);
        }
        Ok(written)
    }
}

/// Keeps a second run from clearing away this one's temporary files. The lock
/// is on the folder itself; where a system has no such lock there is none.
fn lock(path: &Path) -> Result<Option<File>, ReportError> {
    let Ok(folder) = File::open(path) else {
        return Ok(None);
    };
    match folder.try_lock() {
        Ok(()) => Ok(Some(folder)),
        Err(TryLockError::WouldBlock) => Err(ReportError::Busy {
            path: path.to_path_buf(),
        }),
        Err(TryLockError::Error(_)) => Ok(None),
    }
}

impl Drop for ReportFolder {
    fn drop(&mut self) {
        if self.remove_when_dropped {
            // Fails when something stands in it, which is then somebody else's.
            let _ = fs::remove_dir(&self.path);
        }
    }
}

#[cfg(unix)]
fn create_private(path: &Path) -> io::Result<()> {
    use std::os::unix::fs::DirBuilderExt;
    if let Some(parent) = path.parent() {
        fs::create_dir_all(parent)?;
    }
    fs::DirBuilder::new().mode(0o700).create(path)
}

#[cfg(not(unix))]
fn create_private(path: &Path) -> io::Result<()> {
    fs::create_dir_all(path)
}

/// A file under its temporary name.
#[derive(Debug)]
pub(super) struct PendingFile {
    path: PathBuf,
    out: BufWriter<NamedTempFile>,
}

impl PendingFile {
    /// The name it will have.
    pub(super) fn path(&self) -> &Path {
        &self.path
    }

    pub(super) fn put(&mut self, bytes: &[u8]) -> Result<(), ReportError> {
        self.out
            .write_all(bytes)
            .map_err(|error| fault(&self.path, "written", error))
    }

    fn close(self) -> Result<(PathBuf, NamedTempFile), ReportError> {
        let Self { path, out } = self;
        let file = out
            .into_inner()
            .map_err(|error| fault(&path, "written", error.into_error()))?;
        file.as_file()
            .sync_all()
            .map_err(|error| fault(&path, "written", error))?;
        Ok((path, file))
    }
}

impl Write for PendingFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.out.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.out.flush()
    }
}
