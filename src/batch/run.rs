//! The run itself: survey, then audit in windows of files, each window in
//! parallel and written in order, so that memory does not grow with the number
//! of files and the bytes do not depend on the number of threads.

use std::collections::BTreeSet;
use std::ops::Range;
use std::path::Path;

use rayon::prelude::*;
use thiserror::Error;

use super::depth_rows::{RowsByPlan, UnusedRows};
use super::fate::{Fate, fates};
use super::one_file::one_file;
use super::record::{model_uses, run_id, run_record};
use super::summary::Tally;
use super::survey::{Seen, Surveyed, survey};
use crate::audit::{FileEntry, ModelUse, PlanEntry, RunSummary};
use crate::beam_model::ModelSet;
use crate::dose::DepthRow;
use crate::intake::Found;
use crate::plan::FileKind;
use crate::report::{ReportError, ReportWriter, Written};
use crate::settings::{Site, SiteSource};

/// Files in one window: enough to keep every thread busy, few enough to hold.
const WINDOW_FILES: usize = 256;

/// Size of the plans in one window: what becomes of a plan may be several times as large.
const WINDOW_BYTES: u64 = 16 * 1024 * 1024;

/// A reader's worst case is bounded depth; this leaves room for it on every thread.
const STACK_BYTES: usize = 8 * 1024 * 1024;

/// What the outputs say about the run besides its results.
#[derive(Clone, Debug)]
pub struct RunFacts {
    /// Version of the program.
    pub version: String,
    /// Start, with its zone.
    pub started: jiff::ZonedDateTime,
    /// Paths as typed.
    pub inputs: Vec<String>,
    /// Options as lines; none may depend on the number of threads.
    pub options: Vec<String>,
    /// Where the site settings came from.
    pub site_source: SiteSource,
}

/// What to run.
#[derive(Clone, Copy)]
pub struct BatchRequest<'a> {
    /// What was found, in order.
    pub found: &'a [Found],
    /// The models.
    pub models: &'a ModelSet,
    /// The site's rules.
    pub site: &'a Site,
    /// The user's depth table.
    pub depth_rows: &'a [DepthRow],
    /// Where the report goes.
    pub report_folder: &'a Path,
    /// Threads; `None` for one a core.
    pub jobs: Option<usize>,
    /// For the outputs.
    pub facts: &'a RunFacts,
    /// The exit status in words, from the counts.
    pub exit_words: fn(&Tally, &[ModelUse]) -> String,
}

/// How far a run is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Progress {
    /// The survey of this many files begins.
    SurveyOf(u64),
    /// One file was surveyed.
    Surveyed,
    /// The audit of this many files begins.
    AuditOf(u64),
    /// One file is done.
    Audited,
}

/// What came of a run.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// Counts.
    pub tally: Tally,
    /// The summary that the report carries.
    pub summary: RunSummary,
    /// The models on offer.
    pub models: Vec<ModelUse>,
    /// The files written.
    pub written: Written,
}

