//! What can be typed. Parsing cannot look at anything but the words; what they
//! mean is checked in `settings` and by each command.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

use super::fail_on::FailOn;
use crate::quantity::Quantity;

/// Independent check of radiotherapy plans in batch.
#[derive(Debug, Parser)]
#[command(name = "counterfoil", version, about, after_help = super::exit::HELP, max_term_width = 100)]
pub(super) struct Arguments {
    #[command(subcommand)]
    pub(super) command: Command,
}

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Find RT Plans, recompute every beam, write the report
    #[command(after_help = super::exit::HELP)]
    Audit(AuditArguments),
    /// Show what was read from a plan; no calculation
    Read(ReadArguments),
    /// Calculate one field typed by hand, every factor shown
    #[command(allow_negative_numbers = true, after_help = FIELD_HELP)]
    Field(Box<FieldArguments>),
    /// A beam model: its consistency, its curves, PDD to TPR and back
    #[command(subcommand)]
    Model(ModelCommand),
    /// List the plan checks, each with its text
    Checks,
}

/// Where models and the site's rules come from.
#[derive(Debug, Args)]
pub(super) struct CommonArguments {
    /// Folder of beam models [default: beam-models in the current folder, else in the user's config folder]
    #[arg(long, value_name = "DIR", env = "COUNTERFOIL_MODELS")]
    pub(super) models: Option<PathBuf>,
    /// Site file: action levels, limits, checks [default: the user's config folder, else built-in]
    #[arg(long, value_name = "FILE", env = "COUNTERFOIL_SITE")]
    pub(super) site: Option<PathBuf>,
}

#[derive(Debug, Args)]
pub(super) struct AuditArguments {
    /// Files and folders; `-` reads a list of paths from standard input, one a line
    #[arg(value_name = "PATH", required_unless_present_any = ["files_from", "show_settings"])]
    pub(super) paths: Vec<PathBuf>,
    /// A list of paths, one a line; `-` is standard input
    #[arg(long, value_name = "FILE")]
    pub(super) files_from: Option<PathBuf>,
    #[command(flatten)]
    pub(super) common: CommonArguments,
    /// Folder for the report; an earlier report there is replaced
    #[arg(long, value_name = "DIR", default_value = "counterfoil-report")]
    pub(super) out: PathBuf,
    /// Write into --out even when it holds something else than an earlier report
    #[arg(long)]
    pub(super) force: bool,
    /// CSV of depths: sop_instance_uid, beam_number, depth_cm, effective_depth_cm, ssd_cm, independent (yes or no)
    #[arg(long, value_name = "FILE")]
    pub(super) depths: Option<PathBuf>,
    /// From which level on a deviation or finding makes the exit status 1
    #[arg(long, value_enum, default_value_t = FailOn::Tolerance, value_name = "LEVEL")]
    pub(super) fail_on: FailOn,
    /// Plans worked on at once [default: one a core]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=512))]
    pub(super) jobs: Option<u16>,
    /// No progress bar and no summary
    #[arg(short, long)]
    pub(super) quiet: bool,
    /// Print the settings in force and where each came from, and stop
    #[arg(long)]
    pub(super) show_settings: bool,
}

#[derive(Debug, Args)]
pub(super) struct ReadArguments {
    /// The plan files
    #[arg(value_name = "PATH", required = true)]
    pub(super) paths: Vec<PathBuf>,
    /// Every control point, not just the first of each beam
    #[arg(long)]
    pub(super) control_points: bool,
    /// As JSON, everything, one document a file
    #[arg(long)]
    pub(super) json: bool,
}

#[derive(Debug, Subcommand)]
pub(super) enum ModelCommand {
    /// Check models: shape, ranges, plausibility, proof; status 1 when a person has to look
    Check(ModelCheckArguments),
    /// Write a model's curves and single numbers as one page
    Show(ModelShowArguments),
    /// Print a depth table worked out from the measured one, as CSV
    Derive(DeriveArguments),
}

#[derive(Debug, Args)]
pub(super) struct ModelCheckArguments {
    /// Model folders, or folders of models [default: every model of --models]
    #[arg(value_name = "FOLDER")]
    pub(super) folders: Vec<PathBuf>,
    #[command(flatten)]
    pub(super) common: CommonArguments,
}

