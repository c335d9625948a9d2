//! The one way to write a report: entries in file order in, a folder of six
//! files out, whole or not at all. It holds no plan longer than the page needs
//! it. What the rows and the page say is decided elsewhere.

use std::path::{Path, PathBuf};

use super::ReportError;
use super::folder::{
    BEAMS_CSV, FILES_CSV, FINDINGS_CSV, PLANS_CSV, PendingFile, REPORT_HTML, ReportFolder, fault,
};
use super::json::JsonRecord;
use super::page::PageRecord;
use super::table::{
    BEAM_COLUMNS, BeamRow, FILE_COLUMNS, FINDING_COLUMNS, FileRow, FindingRow, PLAN_COLUMNS,
    PlanRow, header, render,
};
use crate::audit::{FileEntry, PlanEntry, Run, RunSummary};

/// A report while it is written. Dropped without `finish`, it leaves no
/// temporary file and an earlier report untouched.
#[derive(Debug)]
pub struct ReportWriter {
    run_id: String,
    beams: CsvTable,
    plans: CsvTable,
    findings: CsvTable,
    files: CsvTable,
    json: JsonRecord,
    page: PageRecord,
    // Last, so that the temporary files are gone when the folder's guard looks.
    folder: ReportFolder,
}

/// What was written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Written {
    /// The files, in the order in which they took their names.
    pub files: Vec<PathBuf>,
}

impl ReportWriter {
    /// Opens temporary files in `folder`, which is created when absent. Files
    /// and a created folder are readable by their owner alone.
    ///
    /// # Errors
    /// When the folder or a file in it cannot be created.
    pub fn create(folder: &Path, run: &Run) -> Result<Self, ReportError> {
        let folder = ReportFolder::open(folder)?;
        Ok(Self {
            run_id: run.run_id.clone(),
            beams: CsvTable::create(&folder, BEAMS_CSV, &header(BEAM_COLUMNS))?,
            plans: CsvTable::create(&folder, PLANS_CSV, &header(PLAN_COLUMNS))?,
            findings: CsvTable::create(&folder, FINDINGS_CSV, &header(FINDING_COLUMNS))?,
            files: CsvTable::create(&folder, FILES_CSV, &header(FILE_COLUMNS))?,
            json: JsonRecord::create(&folder, run)?,
            page: PageRecord::create(&folder, run)?,
            folder,
        })
    }

    /// Adds a file that was looked at.
    ///
    /// # Errors
    /// When a row cannot be written.
    pub fn file(&mut self, entry: &FileEntry) -> Result<(), ReportError> {
        let row = FileRow {
            run_id: &self.run_id,
            file: entry,
        };
        self.files.row(&render(FILE_COLUMNS, |cell| cell(&row)))?;
        self.json.file(entry)?;
        self.page.file(entry);
        Ok(())
    }

    /// Adds a plan with its beams and findings.
    ///
    /// # Errors
    /// When a row cannot be written.
    pub fn plan(&mut self, entry: &PlanEntry) -> Result<(), ReportError> {
        let run_id = &self.run_id;
        let row = PlanRow {
            run_id,
            plan: entry,
        };
        self.plans.row(&render(PLAN_COLUMNS, |cell| cell(&row)))?;
        for beam in &entry.beams {
            let row = BeamRow {
                run_id,
                plan: entry,
                beam,
            };
            self.beams.row(&render(BEAM_COLUMNS, |cell| cell(&row)))?;
        }
        for finding in &entry.findings {
            let row = FindingRow {
                run_id,
                plan: entry,
                finding,
            };
            self.findings
                .row(&render(FINDING_COLUMNS, |cell| cell(&row)))?;
        }
        self.json.plan(entry)?;
        self.page.plan(entry)
    }

    /// Renders the page and gives every file its name, `audit.json` last.
    ///
    /// # Errors
    /// When the page cannot be rendered or a file cannot be written or renamed.
    pub fn finish(self, summary: &RunSummary) -> Result<Written, ReportError> {
        // The folder's guard first: bindings go in reverse order, and it must look last.
        let Self {
            folder,
            beams,
            plans,
            findings,
            files,
            json,
            page,
            ..
        } = self;
        let mut html = folder.file(REPORT_HTML)?;
        page.render(summary, &mut html)?;
        let pending = vec![
            beams.close()?,
            plans.close()?,
            findings.close()?,
            files.close()?,
            html,
            json.finish(summary)?,
        ];
        let files = folder.publish(pending)?;
        Ok(Written { files })
    }
}

/// A CSV file under its temporary name.
#[derive(Debug)]
struct CsvTable {
    path: PathBuf,
    rows: csv::Writer<PendingFile>,
}

impl CsvTable {
    fn create(
        folder: &ReportFolder,
        name: &'static str,
        header: &[&str],
    ) -> Result<Self, ReportError> {
        let file = folder.file(name)?;
        let mut table = Self {
            path: file.path().to_path_buf(),
            // RFC 4180: lines end with CR LF.
            rows: csv::WriterBuilder::new()
                .terminator(csv::Terminator::CRLF)
                .from_writer(file),
        };
        table.row(header)?;
        Ok(table)
    }

    fn row<T: AsRef<[u8]>>(&mut self, cells: &[T]) -> Result<(), ReportError> {
        self.rows
            .write_record(cells)
            .map_err(|source| ReportError::Csv {
                path: self.path.clone(),
                source,
            })
    }

    fn close(self) -> Result<PendingFile, ReportError> {
        let path = self.path;
        self.rows
            .into_inner()
            .map_err(|error| fault(&path, "written", error.into_error()))
    }
}
