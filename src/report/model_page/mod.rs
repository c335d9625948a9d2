//! A beam model as one page: identity, single numbers, curves of its tables,
//! findings of its check. Nothing is judged here: the findings come as they
//! are, and the curves are the tables as the program looks them up.

mod curves;
mod figures;
mod head_scatter;
mod scatter;
mod wedges;

use askama::Template;

use super::ReportError;
use super::number::{fixed, short};
use super::page::{STYLE, policy};
use crate::beam_model::{
    Approval, BeamModel, DataOrigin, MachineModel, ModelFinding, ModelSeverity, TableKind,
};

#[derive(Template)]
#[template(path = "model.html", config = "src/report/askama.toml")]
struct ModelPage {
    policy: String,
    style: &'static str,
    version: String,
    name: String,
    invented: bool,
    unapproved: Option<String>,
    facts: Vec<(String, String)>,
    findings: Vec<FindingLine>,
    beams: Vec<BeamPart>,
}

struct FindingLine {
    severity: &'static str,
    beam: String,
    place: String,
    message: String,
}

struct BeamPart {
    label: String,
    facts: Vec<(String, String)>,
    figures: Vec<figures::Figure>,
    scatter: Option<scatter::ScatterPart>,
    head: Option<head_scatter::HeadPart>,
}

/// The page of a model on a day, self-contained HTML.
///
/// # Errors
/// When the page cannot be rendered.
pub fn model_page(
    machine: &MachineModel,
    findings: &[ModelFinding],
    today: jiff::civil::Date,
    version: &str,
) -> Result<String, ReportError> {
    let beams = machine
        .beams
        .iter()
        .enumerate()
        .map(|(index, beam)| BeamPart {
            label: beam.label.clone(),
            facts: beam_facts(beam),
            figures: figures::of_beam(beam, index),
            scatter: scatter::of_beam(beam, index),
            head: head_scatter::of_beam(machine, beam, index),
        });
    let unapproved = (!machine.is_approved_on(today)).then(|| match &machine.approval {
        None => "Nobody has approved it.".to_owned(),
        Some(approval) => format!("The approval holds {}.", approval_span(approval)),
    });
    let page = ModelPage {
        policy: policy(),
        style: STYLE,
        version: version.to_owned(),
        name: machine.name.clone(),
        invented: machine.provenance.origin == DataOrigin::Invented,
        unapproved,
        facts: machine_facts(machine),
        findings: findings.iter().map(finding_line).collect(),
        beams: beams.collect(),
    };
    page.render().map_err(|source| ReportError::Page {
        path: machine.name.clone().into(),
        part: "the model's page",
        source,
    })
}

fn approval_span(approval: &Approval) -> String {
    format!("from {} until {}", approval.on, approval.until)
}

fn fact(name: &str, value: impl Into<String>) -> (String, String) {
    (name.to_owned(), value.into())
}

fn machine_facts(machine: &MachineModel) -> Vec<(String, String)> {
    let provenance = &machine.provenance;
    let origin = match provenance.origin {
        DataOrigin::Measured => "measured",
        DataOrigin::Published => "published",
        DataOrigin::Invented => "invented",
    };
    vec![
        fact("Serves", machine.serves.join(", ")),
        fact(
            "Source-axis distance",
            format!("{} cm", short(machine.sad_cm, 2)),
        ),
        fact("Upper jaws", format!("{:?}", machine.upper_jaws)),
        fact(
            "Data",
            format!(
                "{origin}, {}, {}. {}",
                provenance.by, provenance.on, provenance.remark
            ),
        ),
        fact(
            "Approval",
            machine.approval.as_ref().map_or_else(
                || "none".to_owned(),
                |approval| format!("{}, {}", approval.by, approval_span(approval)),
            ),
        ),
        fact("Fingerprint", format!("SHA-256 {}", machine.fingerprint)),
    ]
}

fn beam_facts(beam: &BeamModel) -> Vec<(String, String)> {
    let output = beam.output;
    let listed = |parts: Vec<String>| {
        if parts.is_empty() {
            "none".to_owned()
        } else {
            parts.join("; ")
        }
    };
    let trays = beam
        .trays
        .iter()
        .map(|(id, share)| format!("{id} {}", fixed(*share, 3)));
    let couch = beam.couch.iter().map(|arc| {
        let (from, to) = (short(arc.from_deg, 1), short(arc.to_deg, 1));
        format!("{} from {from} to {to} degrees", fixed(arc.transmission, 3))
    });
    let given = &beam.uncertainty;
    vec![
        fact(
            "Reference output",
            format!(
                "{} cGy/MU at d0 = {} cm, {} cm from the source",
                fixed(output.dose_per_mu_cgy, 4),
                short(output.depth_cm, 2),
                short(output.source_distance_cm, 2)
            ),
        ),
        fact(
            "Depth table",
            match beam.table_kind {
                TableKind::Tpr => "TPR, side at the point".to_owned(),
                TableKind::Pdd { ssd_cm } => {
                    format!("PDD at SSD {} cm, side at the surface", short(ssd_cm, 2))
                }
            },
        ),
        fact("d_max", format!("{} cm", short(beam.d_max_cm, 2))),
        fact("Collimator exchange k", short(beam.exchange_k, 3)),
        fact("Trays", listed(trays.collect())),
        fact("Wedges", listed(wedges::listed(beam))),
        fact("Couch", listed(couch.collect())),
        fact(
            "Uncertainty, 1 standard deviation",
            format!(
                "output {} %, depth table {} %, Sc {} %, Sp {} %, off axis {} %, transmissions {} %",
                short(given.output_percent, 2),
                short(given.depth_table_percent, 2),
                short(given.head_scatter_percent, 2),
                short(given.phantom_scatter_percent, 2),
                short(given.off_axis_percent, 2),
                short(given.transmission_percent, 2)
            ),
        ),
    ]
}

fn finding_line(finding: &ModelFinding) -> FindingLine {
    let place = finding.place.as_ref().map(ToString::to_string);
    let parts: Vec<String> = finding.table.clone().into_iter().chain(place).collect();
    FindingLine {
        severity: match finding.severity {
            ModelSeverity::Error => "error",
            ModelSeverity::Warning => "warning",
            ModelSeverity::Note => "note",
        },
        beam: finding.beam.clone().unwrap_or_default(),
        place: parts.join(", "),
        message: finding.message.clone(),
    }
}
