//! The page: what it keeps while plans go by, and in which order its parts are
//! rendered. It keeps the worst plans in full and the worst lines, spools one
//! line per plan, and counts the rest. Parts turn entries into finished
//! strings; templates put them on the page.

mod attention;
mod beam_view;
mod beams_eye;
mod deviation;
mod left_out;
mod moving;
mod outline;
mod parts;
mod plan_view;
mod run_view;
mod shaped_view;
mod style;
mod trace_view;
mod urgency;
mod words;

use std::collections::{BTreeMap, BTreeSet};
use std::fs::File;
use std::io::{BufRead, BufReader, BufWriter, Seek, Write};

use askama::Template;

use super::ReportError;
use super::folder::{PendingFile, ReportFolder, fault};
use crate::audit::{FileEntry, PlanEntry, Run, RunSummary, Verdict};
use crate::dose::ObstacleKind;
use attention::AttentionLine;
use left_out::LeftOut;
use plan_view::PlanLine;
use run_view::RunView;
pub(super) use style::{STYLE, policy};
use urgency::{Class, Urgency, Worst};

/// The page names so many things that need a person; the tables have all.
const ATTENTION_LINES: usize = 2000;

/// The page while it grows.
#[derive(Debug)]
pub(super) struct PageRecord {
    run: RunView,
    lines: Worst<AttentionLine>,
    full: Worst<PlanEntry>,
    spool: BufWriter<File>,
    spool_place: std::path::PathBuf,
    causes: BTreeMap<&'static str, u64>,
    left_out: LeftOut,
    plans: u64,
    unreadable: usize,
}

impl PageRecord {
    pub(super) fn create(folder: &ReportFolder, run: &Run) -> Result<Self, ReportError> {
        let spool = tempfile::tempfile_in(folder.path())
            .map_err(|error| fault(folder.path(), "used for temporary files", error))?;
        Ok(Self {
            run: run_view::view(run),
            lines: Worst::new(ATTENTION_LINES),
            full: Worst::new(run.site.report.plans_in_full),
            spool: BufWriter::new(spool),
            spool_place: folder.path().to_path_buf(),
            causes: BTreeMap::new(),
            left_out: LeftOut::new(),
            plans: 0,
            unreadable: 0,
        })
    }

    pub(super) fn file(&mut self, entry: &FileEntry) {
        self.left_out.file(entry);
        if attention::is_unreadable_plan(entry) {
            // After everything of the plan before it.
            self.unreadable += 1;
            let position = usize::MAX / 2 + self.unreadable;
            let urgency = Urgency::new(Class::NotVerifiable, self.plans, position);
            self.lines.offer(urgency, || attention::file_line(entry));
        }
    }

    pub(super) fn plan(&mut self, entry: &PlanEntry) -> Result<(), ReportError> {
        self.plans += 1;
        let number = self.plans;
        attention::offer_plan(&mut self.lines, entry, number);
        self.full
            .offer(urgency::of_plan(entry, number), || entry.clone());
        for beam in &entry.beams {
            if beam.verdict == Verdict::NotVerifiable {
                let kind = beam.calculation.obstacles.first();
                let cause = cause(kind.map(|obstacle| obstacle.kind));
                *self.causes.entry(cause).or_default() += 1;
            }
        }
        let place = &self.spool_place;
        serde_json::to_writer(&mut self.spool, &plan_view::line(entry, number)).map_err(
            |source| ReportError::Json {
                path: place.clone(),
                source,
            },
        )?;
        self.spool
            .write_all(b"\n")
            .map_err(|error| fault(place, "used for temporary files", error))
    }

    /// Renders the page, part by part.
    pub(super) fn render(
        self,
        summary: &RunSummary,
        out: &mut PendingFile,
    ) -> Result<(), ReportError> {
        let Self {
            run,
            lines,
            full,
            spool,
            spool_place,
            causes,
            left_out,
            plans,
            ..
        } = self;
        let in_full: BTreeSet<u64> = full.iter().map(|(urgency, _)| urgency.entry).collect();
        let top = parts::top(&run, summary, &lines, &causes, &in_full);
        put(out, "the top", &top)?;
        let plan_list = parts::PlanListStart::new(plans, in_full.len() as u64);
        put(out, "the list of plans", &plan_list)?;
        let spool_fault = |error| fault(&spool_place, "used for temporary files", error);
        let mut spool = spool
            .into_inner()
            .map_err(|error| spool_fault(error.into_error()))?;
        spool.rewind().map_err(spool_fault)?;
        for text in BufReader::new(spool).lines() {
            let text = text.map_err(spool_fault)?;
            let line: PlanLine =
                serde_json::from_str(&text).map_err(|source| ReportError::Json {
                    path: spool_place.clone(),
                    source,
                })?;
            put(
                out,
                "a plan's line",
                &parts::PlanLinePart::new(line, &in_full),
            )?;
        }
        put(
            out,
            "the plans in full",
            &parts::PlansInFullStart::new(plans, in_full.len() as u64),
        )?;
        for (urgency, plan) in full.iter() {
            put(out, "a plan", &plan_view::view(plan, urgency.entry))?;
        }
        put(
            out,
            "the end",
            &parts::end(&run, summary, left_out.groups()),
        )
    }
}

fn put<T: Template>(
    out: &mut PendingFile,
    part: &'static str,
    template: &T,
) -> Result<(), ReportError> {
    let text = template.render().map_err(|source| ReportError::Page {
        path: out.path().to_path_buf(),
        part,
        source,
    })?;
    out.put(text.as_bytes())
}

/// Why a beam could not be verified, in words.
const fn cause(kind: Option<ObstacleKind>) -> &'static str {
    match kind {
        Some(ObstacleKind::Reading) => "the file does not say what the calculation needs",
        Some(ObstacleKind::Technique) => "technique or device not covered",
        Some(ObstacleKind::Model) => "no beam model for it",
        Some(ObstacleKind::Meterset) => "no usable meterset",
        Some(ObstacleKind::Point) => "no dose point",
        Some(ObstacleKind::Depth) => "no depth",
        Some(ObstacleKind::PlannedDose) => "no planned dose to compare with",
        Some(
            ObstacleKind::BuildUp
            | ObstacleKind::FieldEdge
            | ObstacleKind::UnderDevice
            | ObstacleKind::TableRange,
        ) => "outside the method's range",
        None => "other, see the beam's reasons",
    }
}
