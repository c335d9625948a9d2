//! `counterfoil model`: a model's consistency and its proof, PDD to TPR and back.

use std::io::Write;
use std::path::PathBuf;

use anyhow::{Context, bail};

use super::args::{
    DeriveArguments, DerivedKind, ModelCheckArguments, ModelCommand, ModelShowArguments,
};
use super::clock::started;
use super::exit::Exit;
use super::settings::{effective, load};
use crate::beam_model::{
    BeamModel, MachineModel, ModelSet, ModelSeverity, TableKind, check_machine, derivable_grid,
    derive_table, load_models,
};
use crate::dose::prove;
use crate::report::{model_check_text, model_page};

/// Runs one of the model commands.
pub(super) fn run(command: ModelCommand, out: &mut dyn Write) -> anyhow::Result<Exit> {
    match command {
        ModelCommand::Check(arguments) => check(arguments, out),
        ModelCommand::Show(arguments) => show(arguments, out),
        ModelCommand::Derive(arguments) => derive(arguments, out),
    }
}

fn check(arguments: ModelCheckArguments, out: &mut dyn Write) -> anyhow::Result<Exit> {
    let sets = model_sets(&arguments)?;
    let today = started()?.date();
    let mut worst = ModelSeverity::Note;
    for machine in sets.iter().flat_map(|set| &set.machines) {
        let findings = check_machine(machine, today);
        worst = findings
            .iter()
            .map(|finding| finding.severity)
            .fold(worst, Ord::max);
        write!(out, "{}", model_check_text(machine, &findings))?;
        write_proof(machine, &mut worst, out)?;
    }
    Ok(match worst {
        ModelSeverity::Note => Exit::Within,
        ModelSeverity::Warning | ModelSeverity::Error => Exit::Beyond,
    })
}

fn model_sets(arguments: &ModelCheckArguments) -> anyhow::Result<Vec<ModelSet>> {
    if arguments.folders.is_empty() {
        return Ok(vec![load(&effective(&arguments.common)?.models_folder)?]);
    }
    let of_folder = |folder: &PathBuf| {
        load_models(folder).with_context(|| format!("beam model {}", folder.display()))
    };
    arguments.folders.iter().map(of_folder).collect()
}

/// Where a model's data come from, in a word.
pub(super) fn origin(machine: &MachineModel) -> &'static str {
    use crate::beam_model::DataOrigin;
    match machine.provenance.origin {
        DataOrigin::Measured => "measured",
        DataOrigin::Published => "published",
        DataOrigin::Invented => "invented",
    }
}

/// Measured points beside what the model gives for them.
fn write_proof(
    machine: &MachineModel,
    worst: &mut ModelSeverity,
    out: &mut dyn Write,
) -> anyhow::Result<()> {
    for beam in &machine.beams {
        for point in &beam.proof {
            match prove(machine, beam, point) {
                Ok(deviation_percent) => writeln!(
                    out,
                    "  {} proof: {}: model {deviation_percent:+.2} % from the measured {} cGy/MU",
                    beam.label, point.label, point.measured_cgy_per_mu
                )?,
                Err(error) => {
                    *worst = (*worst).max(ModelSeverity::Warning);
                    writeln!(out, "  {} proof: {}: {error}", beam.label, point.label)?;
                }
            }
        }
    }
    Ok(())
}

fn show(arguments: ModelShowArguments, out: &mut dyn Write) -> anyhow::Result<Exit> {
    let models = load(&effective(&arguments.common)?.models_folder)?;
    let today = started()?.date();
    let machine = models
        .machines
        .iter()
        .find(|machine| machine.name == arguments.model)
        .or_else(|| models.machine_for(&arguments.model))
        .with_context(|| {
            let names: Vec<&str> = models
                .machines
                .iter()
                .map(|machine| machine.name.as_str())
                .collect();
            format!(
                "no model is called {}; there are {}",
                arguments.model,
                names.join(", ")
            )
        })?;
    let findings = check_machine(machine, today);
    let page = model_page(machine, &findings, today, env!("CARGO_PKG_VERSION"))?;
    let file = arguments
        .out
        .unwrap_or_else(|| PathBuf::from(format!("counterfoil-model-{}.html", machine.name)));
    std::fs::write(&file, page).with_context(|| file.display().to_string())?;
    writeln!(out, "{}", file.display())?;
    Ok(Exit::Within)
}

fn derive(arguments: DeriveArguments, out: &mut dyn Write) -> anyhow::Result<Exit> {
    let models = load(&effective(&arguments.common)?.models_folder)?;
    let (machine, beam) = named_beam(&models, &arguments.machine, &arguments.energy)?;
    let kind = match (arguments.to, arguments.ssd) {
        (DerivedKind::Tpr, None) => TableKind::Tpr,
        (DerivedKind::Tpr, Some(_)) => bail!("a TPR has no SSD: leave --ssd out"),
        (DerivedKind::Pdd, Some(ssd_cm)) => TableKind::Pdd { ssd_cm },
        (DerivedKind::Pdd, None) => bail!("--ssd is needed for a PDD"),
    };
    let (depths_cm, sides_cm) = derivable_grid(beam, kind);
    let table = derive_table(beam, kind, &depths_cm, &sides_cm)?;
    let words = match kind {
        TableKind::Tpr => "TPR".to_owned(),
        TableKind::Pdd { ssd_cm } => format!("PDD at SSD {ssd_cm} cm, per cent"),
    };
    let comments = [
        format!(
            "{words}, normalised at {} cm; derived by the relation of AAPM TG-71",
            beam.output.depth_cm
        ),
        format!(
            "from {} of model {} ({} data, fingerprint {})",
            beam.depth_table.name(),
            machine.name,
            origin(machine),
            machine.fingerprint
        ),
    ];
    let comments: Vec<&str> = comments.iter().map(String::as_str).collect();
    write!(out, "{}", table.to_csv(&comments))?;
    Ok(Exit::Within)
}

/// The beam that a machine name and an energy label mean, or what there is instead.
pub(super) fn named_beam<'a>(
    models: &'a ModelSet,
    machine_name: &str,
    energy: &str,
) -> anyhow::Result<(&'a MachineModel, &'a BeamModel)> {
    let machine = models.machine_for(machine_name).with_context(|| {
        format!(
            "no model serves machine {machine_name}; known names: {}",
            models.known_names().join(", ")
        )
    })?;
    let beam = machine
        .beams
        .iter()
        .find(|beam| beam.label == energy)
        .with_context(|| {
            let labels: Vec<&str> = machine
                .beams
                .iter()
                .map(|beam| beam.label.as_str())
                .collect();
            format!(
                "{machine_name} has no energy {energy}; it has {}",
                labels.join(", ")
            )
        })?;
    Ok((machine, beam))
}
