//! The site file: its keys, its defaults and its checks. Which technique
//! belongs to which group of action levels is decided in `audit`.

use std::collections::BTreeMap;
use std::fs::File;
use std::io::{self, Read};
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};
use thiserror::Error;

use crate::quantity::sha256_hex;

/// Largest site file that is read.
const FILE_LIMIT_BYTES: u64 = 1024 * 1024;

/// Everything a department may set. `Site::default()` is what holds without a site file.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Site {
    /// Action levels by group of techniques.
    pub action_levels: ActionLevels,
    /// Limits of the calculation and of comparisons.
    pub technical: Technical,
    /// 1-sigma uncertainty of a depth by its basis.
    pub depth_uncertainty: DepthUncertainty,
    /// Which point may serve.
    pub point: PointRules,
    /// Plan checks: which are off, and changed severities.
    pub checks: CheckSettings,
    /// The report.
    pub report: ReportSettings,
}

/// One group's action levels, per cent of the dose, on both sides of zero.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ActionLevel {
    /// Up to here a deviation is within tolerance.
    pub tolerance_percent: f64,
    /// Beyond here somebody must act before treatment.
    pub action_percent: f64,
    /// Where the two come from, and whether that was confirmed.
    pub basis: String,
}

/// Action levels by group.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct ActionLevels {
    /// Open static fields.
    #[serde(rename = "static")]
    pub static_open: ActionLevel,
    /// Wedged fields.
    pub wedged: ActionLevel,
    /// Fields shaped by leaves or blocks.
    pub irregular: ActionLevel,
    /// Segmented and dynamic fields.
    pub modulated: ActionLevel,
    /// Arcs.
    pub arc: ActionLevel,
    /// Electrons.
    pub electron: ActionLevel,
    /// Added to both levels when the depth stands on the planning system's own word, per cent.
    pub dependent_depth_widening_percent: f64,
    /// A beam below this share of the dose at its point is judged by its difference as a per cent of the total.
    pub low_weight_share_percent: f64,
}

/// Limits of the calculation.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Technical {
    /// A static field's point nearer than this to a field edge, in the point's plane, is outside the method's range, cm.
    pub edge_margin_cm: f64,
    /// A segmented or moving field whose open fluence changes by more than this within the edge margin of the point is
    /// outside the method's range, per cent of the fluence at the point.
    pub modulated_fluence_change_percent: f64,
    /// A segmented or moving field with less than this share of the point's dose from open primary is outside the method's range, per cent.
    pub modulated_open_primary_percent: f64,
    /// Two depth bases (or SSDs) of one point may differ by this, mm.
    pub depth_disagreement_mm: f64,
}

/// 1-sigma uncertainty of a depth by its basis, mm.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct DepthUncertainty {
    /// The user's table.
    pub table_mm: f64,
    /// The plan's point depth.
    pub plan_mm: f64,
    /// SSD and a flat surface.
    pub ssd_mm: f64,
}

/// Which point may serve.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct PointRules {
    /// Planning systems (Manufacturer's Model Name, exactly) whose beam doses belong to the isocentre when no point is stated.
    pub isocentre_serves_for: Vec<String>,
}

/// Severity of a finding.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Severity {
    /// To know.
    Note,
    /// Beyond what is tolerated: look into it.
    Tolerance,
    /// Act before treatment.
    Action,
}

impl Severity {
    /// The word used in outputs.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::Note => "note",
            Self::Tolerance => "tolerance",
            Self::Action => "action",
        }
    }
}

/// Plan checks as the site wants them.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct CheckSettings {
    /// Names of checks that are switched off; every report lists them.
    pub off: Vec<String>,
    /// Severity by check name where it differs from the built-in one.
    pub severity: BTreeMap<String, Severity>,
}

/// The report.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct ReportSettings {
    /// How many plans the page shows in full detail.
    pub plans_in_full: usize,
}

impl Default for ActionLevels {
    fn default() -> Self {
        // Action: more than 5 % is to be resolved before treatment (AAPM TG-114, from memory;
        // AAPM MPPG 11.a gives 5 % as an example). Tolerance: TG-114's cells for a different
        // algorithm and approximate geometry, from memory, not confirmed against the report.
        let level = |tolerance_percent, basis: &str| ActionLevel {
            tolerance_percent,
            action_percent: 5.0,
            basis: format!("{basis}; action above 5 %: AAPM MPPG 11.a, example item"),
        };
        const TG_114: &str = "tolerance: AAPM TG-114 (2011), different algorithm and approximate geometry, from memory, not confirmed";
        const TG_219: &str = "tolerance: AAPM TG-219 (2021), from memory, not confirmed";
        Self {
            static_open: level(3.0, TG_114),
            wedged: level(3.5, TG_114),
            irregular: level(3.5, TG_114),
            modulated: level(3.0, TG_219),
            arc: level(3.0, TG_219),
            electron: level(
                3.0,
                "tolerance: the department's own decision is needed; no published value was taken",
            ),
            dependent_depth_widening_percent: 0.0,
            low_weight_share_percent: 5.0,
        }
    }
}

impl Default for ActionLevel {
    fn default() -> Self {
        ActionLevels::default().static_open
    }
}

impl Default for Technical {
    fn default() -> Self {
        Self {
            edge_margin_cm: 1.0,
            modulated_fluence_change_percent: 30.0,
            modulated_open_primary_percent: 50.0,
            depth_disagreement_mm: 5.0,
        }
    }
}

impl Default for DepthUncertainty {
    fn default() -> Self {
        Self {
            table_mm: 2.0,
            plan_mm: 2.0,
            ssd_mm: 3.0,
        }
    }
}

