//! `counterfoil audit`.

use std::fs::File;
use std::io::{self, BufReader, Write};
use std::path::{Path, PathBuf};

use anyhow::bail;

use super::args::AuditArguments;
use super::clock::started;
use super::exit::{Completeness, Exit};
use super::fail_on::FailOn;
use super::progress;
use super::settings::{Effective, effective, load};
use super::summary::{About, write_summary};
use crate::audit::ModelUse;
use crate::batch::{self, BatchRequest, DepthTable, RunFacts, Tally, read_depth_table};
use crate::beam_model::{ModelSet, ModelSeverity, check_machine};
use crate::intake::{Found, IntakeError, find_files, paths_from_list};
use crate::report::{TargetState, target_state};

/// Runs the main job.
pub(super) fn run(
    arguments: AuditArguments,
    out: &mut dyn Write,
    err: &mut dyn Write,
) -> anyhow::Result<Exit> {
    let effective = effective(&arguments.common)?;
    if arguments.show_settings {
        show_settings(&effective, out)?;
        return Ok(Exit::Within);
    }
    let models = load(&effective.models_folder)?;
    refuse_faulty_models(&models)?;
    let target = target_state(&arguments.out)?;
    refuse_foreign_folder(&arguments.out, &target, arguments.force)?;
    let depths = arguments
        .depths
        .as_deref()
        .map(read_depth_table)
        .transpose()?
        .unwrap_or_default();
    let found = find_files(&paths(&arguments)?, &arguments.out)?;
    refuse_report_among_inputs(&target, &found)?;
    let facts = facts(&arguments, &effective, &depths)?;
    let bar = progress::bar(arguments.quiet);
    let outcome = batch::run(
        BatchRequest {
            found: &found,
            models: &models,
            site: &effective.site,
            depth_rows: &depths.rows,
            report_folder: &arguments.out,
            jobs: arguments.jobs.map(usize::from),
            facts: &facts,
            exit_words: exit_words(arguments.fail_on),
        },
        &|moved| progress::show(&bar, moved),
    );
    bar.finish_and_clear();
    let outcome = outcome?;
    let exit = Exit::of_audit(&outcome.tally, &outcome.models, arguments.fail_on);
    if !arguments.quiet {
        let about = About {
            folder: &arguments.out,
            site: &effective.site_source,
            fail_on: arguments.fail_on,
        };
        write_summary(out, &outcome, exit, &about)?;
    }
    // A status other than 0 is worth a word even to a script that throws stdout away.
    if arguments.quiet && exit != Exit::Within {
        writeln!(err, "counterfoil: {}", exit.of_level(arguments.fail_on))?;
    }
    Ok(exit)
}

fn paths(arguments: &AuditArguments) -> anyhow::Result<Vec<PathBuf>> {
    let mut paths = Vec::new();
    for path in &arguments.paths {
        if path.as_os_str() == "-" {
            paths.extend(paths_from_list(io::stdin().lock(), "standard input")?);
        } else {
            paths.push(path.clone());
        }
    }
    if let Some(list) = &arguments.files_from
        && list.as_os_str() == "-"
    {
        paths.extend(paths_from_list(io::stdin().lock(), "standard input")?);
    } else if let Some(list) = &arguments.files_from {
        let name = list.display().to_string();
        let file = File::open(list).map_err(|source| IntakeError::List {
            list: name.clone(),
            source,
        })?;
        paths.extend(paths_from_list(BufReader::new(file), &name)?);
    }
    if paths.is_empty() {
        bail!("nothing to audit: the list of paths is empty");
    }
    Ok(paths)
}

/// A model that is certainly wrong would make wrong verdicts.
fn refuse_faulty_models(models: &ModelSet) -> anyhow::Result<()> {
    let today = started()?.date();
    for machine in &models.machines {
        let error = check_machine(machine, today)
            .into_iter()
            .find(|finding| finding.severity == ModelSeverity::Error);
        if let Some(error) = error {
            bail!(
                "beam model {}: {error}; `counterfoil model check` tells all, correct the model or take it out",
                machine.name
            );
        }
    }
    Ok(())
}

fn refuse_foreign_folder(folder: &Path, target: &TargetState, force: bool) -> anyhow::Result<()> {
    if let TargetState::Foreign { example } = target
        && !force
    {
        bail!(
            "{} holds something else than an earlier report ({example}); choose another folder with --out, or add --force",
            folder.display()
        );
    }
    Ok(())
}

/// The report's own folder is not looked into. With other files in it, which
/// may be plans, that must not go by silently.
fn refuse_report_among_inputs(target: &TargetState, found: &[Found]) -> anyhow::Result<()> {
    if let TargetState::Foreign { example } = target
        && let Some(path) = found.iter().find_map(|one| match one {
            Found::ReportFolder(path) => Some(path),
            _ => None,
        })
    {
        bail!(
            "{} is among the folders to audit and is also where the report is to go: what else it holds ({example}) would not be looked at; choose another folder with --out",
            path.display()
        );
    }
    Ok(())
}

/// What the outputs say about the run. Nothing here may depend on the number of threads.
fn facts(
    arguments: &AuditArguments,
    effective: &Effective,
    depths: &DepthTable,
) -> anyhow::Result<RunFacts> {
    let mut options = vec![format!("models = {}", effective.models_folder.display())];
    options.push(format!("fail-on = {}", arguments.fail_on.word()));
    if let Some(file) = &arguments.depths {
        options.push(format!(
            "depths = {} ({} rows, sha256 {})",
            file.display(),
            depths.rows.len(),
            depths.sha256
        ));
    }
    let mut inputs: Vec<String> = arguments
        .paths
        .iter()
        .map(|path| path.display().to_string())
        .collect();
    if let Some(list) = &arguments.files_from {
        inputs.push(format!("--files-from {}", list.display()));
    }
    Ok(RunFacts {
        version: env!("CARGO_PKG_VERSION").to_owned(),
        started: started()?,
        inputs,
        options,
        site_source: effective.site_source.clone(),
    })
}

fn exit_words(fail_on: FailOn) -> fn(&Tally, &[ModelUse]) -> String {
    fn words(tally: &Tally, models: &[ModelUse], fail_on: FailOn) -> String {
        let exit = Exit::of_audit(tally, models, fail_on);
        exit.sentence(fail_on, Completeness::of_audit(tally, models))
    }
    match fail_on {
        FailOn::Tolerance => |tally, models| words(tally, models, FailOn::Tolerance),
        FailOn::Action => |tally, models| words(tally, models, FailOn::Action),
        FailOn::Never => |tally, models| words(tally, models, FailOn::Never),
    }
}

fn show_settings(effective: &Effective, out: &mut dyn Write) -> anyhow::Result<()> {
    let source = effective.site_source.file.as_ref().map_or_else(
        || "built-in defaults (no site file)".to_owned(),
        |file| {
            format!(
                "{} (keys that it does not name: built-in defaults)",
                file.display()
            )
        },
    );
    writeln!(out, "# site settings: {source}")?;
    writeln!(out, "# models: {}", effective.models_folder.display())?;
    write!(out, "{}", toml::to_string_pretty(&effective.site)?)?;
    Ok(())
}
