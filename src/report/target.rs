//! What stands in the folder that a report is to go to: nothing, an earlier
//! report, also one whose renaming was interrupted, or something that is not
//! ours to replace. Nothing is written here.

use std::fs::{self, File};
use std::io::{self, Read};
use std::path::Path;

use super::folder::{
    AUDIT_JSON, BEAMS_CSV, FILES_CSV, FINDINGS_CSV, PLANS_CSV, REPORT_FILES, REPORT_HTML, fault,
    is_temporary,
};
use super::table::{BEAM_COLUMNS, FILE_COLUMNS, FINDING_COLUMNS, PLAN_COLUMNS, header};
use super::{ReportError, SCHEMA_FAMILY};

/// So much of a file shows whether it is ours.
const BEGINNING_BYTES: u64 = 4096;

/// What stands in a folder that a report is to be written to.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum TargetState {
    /// There is no such folder.
    Absent,
    /// Nothing but, at most, temporary files that an interrupted audit left behind.
    Empty,
    /// A report of this program and nothing else: it may be replaced.
    EarlierReport,
    /// Something else: not to be written to unless the user insists.
    Foreign {
        /// Name of a file that is not ours (the first by name), or of the folder when it is no folder.
        example: String,
    },
}

/// What stands in `folder`. Only names are looked at, and the first bytes of files with a report's names.
///
/// # Errors
/// When the folder cannot be listed or a file with a report's name cannot be read.
pub fn target_state(folder: &Path) -> Result<TargetState, ReportError> {
    let fault = |source| fault(folder, "read", source);
    match fs::metadata(folder) {
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(TargetState::Absent),
        Err(error) => return Err(fault(error)),
        Ok(metadata) if !metadata.is_dir() => {
            return Ok(TargetState::Foreign {
                example: folder.display().to_string(),
            });
        }
        Ok(_) => {}
    }
    let mut names = Vec::new();
    for item in fs::read_dir(folder).map_err(fault)? {
        let item = item.map_err(fault)?;
        let name = item.file_name().to_string_lossy().into_owned();
        let plain_file = item.file_type().map_err(fault)?.is_file();
        if !(plain_file && is_temporary(&name)) {
            names.push((name, plain_file));
        }
    }
    if names.is_empty() {
        return Ok(TargetState::Empty);
    }
    names.sort();
    let foreign = names
        .iter()
        .find(|(name, plain_file)| !plain_file || !REPORT_FILES.contains(&name.as_str()));
    if let Some((name, _)) = foreign {
        return Ok(TargetState::Foreign {
            example: name.clone(),
        });
    }
    // The mark says that all is ours. Without it an audit was interrupted while it gave
    // its files their names: then each has to show that it is ours.
    let marked = names.iter().any(|(name, _)| name == AUDIT_JSON);
    for (name, _) in &names {
        let looked_at = !marked || name == AUDIT_JSON;
        if looked_at && !is_ours(folder, name)? {
            return Ok(TargetState::Foreign {
                example: name.clone(),
            });
        }
    }
    Ok(TargetState::EarlierReport)
}

/// Whether a file with a report's name begins as ours do.
fn is_ours(folder: &Path, name: &str) -> Result<bool, ReportError> {
    let path = folder.join(name);
    let mut beginning = Vec::new();
    File::open(&path)
        .and_then(|file| file.take(BEGINNING_BYTES).read_to_end(&mut beginning))
        .map_err(|error| fault(&path, "read", error))?;
    let beginning = String::from_utf8_lossy(&beginning);
    let begins_with = |columns: Vec<&str>| beginning.starts_with(&columns.join(","));
    Ok(match name {
        AUDIT_JSON => beginning.starts_with(&format!("{{\"schema\":\"{SCHEMA_FAMILY}")),
        BEAMS_CSV => begins_with(header(BEAM_COLUMNS)),
        PLANS_CSV => begins_with(header(PLAN_COLUMNS)),
        FINDINGS_CSV => begins_with(header(FINDING_COLUMNS)),
        FILES_CSV => begins_with(header(FILE_COLUMNS)),
        REPORT_HTML => beginning.contains("<meta name=\"generator\" content=\"Counterfoil "),
        _ => false,
    })
}