/// Why a run failed as a whole.
#[derive(Debug, Error)]
pub enum BatchError {
    /// No file is, or may be, a plan.
    #[error("nothing to audit: no RT Plan among the files looked at (files: {files})")]
    NothingToAudit {
        /// Files looked at.
        files: usize,
    },
    /// Rows of the depth table that no beam used.
    #[error(
        "depth table: no plan of this run has {rows}; correct the table, or leave the rows out"
    )]
    UnusedDepthRows {
        /// The rows, in words.
        rows: String,
    },
    /// The report could not be written.
    #[error(transparent)]
    Report(#[from] ReportError),
    /// The threads could not be started.
    #[error("the worker threads could not be started")]
    Threads(#[from] rayon::ThreadPoolBuildError),
}

/// Runs.
///
/// # Errors
/// When there is nothing to audit, the depth table does not fit, or the report cannot be written.
pub fn run(
    request: BatchRequest<'_>,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Outcome, BatchError> {
    let mut threads = rayon::ThreadPoolBuilder::new().stack_size(STACK_BYTES);
    if let Some(jobs) = request.jobs {
        threads = threads.num_threads(jobs);
    }
    threads.build()?.install(|| run_here(request, progress))
}

fn run_here(
    request: BatchRequest<'_>,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Outcome, BatchError> {
    progress(Progress::SurveyOf(request.found.len() as u64));
    let files: Vec<Surveyed> = request
        .found
        .par_iter()
        .map(|found| {
            let surveyed = survey(found);
            progress(Progress::Surveyed);
            surveyed
        })
        .collect();
    if !files.iter().any(may_be_plan) {
        return Err(BatchError::NothingToAudit { files: files.len() });
    }
    let fates = fates(&files);

    let day = request.facts.started.date();
    let models: Vec<ModelUse> = model_uses(request.models, day);
    let mut run = run_record(request, &models);
    run.run_id = run_id(&run, &files);
    let mut writer = ReportWriter::create(request.report_folder, &run)?;
    let mut tally = Tally::default();
    let rows = RowsByPlan::new(request.depth_rows);
    let mut unused_rows = UnusedRows::new(request.depth_rows);

    progress(Progress::AuditOf(files.len() as u64));
    let work = |window: Range<usize>| -> Vec<(FileEntry, Option<PlanEntry>)> {
        window
            .into_par_iter()
            .map(|index| {
                let result = one_file(request, &rows, &files, index, &fates[index]);
                progress(Progress::Audited);
                result
            })
            .collect()
    };
    let mut write = |results: Vec<(FileEntry, Option<PlanEntry>)>| -> Result<(), ReportError> {
        for (file, plan) in results {
            tally.file(&file);
            writer.file(&file)?;
            if let Some(plan) = plan {
                unused_rows.strike(&plan);
                tally.plan(&plan, &models_of(&plan, request.models));
                writer.plan(&plan)?;
            }
        }
        Ok(())
    };
    // One window is written while the next is worked on.
    let mut done = Vec::new();
    for window in windows(&files, &fates) {
        let (written, next) = rayon::join(|| write(done), || work(window));
        written?;
        done = next;
    }
    write(done)?;
    if let Some(rows) = unused_rows.in_words() {
        return Err(BatchError::UnusedDepthRows { rows });
    }

    let summary = tally.summary(
        &models,
        request.site.checks.off.clone(),
        (request.exit_words)(&tally, &models),
    );
    let written = writer.finish(&summary)?;
    Ok(Outcome {
        tally,
        summary,
        models,
        written,
    })
}

/// Runs of files whose results are held together, bounded by number and by the size of plans.
fn windows(files: &[Surveyed], fates: &[Fate]) -> Vec<Range<usize>> {
    let mut windows = Vec::new();
    let (mut start, mut bytes) = (0, 0_u64);
    for (index, (file, fate)) in files.iter().zip(fates).enumerate() {
        let size_bytes = match (&file.seen, fate) {
            (Seen::File { size_bytes, .. }, Fate::Audit { .. }) => *size_bytes,
            _ => 0,
        };
        let full = index - start >= WINDOW_FILES || bytes + size_bytes > WINDOW_BYTES;
        if full && index > start {
            windows.push(start..index);
            (start, bytes) = (index, 0);
        }
        bytes += size_bytes;
    }
    windows.push(start..files.len());
    windows
}

/// Whether a file is a plan, or could not be read and so may be one.
fn may_be_plan(file: &Surveyed) -> bool {
    match &file.seen {
        Seen::Unreadable(_) => true,
        Seen::PassedOver(_) => false,
        Seen::File { kind, .. } => matches!(kind, FileKind::Plan),
    }
}

fn models_of(plan: &PlanEntry, models: &ModelSet) -> Vec<String> {
    let names: BTreeSet<String> = plan
        .beams
        .iter()
        .filter(|beam| beam.calculation.is_calculated())
        .filter_map(|beam| models.machine_for(beam.machine.as_deref()?))
        .map(|model| model.name.clone())
        .collect();
    names.into_iter().collect()
}

#[cfg(test)]
mod tests {
    use super::{WINDOW_BYTES, WINDOW_FILES, windows};
    use crate::audit::Rivals;
    use crate::batch::fate::Fate;
    use crate::batch::survey::{Seen, Surveyed};
    use crate::plan::FileKind;

    fn plans(sizes_bytes: &[u64]) -> Vec<std::ops::Range<usize>> {
        let files: Vec<Surveyed> = sizes_bytes
            .iter()
            .map(|&size_bytes| Surveyed {
                path: "a".into(),
                seen: Seen::File {
                    size_bytes,
                    sha256: String::new(),
                    kind: FileKind::Plan,
                    sop_instance_uid: None,
                    message: None,
                },
            })
            .collect();
        let audit = Fate::Audit {
            rivals: Rivals::default(),
        };
        windows(&files, &vec![audit; files.len()])
    }

    #[test]
    fn verify_windows_are_bounded_by_number_and_by_size() {
        assert_eq!(plans(&[1, 1, 1]).len(), 1);
        assert_eq!(
            plans(&vec![1; WINDOW_FILES + 1]),
            [0..WINDOW_FILES, WINDOW_FILES..WINDOW_FILES + 1]
        );
        // A plan larger than the bound has a window to itself.
        assert_eq!(
            plans(&[1, 2 * WINDOW_BYTES, 1, WINDOW_BYTES / 2, WINDOW_BYTES / 2]),
            [0..1, 1..2, 2..4, 4..5]
        );
    }
}
