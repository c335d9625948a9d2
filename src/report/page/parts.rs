//! The parts of the page around the plans in full: structs of finished strings
//! for the templates of the same names.

use std::collections::{BTreeMap, BTreeSet};

use askama::Template;

use super::attention::AttentionLine;
use super::left_out::LeftOutGroup;
use super::plan_view::{PlanLine, beam_anchor, plan_anchor};
use super::run_view::{self, CountsView, RunView, Stamp, listed_or_dash};
use super::style::{STYLE, policy};
use super::urgency::Worst;
use super::words::{Status, counted, status_of_term};
use crate::audit::RunSummary;

/// From the head to what needs a person.
#[derive(Debug, Template)]
#[template(path = "top.html", config = "src/report/askama.toml")]
pub(super) struct Top<'a> {
    policy: String,
    style: &'static str,
    run: &'a RunView,
    stamps: Vec<Stamp>,
    counts: Vec<CountsView>,
    exit: &'a str,
    complete: bool,
    lines: Vec<LinkedLine<'a>>,
    lines_left_out: Option<String>,
    causes: Vec<(&'static str, u64)>,
}

/// A line with its link.
#[derive(Debug)]
struct LinkedLine<'a> {
    line: &'a AttentionLine,
    link: Option<String>,
}

/// The top of the page.
pub(super) fn top<'a>(
    run: &'a RunView,
    summary: &'a RunSummary,
    lines: &'a Worst<AttentionLine>,
    causes: &BTreeMap<&'static str, u64>,
    in_full: &BTreeSet<u64>,
) -> Top<'a> {
    let left_out = lines.left_out();
    let mut causes: Vec<(&'static str, u64)> = causes
        .iter()
        .map(|(cause, count)| (*cause, *count))
        .collect();
    causes.sort_by(|one, other| other.1.cmp(&one.1).then(one.0.cmp(other.0)));
    Top {
        policy: policy(),
        style: STYLE,
        run,
        stamps: run_view::stamps(summary),
        counts: run_view::counts(summary),
        exit: &summary.exit,
        complete: summary.complete,
        lines: lines
            .iter()
            .map(|(_, line)| LinkedLine {
                line,
                link: link(line, in_full),
            })
            .collect(),
        lines_left_out: (left_out > 0).then(|| {
            format!(
                "{} need a person; the {} most urgent stand here, the rest in beams.csv, findings.csv and audit.json.",
                counted(lines.given(), "thing", "things"),
                lines.given() - left_out
            )
        }),
        causes,
    }
}

fn link(line: &AttentionLine, in_full: &BTreeSet<u64>) -> Option<String> {
    let entry = line.entry?;
    if !in_full.contains(&entry) {
        return Some(format!("#line-{entry}"));
    }
    Some(match line.beam_position {
        Some(position) => format!("#{}-row", beam_anchor(entry, position)),
        None => format!("#{}", plan_anchor(entry)),
    })
}

/// The start of the list of plans.
#[derive(Debug, Template)]
#[template(path = "plan-list.html", config = "src/report/askama.toml")]
pub(super) struct PlanListStart {
    plans: u64,
    extent: String,
}

impl PlanListStart {
    pub(super) fn new(plans: u64, in_full: u64) -> Self {
        Self {
            plans,
            extent: extent(plans, in_full),
        }
    }
}

/// What the page abbreviates, in a sentence.
fn extent(plans: u64, in_full: u64) -> String {
    if plans == in_full {
        return format!(
            "{}, in the order of the files; each in full further down.",
            counted(plans, "plan", "plans")
        );
    }
    format!(
        "{}, in the order of the files. {in_full} of them stand in full further down, the most urgent first chosen; the other {} are abbreviated to their line here. audit.json has everything.",
        counted(plans, "plan", "plans"),
        plans - in_full
    )
}

/// One plan in the list.
#[derive(Debug, Template)]
#[template(path = "plan-line.html", config = "src/report/askama.toml")]
pub(super) struct PlanLinePart {
    line: PlanLine,
    status: Option<Status>,
    link: Option<String>,
}

impl PlanLinePart {
    pub(super) fn new(line: PlanLine, in_full: &BTreeSet<u64>) -> Self {
        let link = in_full
            .contains(&line.entry)
            .then(|| plan_anchor(line.entry));
        Self {
            status: status_of_term(&line.verdict),
            link,
            line,
        }
    }
}

/// The start of the plans in full.
#[derive(Debug, Template)]
#[template(path = "plans-in-full.html", config = "src/report/askama.toml")]
pub(super) struct PlansInFullStart {
    in_full: u64,
    abbreviated: u64,
}

impl PlansInFullStart {
    pub(super) const fn new(plans: u64, in_full: u64) -> Self {
        Self {
            in_full,
            abbreviated: plans - in_full,
        }
    }
}

/// What was run, files not audited, how to read the page.
#[derive(Debug, Template)]
#[template(path = "end.html", config = "src/report/askama.toml")]
pub(super) struct End<'a> {
    run: &'a RunView,
    models_used: &'a [String],
    checks_off: String,
    left_out: Vec<LeftOutGroup>,
}

/// The end of the page.
pub(super) fn end<'a>(
    run: &'a RunView,
    summary: &'a RunSummary,
    left_out: Vec<LeftOutGroup>,
) -> End<'a> {
    End {
        run,
        models_used: &summary.models_used,
        checks_off: if summary.checks_off.is_empty() {
            "none".to_owned()
        } else {
            listed_or_dash(&summary.checks_off)
        },
        left_out,
    }
}
