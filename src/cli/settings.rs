//! From words to settings: flag, then environment (clap does both), then the
//! user's config folder, then what is built in. Never a search upward from the
//! working folder: tolerances must not depend on where one stands.

use std::io;
use std::path::{Path, PathBuf};

use anyhow::{Context, bail};
use etcetera::BaseStrategy;

use super::args::CommonArguments;
use crate::audit::checks::unknown_names;
use crate::beam_model::{ModelSet, load_models};
use crate::settings::{Site, SiteSource};

/// Settings in force, with where they came from.
pub(super) struct Effective {
    pub(super) site: Site,
    pub(super) site_source: SiteSource,
    pub(super) models_folder: PathBuf,
}

/// Finds and checks the site's rules and the folder of models.
pub(super) fn effective(common: &CommonArguments) -> anyhow::Result<Effective> {
    let config = etcetera::choose_base_strategy()
        .ok()
        .map(|strategy| strategy.config_dir().join("counterfoil"));
    let site_file = common.site.clone().or_else(|| {
        config
            .as_ref()
            .map(|folder| folder.join("site.toml"))
            // One that is there and cannot be read must not give way to other tolerances.
            .filter(|file| {
                file.symlink_metadata()
                    .map_or_else(|error| error.kind() != io::ErrorKind::NotFound, |_| true)
            })
    });
    let (site, site_source) = match site_file {
        Some(file) => Site::load(&file)?,
        None => (Site::default(), SiteSource::default()),
    };
    let unknown = unknown_names(&site.checks);
    if !unknown.is_empty() {
        bail!(
            "site file: no plan check is called {}; `counterfoil checks` lists them",
            unknown.join(", ")
        );
    }
    Ok(Effective {
        site,
        site_source,
        models_folder: models_folder(common, config.as_deref()),
    })
}

fn models_folder(common: &CommonArguments, config: Option<&Path>) -> PathBuf {
    let here = PathBuf::from("beam-models");
    if let Some(named) = &common.models {
        return named.clone();
    }
    if here.is_dir() {
        return here;
    }
    config.map_or(here, |folder| folder.join("beam-models"))
}

/// Loads the models.
pub(super) fn load(folder: &Path) -> anyhow::Result<ModelSet> {
    load_models(folder).with_context(|| {
        format!(
            "beam models in {} cannot be used (--models names another folder)",
            folder.display()
        )
    })
}
