//! What was run and what came out, in finished strings: the top and the end of
//! the page.

use super::words::{Status, counted, status_of_term};
use crate::audit::{Count, ModelUse, Run, RunSummary};
use crate::report::number::{MISSING, short};
use crate::settings::Site;

const INPUTS_SHOWN: usize = 50;

/// What was run.
#[derive(Debug)]
pub(super) struct RunView {
    pub(super) run_id: String,
    pub(super) version: String,
    pub(super) started: String,
    pub(super) inputs: Vec<String>,
    pub(super) options: Vec<String>,
    pub(super) site_source: String,
    pub(super) site_sha256: Option<String>,
    pub(super) levels: Vec<LevelView>,
    pub(super) settings: Vec<SettingView>,
    pub(super) models: Vec<ModelView>,
}

/// Action levels of a group.
#[derive(Debug)]
pub(super) struct LevelView {
    pub(super) group: &'static str,
    pub(super) tolerance: String,
    pub(super) action: String,
    pub(super) basis: String,
}

/// A further setting.
#[derive(Debug)]
pub(super) struct SettingView {
    pub(super) name: &'static str,
    pub(super) value: String,
}

/// A model.
#[derive(Debug)]
pub(super) struct ModelView {
    pub(super) name: String,
    pub(super) serves: String,
    pub(super) origin: &'static str,
    pub(super) provenance: String,
    pub(super) approval: String,
    pub(super) approved: bool,
    pub(super) fingerprint: String,
}

/// The view of a run.
pub(super) fn view(run: &Run) -> RunView {
    RunView {
        run_id: run.run_id.clone(),
        version: run.version.clone(),
        started: readable(&run.started),
        inputs: inputs(&run.inputs),
        options: run.options.clone(),
        site_source: run.site_source.file.as_ref().map_or_else(
            || "built-in defaults (no site file)".to_owned(),
            |file| file.display().to_string(),
        ),
        site_sha256: run.site_source.sha256.clone(),
        levels: levels(&run.site),
        settings: settings(&run.site),
        models: run.models.iter().map(model).collect(),
    }
}

/// A time as people write it; what is no time stays as it is.
fn readable(started: &str) -> String {
    started.parse::<jiff::ZonedDateTime>().map_or_else(
        |_| started.to_owned(),
        |time| time.strftime("%Y-%m-%d %H:%M:%S, UTC%:z").to_string(),
    )
}

/// The paths as typed: the first of them when a shell has spread a pattern.
fn inputs(typed: &[String]) -> Vec<String> {
    let mut shown: Vec<String> = typed.iter().take(INPUTS_SHOWN).cloned().collect();
    if typed.len() > shown.len() {
        let more = (typed.len() - shown.len()) as u64;
        shown.push(format!("and {more} more; audit.json lists them"));
    }
    shown
}

fn levels(site: &Site) -> Vec<LevelView> {
    let levels = &site.action_levels;
    [
        ("open static fields", &levels.static_open),
        ("wedged fields", &levels.wedged),
        ("fields shaped by leaves or blocks", &levels.irregular),
        ("segmented and dynamic fields", &levels.modulated),
        ("arcs", &levels.arc),
        ("electrons", &levels.electron),
    ]
    .into_iter()
    .map(|(group, level)| LevelView {
        group,
        tolerance: short(level.tolerance_percent, 2),
        action: short(level.action_percent, 2),
        basis: level.basis.clone(),
    })
    .collect()
}

fn settings(site: &Site) -> Vec<SettingView> {
    let setting = |name, value| SettingView { name, value };
    let listed = |items: &[String]| {
        if items.is_empty() {
            "none".to_owned()
        } else {
            items.join(", ")
        }
    };
    let severities: Vec<String> = site
        .checks
        .severity
        .iter()
        .map(|(check, severity)| format!("{check}: {}", severity.term()))
        .collect();
    vec![
        setting(
            "both levels widen, when the depth stands on the planning system's word, by",
            format!(
                "{} %",
                short(site.action_levels.dependent_depth_widening_percent, 2)
            ),
        ),
        setting(
            "a beam is judged as a share of the total below",
            format!(
                "{} % of the dose at its point",
                short(site.action_levels.low_weight_share_percent, 2)
            ),
        ),
        setting(
            "a point is at a field edge nearer than",
            format!("{} cm", short(site.technical.edge_margin_cm, 2)),
        ),
        setting(
            "depths and SSDs of one point may differ by",
            format!("{} mm", short(site.technical.depth_disagreement_mm, 2)),
        ),
        setting(
            "uncertainty of a depth, 1 standard deviation",
            format!(
                "table {} mm, plan {} mm, SSD {} mm",
                short(site.depth_uncertainty.table_mm, 2),
                short(site.depth_uncertainty.plan_mm, 2),
                short(site.depth_uncertainty.ssd_mm, 2)
            ),
        ),
        setting(
            "the isocentre serves as the point for",
            listed(&site.point.isocentre_serves_for),
        ),
        setting("severities changed", listed(&severities)),
        setting("plans shown in full", site.report.plans_in_full.to_string()),
    ]
}

fn model(model: &ModelUse) -> ModelView {
    ModelView {
        name: model.name.clone(),
        serves: model.serves.join(", "),
        origin: model.origin,
        provenance: model.provenance.clone(),
        approval: model.approval.clone(),
        approved: model.approved,
        fingerprint: model.fingerprint.clone(),
    }
}

/// Counts of one kind.
#[derive(Debug)]
pub(super) struct CountsView {
    pub(super) title: &'static str,
    pub(super) total: u64,
    pub(super) counts: Vec<CountView>,
}

/// One count.
#[derive(Debug)]
pub(super) struct CountView {
    pub(super) count: u64,
    pub(super) status: Option<Status>,
    pub(super) term: &'static str,
}

/// The summary's counts.
pub(super) fn counts(summary: &RunSummary) -> Vec<CountsView> {
    let view = |title, counts: &[Count]| CountsView {
        title,
        total: counts.iter().map(|count| count.count).sum(),
        counts: counts
            .iter()
            .filter(|count| count.count > 0)
            .map(|count| CountView {
                count: count.count,
                status: status_of_term(count.term),
                term: count.term,
            })
            .collect(),
    };
    vec![
        view("plans", &summary.plans),
        view("beams", &summary.beams),
        view("findings", &summary.findings),
        view("files", &summary.files),
    ]
}

/// What is stamped on the page.
#[derive(Debug)]
pub(super) struct Stamp {
    pub(super) title: &'static str,
    pub(super) text: String,
}

/// The stamps: invented models, models without approval.
pub(super) fn stamps(summary: &RunSummary) -> Vec<Stamp> {
    let mut stamps = Vec::new();
    let listed = |models: &[String]| {
        let count = models.len() as u64;
        format!(
            "{}: {}",
            counted(count, "model", "models"),
            models.join(", ")
        )
    };
    if !summary.invented_models.is_empty() {
        stamps.push(Stamp {
            title: "Demonstration data, not for clinical use",
            text: format!(
                "The numbers of this report rest on invented data ({}). They say nothing about any real machine.",
                listed(&summary.invented_models)
            ),
        });
    }
    if !summary.unapproved_models.is_empty() {
        stamps.push(Stamp {
            title: "Model not approved",
            text: format!(
                "Not approved on the day of the run: {}. Nobody has answered for these data.",
                listed(&summary.unapproved_models)
            ),
        });
    }
    stamps
}

/// Items in one line, or a dash.
pub(super) fn listed_or_dash(items: &[String]) -> String {
    if items.is_empty() {
        MISSING.to_owned()
    } else {
        items.join(", ")
    }
}