#[derive(Debug, Args)]
pub(super) struct ModelShowArguments {
    /// Name of the model's folder, or of a treatment machine that it serves
    #[arg(value_name = "NAME")]
    pub(super) model: String,
    #[command(flatten)]
    pub(super) common: CommonArguments,
    /// The page to write [default: counterfoil-model-NAME.html]
    #[arg(long, value_name = "FILE")]
    pub(super) out: Option<PathBuf>,
}

#[derive(Debug, Args)]
pub(super) struct DeriveArguments {
    #[command(flatten)]
    pub(super) common: CommonArguments,
    /// Treatment machine name
    #[arg(long, value_name = "NAME")]
    pub(super) machine: String,
    /// Energy, such as 6 or 6-FFF
    #[arg(long, value_name = "LABEL")]
    pub(super) energy: String,
    /// What to derive
    #[arg(long, value_enum, value_name = "KIND")]
    pub(super) to: DerivedKind,
    /// The SSD of a PDD, cm
    #[arg(long, value_name = "CM")]
    pub(super) ssd: Option<f64>,
}

/// What to derive.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum DerivedKind {
    /// Tissue-phantom ratio
    Tpr,
    /// Percent depth dose at --ssd
    Pdd,
}

const FIELD_HELP: &str = "\
Any factor may be typed instead of taken from a model. Without --ssd the point
is at the isocentre. Two examples:

  counterfoil field --square 10 --depth 8 --machine ROWAN-1 --energy 6 --dose 1.8
  counterfoil field --square 10 --depth 10 --ssd 100 --pdd 66.7 --sc 1 --sp 1 \\
      --oar 1 --output 1 --reference-depth 1.5 --reference-distance 101.5 --dose 2";

