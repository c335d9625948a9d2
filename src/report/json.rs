//! `audit.json`, written piece by piece: one line per plan and per file, so
//! that no part is ever held whole. Numbers are unrounded; what is not a number
//! is null. Which records there are is decided by `audit`.

use std::fs::File;
use std::io::{self, BufReader, BufWriter, Seek, Write};

use serde::Serialize;

use super::folder::{AUDIT_JSON, PendingFile, ReportFolder, fault};
use super::{ReportError, SCHEMA};
use crate::audit::{FileEntry, PlanEntry, Run, RunSummary};

/// The record while it grows. Files arrive between plans and wait in a
/// nameless temporary file until the plans are complete.
#[derive(Debug)]
pub(super) struct JsonRecord {
    out: PendingFile,
    files: BufWriter<File>,
    plans_written: bool,
    files_written: bool,
}

impl JsonRecord {
    pub(super) fn create(folder: &ReportFolder, run: &Run) -> Result<Self, ReportError> {
        let mut out = folder.file(AUDIT_JSON)?;
        out.put(format!("{{\"schema\":\"{SCHEMA}\",\n\"run\":").as_bytes())?;
        record(&mut out, run)?;
        out.put(b",\n\"plans\":[")?;
        let files = tempfile::tempfile_in(folder.path())
            .map_err(|error| fault(folder.path(), "used for temporary files", error))?;
        Ok(Self {
            out,
            files: BufWriter::new(files),
            plans_written: false,
            files_written: false,
        })
    }

    pub(super) fn plan(&mut self, entry: &PlanEntry) -> Result<(), ReportError> {
        self.out.put(separator(self.plans_written))?;
        self.plans_written = true;
        record(&mut self.out, entry)
    }

    pub(super) fn file(&mut self, entry: &FileEntry) -> Result<(), ReportError> {
        let path = self.out.path();
        self.files
            .write_all(separator(self.files_written))
            .map_err(|error| fault(path, "written", error))?;
        self.files_written = true;
        serde_json::to_writer(&mut self.files, entry).map_err(|source| ReportError::Json {
            path: path.to_path_buf(),
            source,
        })
    }

    /// Closes the record and hands back its file.
    pub(super) fn finish(self, summary: &RunSummary) -> Result<PendingFile, ReportError> {
        let Self { mut out, files, .. } = self;
        out.put(b"\n],\n\"files\":[")?;
        let path = out.path().to_path_buf();
        let mut files = files
            .into_inner()
            .map_err(|error| fault(&path, "written", error.into_error()))?;
        files
            .rewind()
            .and_then(|()| io::copy(&mut BufReader::new(files), &mut out))
            .map_err(|error| fault(&path, "written", error))?;
        out.put(b"\n],\n\"summary\":")?;
        record(&mut out, summary)?;
        out.put(b"}\n")?;
        Ok(out)
    }
}

const fn separator(something_before: bool) -> &'static [u8] {
    if something_before { b",\n" } else { b"\n" }
}

fn record<T: Serialize>(out: &mut PendingFile, value: &T) -> Result<(), ReportError> {
    let path = out.path().to_path_buf();
    serde_json::to_writer(out, value).map_err(|source| ReportError::Json { path, source })
}