impl Default for ReportSettings {
    fn default() -> Self {
        Self { plans_in_full: 200 }
    }
}

/// Where the site settings came from.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct SiteSource {
    /// The file; `None` for the built-in defaults.
    #[serde(serialize_with = "lossy_path")]
    pub file: Option<PathBuf>,
    /// SHA-256 of the file, hex.
    pub sha256: Option<String>,
}

/// A path whose name is no UTF-8 must not keep a report from being written.
fn lossy_path<S: serde::Serializer>(
    path: &Option<PathBuf>,
    serializer: S,
) -> Result<S::Ok, S::Error> {
    let text = path.as_ref().map(|path| path.to_string_lossy());
    text.serialize(serializer)
}

/// Why the settings were refused.
#[derive(Debug, Error)]
pub enum SettingsError {
    /// The file could not be read.
    #[error("site file {file}: cannot be read; check the path given by --site or COUNTERFOIL_SITE")]
    Unreadable {
        /// The file.
        file: String,
        /// Cause.
        source: std::io::Error,
    },
    /// The file is not what it must be.
    #[error("site file {file}: {message}")]
    Malformed {
        /// The file.
        file: String,
        /// The parser's message with line and column.
        message: String,
    },
    /// A value makes no sense.
    #[error("site file {file}: {key} = {value}: {message}")]
    Value {
        /// The file.
        file: String,
        /// The key's path.
        key: String,
        /// What stands there.
        value: String,
        /// What is wanted.
        message: &'static str,
    },
}

/// The text of a file of no more than [`FILE_LIMIT_BYTES`].
fn read_bounded(path: &Path) -> io::Result<String> {
    let mut text = String::new();
    File::open(path)?
        .take(FILE_LIMIT_BYTES + 1)
        .read_to_string(&mut text)?;
    if text.len() as u64 > FILE_LIMIT_BYTES {
        return Err(io::Error::other(format!(
            "larger than {FILE_LIMIT_BYTES} bytes, which no site file is"
        )));
    }
    Ok(text)
}

impl Site {
    /// The settings of a site file, keys that it does not name at their defaults.
    ///
    /// # Errors
    /// When the file cannot be read, has an unknown key, or a value makes no sense.
    pub fn load(path: &Path) -> Result<(Self, SiteSource), SettingsError> {
        let file = path.display().to_string();
        let text = read_bounded(path).map_err(|source| SettingsError::Unreadable {
            file: file.clone(),
            source,
        })?;
        let site = Self::parse(&text, &file)?;
        let source = SiteSource {
            file: Some(path.to_path_buf()),
            sha256: Some(sha256_hex(text.as_bytes())),
        };
        Ok((site, source))
    }

    /// The settings of a site file's text; `file` is for messages.
    ///
    /// # Errors
    /// As for [`Site::load`].
    pub fn parse(text: &str, file: &str) -> Result<Self, SettingsError> {
        let site: Self = toml::from_str(text).map_err(|error| SettingsError::Malformed {
            file: file.to_owned(),
            message: error.to_string(),
        })?;
        site.check(file)?;
        Ok(site)
    }

    fn check(&self, file: &str) -> Result<(), SettingsError> {
        let refuse = |key: String, value: f64, message| SettingsError::Value {
            file: file.to_owned(),
            key,
            value: value.to_string(),
            message,
        };
        let levels = &self.action_levels;
        let groups = [
            ("static", &levels.static_open),
            ("wedged", &levels.wedged),
            ("irregular", &levels.irregular),
            ("modulated", &levels.modulated),
            ("arc", &levels.arc),
            ("electron", &levels.electron),
        ];
        for (group, level) in groups {
            let key = |name: &str| format!("action_levels.{group}.{name}");
            if !(level.tolerance_percent > 0.0 && level.tolerance_percent <= 20.0) {
                return Err(refuse(
                    key("tolerance_percent"),
                    level.tolerance_percent,
                    "must be above 0 and at most 20 per cent",
                ));
            }
            if !(level.action_percent >= level.tolerance_percent && level.action_percent <= 20.0) {
                return Err(refuse(
                    key("action_percent"),
                    level.action_percent,
                    "must be at least the tolerance and at most 20 per cent",
                ));
            }
        }
        let bounded = [
            (
                "action_levels.dependent_depth_widening_percent",
                levels.dependent_depth_widening_percent,
                0.0,
                5.0,
                "must be 0 to 5 per cent",
            ),
            (
                "action_levels.low_weight_share_percent",
                levels.low_weight_share_percent,
                0.0,
                20.0,
                "must be 0 to 20 per cent",
            ),
            (
                "technical.edge_margin_cm",
                self.technical.edge_margin_cm,
                0.5,
                5.0,
                "must be 0.5 to 5 cm",
            ),
            (
                "technical.depth_disagreement_mm",
                self.technical.depth_disagreement_mm,
                0.1,
                50.0,
                "must be 0.1 to 50 mm",
            ),
            (
                "depth_uncertainty.table_mm",
                self.depth_uncertainty.table_mm,
                0.0,
                20.0,
                "must be 0 to 20 mm",
            ),
            (
                "depth_uncertainty.plan_mm",
                self.depth_uncertainty.plan_mm,
                0.0,
                20.0,
                "must be 0 to 20 mm",
            ),
            (
                "depth_uncertainty.ssd_mm",
                self.depth_uncertainty.ssd_mm,
                0.0,
                20.0,
                "must be 0 to 20 mm",
            ),
        ];
        for (key, value, least, greatest, message) in bounded {
            if !(value >= least && value <= greatest) {
                return Err(refuse(key.to_owned(), value, message));
            }
        }
        Ok(())
    }
}