#[derive(Debug, Args)]
pub(super) struct FieldArguments {
    #[command(flatten)]
    pub(super) common: CommonArguments,
    /// Treatment machine name, to take factors from its model
    #[arg(long, value_name = "NAME", requires = "energy")]
    pub(super) machine: Option<String>,
    /// Energy in that model, such as 6 or 6-FFF
    #[arg(long, value_name = "LABEL")]
    pub(super) energy: Option<String>,
    /// Both sides of a square field, cm
    #[arg(long, value_name = "CM", value_parser = opening)]
    pub(super) square: Option<Opening>,
    /// Opening along x, cm: one number, or both positions as X1,X2
    #[arg(long, value_name = "CM", value_parser = opening, allow_hyphen_values = true)]
    pub(super) x: Option<Opening>,
    /// Opening along y, cm: one number, or both positions as Y1,Y2
    #[arg(long, value_name = "CM", value_parser = opening, allow_hyphen_values = true)]
    pub(super) y: Option<Opening>,
    /// Where the sides are meant
    #[arg(long, value_enum, default_value_t = SidesAt::Isocentre, value_name = "PLANE")]
    pub(super) sides_at: SidesAt,
    /// Where the ray to the point crosses the isocentre plane, cm
    #[arg(long, value_name = "X,Y", value_parser = place, allow_hyphen_values = true)]
    pub(super) point: Option<Place>,
    /// Depth of the point below a flat surface, cm
    #[arg(long, value_name = "CM")]
    pub(super) depth: f64,
    /// Radiological depth along the ray, cm
    #[arg(long, value_name = "CM")]
    pub(super) effective_depth: Option<f64>,
    /// Source-surface distance, cm; without it the point is at the isocentre
    #[arg(long, value_name = "CM")]
    pub(super) ssd: Option<f64>,
    /// Source-axis distance, cm
    #[arg(long, value_name = "CM", default_value_t = 100.0)]
    pub(super) sad: f64,
    /// Dose wanted at the point, Gy: prints the MU
    #[arg(long, value_name = "GY")]
    pub(super) dose: Option<f64>,
    /// Meterset, MU: prints the dose
    #[arg(long, value_name = "MU")]
    pub(super) mu: Option<f64>,
    /// D'0, dose per MU at the reference point, cGy/MU
    #[arg(long, value_name = "CGY_PER_MU")]
    pub(super) output: Option<f64>,
    /// d0, depth of the reference point, where tables are normalised, cm
    #[arg(long, value_name = "CM")]
    pub(super) reference_depth: Option<f64>,
    /// Distance from the source to the reference point, cm
    #[arg(long, value_name = "CM")]
    pub(super) reference_distance: Option<f64>,
    /// Sc, collimator scatter factor
    #[arg(long, value_name = "RATIO")]
    pub(super) sc: Option<f64>,
    /// Sp, phantom scatter factor
    #[arg(long, value_name = "RATIO")]
    pub(super) sp: Option<f64>,
    /// TPR or TMR at the point
    #[arg(
        long,
        visible_alias = "tmr",
        value_name = "RATIO",
        conflicts_with = "pdd"
    )]
    pub(super) tpr: Option<f64>,
    /// Percent depth dose at the point, per cent
    #[arg(long, value_name = "PERCENT")]
    pub(super) pdd: Option<f64>,
    /// The SSD that --pdd holds for, cm: it is taken to --ssd by Mayneord's factor
    #[arg(long, value_name = "CM", requires = "pdd", requires = "ssd")]
    pub(super) pdd_ssd: Option<f64>,
    /// Off-axis ratio
    #[arg(long, value_name = "RATIO")]
    pub(super) oar: Option<f64>,
    /// Wedge factor
    #[arg(long, value_name = "RATIO")]
    pub(super) wedge_factor: Option<f64>,
    /// Wedge of the beam model, by its ID: factor and profile are looked up
    #[arg(
        long,
        value_name = "ID",
        requires = "machine",
        requires = "wedge_orientation",
        conflicts_with = "wedge_factor"
    )]
    pub(super) wedge: Option<String>,
    /// Wedge Orientation as in the plan: 0 has the thin end towards +y of the collimator, 90 towards -x
    #[arg(
        long,
        value_name = "DEGREES",
        requires = "wedge",
        allow_negative_numbers = true
    )]
    pub(super) wedge_orientation: Option<f64>,
    /// Share of the meterset that a motorised wedge is in for, above 0 and at most 1
    #[arg(long, value_name = "SHARE", requires = "wedge")]
    pub(super) wedge_share: Option<f64>,
    /// Tray factor
    #[arg(long, value_name = "RATIO")]
    pub(super) tray_factor: Option<f64>,
    /// Couch transmission
    #[arg(long, value_name = "RATIO")]
    pub(super) couch_factor: Option<f64>,
    /// Any further transmission, such as a bolus at the surface
    #[arg(long, value_name = "RATIO")]
    pub(super) other_factor: Option<f64>,
    /// Depth of dose maximum, cm; shallower points are outside the method's range
    #[arg(long, value_name = "CM")]
    pub(super) d_max: Option<f64>,
    /// The trace as JSON
    #[arg(long)]
    pub(super) json: bool,
}

/// The plane that sides are meant in.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum SidesAt {
    /// The isocentre plane
    Isocentre,
    /// The surface
    Surface,
    /// The plane of the point
    Point,
}

/// Two positions of one axis, cm.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Opening {
    pub(super) positions_cm: [f64; 2],
}

/// A place in the isocentre plane, cm.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Place(pub(super) [f64; 2]);

fn opening(text: &str) -> Result<Opening, String> {
    let positions_cm = match text.split_once(',') {
        None => {
            let side_cm = number(text)?;
            [-side_cm / 2.0, side_cm / 2.0]
        }
        Some((lower, upper)) => [number(lower)?, number(upper)?],
    };
    if positions_cm[1] <= positions_cm[0] {
        return Err("the opening is closed or inverted".to_owned());
    }
    for position_cm in positions_cm {
        if let Some(objection) = Quantity::DevicePosition.objection(position_cm) {
            return Err(objection);
        }
    }
    Ok(Opening { positions_cm })
}

fn place(text: &str) -> Result<Place, String> {
    let (x, y) = text.split_once(',').ok_or("must be X,Y")?;
    Ok(Place([number(x)?, number(y)?]))
}

fn number(text: &str) -> Result<f64, String> {
    let number: f64 = text
        .trim()
        .parse()
        .map_err(|_| format!("{text:?} is not a number"))?;
    if number.is_finite() {
        Ok(number)
    } else {
        Err(format!("{text:?} is not a finite number"))
    }
}
