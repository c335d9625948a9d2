//! The user's depth table: one row a beam, from CSV.

use std::collections::HashSet;
use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use serde::Deserialize;
use thiserror::Error;

use crate::dose::DepthRow;
use crate::quantity::{Quantity, sha256_hex};

/// Largest table that is read: more than half a million rows.
const FILE_LIMIT_BYTES: u64 = 64 * 1024 * 1024;

const COLUMNS: [&str; 6] = [
    "sop_instance_uid",
    "beam_number",
    "depth_cm",
    "effective_depth_cm",
    "ssd_cm",
    "independent",
];

/// Why a depth table was refused.
#[derive(Debug, Error)]
pub enum DepthTableError {
    /// It could not be opened.
    #[error("depth table {file}: cannot be read")]
    Unreadable {
        /// The file.
        file: String,
        /// Cause.
        source: std::io::Error,
    },
    /// A row is not what it must be.
    #[error("depth table {file}, line {line}: {message}")]
    Row {
        /// The file.
        file: String,
        /// The line, from 1.
        line: u64,
        /// What is wrong.
        message: String,
    },
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct RawRow {
    sop_instance_uid: String,
    beam_number: i32,
    depth_cm: f64,
    effective_depth_cm: Option<f64>,
    ssd_cm: Option<f64>,
    independent: String,
}

/// A depth table as read.
#[derive(Clone, Debug, Default)]
pub struct DepthTable {
    /// Its rows.
    pub rows: Vec<DepthRow>,
    /// SHA-256 of the bytes that the rows were read from, hex.
    pub sha256: String,
}

/// Reads a depth table: header `sop_instance_uid, beam_number, depth_cm,
/// effective_depth_cm, ssd_cm, independent`, depths along the ray from the
/// source to the dose point, `independent` yes or no.
///
/// # Errors
/// When a row cannot be read, is not credible, or names a beam twice.
pub fn read_depth_table(path: &Path) -> Result<DepthTable, DepthTableError> {
    let file = path.display().to_string();
    // Once: a pipe gives its bytes only once, and a file may change between two readings.
    let bytes = read_bounded(path).map_err(|source| DepthTableError::Unreadable {
        file: file.clone(),
        source,
    })?;
    let mut table = csv::ReaderBuilder::new()
        .trim(csv::Trim::All)
        .comment(Some(b'#'))
        .from_reader(bytes.as_slice());
    let header_fault = |message: String| DepthTableError::Row {
        file: file.clone(),
        line: 1,
        message,
    };
    let header = table
        .headers()
        .map_err(|error| header_fault(error.to_string()))?
        .clone();
    check_header(&header).map_err(header_fault)?;
    let mut rows = Vec::new();
    let mut seen = HashSet::new();
    let mut record = csv::StringRecord::new();
    loop {
        let refuse = |line: u64, message: String| DepthTableError::Row {
            file: file.clone(),
            line,
            message,
        };
        let more = table.read_record(&mut record).map_err(|error| {
            let line = error.position().map_or(0, csv::Position::line);
            refuse(line, error.to_string())
        })?;
        if !more {
            return Ok(DepthTable {
                rows,
                sha256: sha256_hex(&bytes),
            });
        }
        let line = record.position().map_or(0, csv::Position::line);
        let raw: RawRow = record
            .deserialize(Some(&header))
            .map_err(|error| refuse(line, error.to_string()))?;
        let row = check(raw).map_err(|message| refuse(line, message))?;
        if !seen.insert((row.sop_instance_uid.clone(), row.beam_number)) {
            return Err(refuse(
                line,
                format!(
                    "beam {} of this plan stands twice in the table",
                    row.beam_number
                ),
            ));
        }
        rows.push(row);
    }
}

/// Without a header the first row would be taken for one, and its depths lost.
fn check_header(header: &csv::StringRecord) -> Result<(), String> {
    match COLUMNS
        .iter()
        .find(|&&column| !header.iter().any(|name| name == column))
    {
        None => Ok(()),
        Some(missing) => Err(format!(
            "the header has no column {missing}; it must name {}, separated by commas",
            COLUMNS.join(", ")
        )),
    }
}

fn read_bounded(path: &Path) -> io::Result<Vec<u8>> {
    let mut bytes = Vec::new();
    File::open(path)?
        .take(FILE_LIMIT_BYTES + 1)
        .read_to_end(&mut bytes)?;
    if bytes.len() as u64 > FILE_LIMIT_BYTES {
        return Err(io::Error::other(format!(
            "larger than {FILE_LIMIT_BYTES} bytes; give a table for the plans of this run"
        )));
    }
    Ok(bytes)
}

fn check(raw: RawRow) -> Result<DepthRow, String> {
    let depths = [Some(raw.depth_cm), raw.effective_depth_cm];
    for depth_cm in depths.into_iter().flatten() {
        if let Some(objection) = Quantity::Depth.objection(depth_cm) {
            return Err(objection);
        }
    }
    if let Some(objection) = raw
        .ssd_cm
        .and_then(|ssd_cm| Quantity::SourceSurfaceDistance.objection(ssd_cm))
    {
        return Err(objection);
    }
    let independent = match raw.independent.to_ascii_lowercase().as_str() {
        "yes" => true,
        "no" => false,
        other => return Err(format!("independent is {other:?}, must be yes or no")),
    };
    Ok(DepthRow {
        sop_instance_uid: raw.sop_instance_uid,
        beam_number: raw.beam_number,
        depth_cm: raw.depth_cm,
        effective_depth_cm: raw.effective_depth_cm,
        ssd_cm: raw.ssd_cm,
        independent,
    })
}
