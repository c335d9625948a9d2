//! From folders to models: finding them, reading `machine.toml`, rules over
//! the machine's keys, names that two models claim. Beams and their tables
//! are for `load_beam`.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use super::load_beam::load_beam;
use super::machine_file::{
    AxisEntry, JawEntry, JawPlace, LeafBankEntry, MachineFile, SCHEMA, SchemaOnly,
};
use super::model_folder::{MACHINE_FILE, ModelFolder, line_of};
use super::{
    Approval, BeamModel, Collimation, HeadScatter, JawPair, LeafBank, MachineModel, ModelError,
    ModelSet, Provenance, Travel,
};
use crate::quantity::{Quantity, tolerance};

/// Loads every model in a folder, by folder name order: each folder directly in it that holds a
/// `machine.toml`, or the folder itself when it is a model.
///
/// # Errors
/// When there is no model, a model is refused, or two models serve one machine name.
pub fn load_models(folder: &Path) -> Result<ModelSet, ModelError> {
    let mut machines = Vec::new();
    let mut served: BTreeMap<String, PathBuf> = BTreeMap::new();
    for model_folder in model_folders(folder)? {
        let machine = load_machine(&model_folder)?;
        let path = model_folder.join(MACHINE_FILE);
        for name in &machine.serves {
            if let Some(first) = served.insert(name.clone(), path.clone()) {
                return Err(ModelError::SharedName {
                    name: name.clone(),
                    first,
                    second: path,
                });
            }
        }
        machines.push(machine);
    }
    Ok(ModelSet { machines })
}

fn model_folders(folder: &Path) -> Result<Vec<PathBuf>, ModelError> {
    let failed = |source| ModelError::Read {
        path: folder.to_path_buf(),
        source,
    };
    if folder.join(MACHINE_FILE).is_file() {
        return Ok(vec![folder.to_path_buf()]);
    }
    let mut found = Vec::new();
    for entry in std::fs::read_dir(folder).map_err(failed)? {
        let path = entry.map_err(failed)?.path();
        // Existence in any form, so that an unreadable machine.toml is an error and not a missing model.
        if path.join(MACHINE_FILE).symlink_metadata().is_ok() {
            found.push(path);
        }
    }
    if found.is_empty() {
        return Err(ModelError::NoModels {
            folder: folder.to_path_buf(),
        });
    }
    found.sort();
    Ok(found)
}

/// Loads the model in one folder.
///
/// # Errors
/// When a file is missing or wrong, or keys do not go together: with file, line and cell.
pub fn load_machine(folder: &Path) -> Result<MachineModel, ModelError> {
    let mut files = ModelFolder::new(folder);
    let path = files.machine_path();
    let file = parse_machine_file(&path, &files.read_text(MACHINE_FILE)?)?;
    if file.serves.is_empty() {
        return Err(ModelError::setting(
            &path,
            "serves",
            "no treatment machine name is given",
        ));
    }
    let collimation = collimation(&path, &file.jaws, &file.leaf_banks)?;
    let upper_jaws = upper_axis(&path, &file.jaws)?;
    let approval = file.approval.map(|entry| Approval {
        by: entry.by,
        on: entry.on,
        until: entry.until,
    });
    if let Some(approval) = &approval
        && approval.until < approval.on
    {
        return Err(ModelError::setting(
            &path,
            "approval.until",
            format!("{} is before {}", approval.until, approval.on),
        ));
    }
    if file.beams.is_empty() {
        return Err(ModelError::setting(&path, "beams", "there is no beam"));
    }
    let mut beams: Vec<BeamModel> = Vec::new();
    for entry in file.beams {
        let mut beam = load_beam(&mut files, entry)?;
        beam.head_scatter = HeadScatter::fit(file.sad_cm, &collimation, &beam);
        refuse_second(&path, &beams, &beam)?;
        beams.push(beam);
    }
    Ok(MachineModel {
        name: folder_name(folder),
        serves: file.serves,
        sad_cm: file.sad_cm,
        upper_jaws,
        collimation,
        provenance: Provenance {
            origin: file.provenance.origin,
            by: file.provenance.by,
            on: file.provenance.on,
            remark: file.provenance.remark,
        },
        approval,
        beams,
        fingerprint: files.fingerprint(),
    })
}

/// The folder's own name, also for `.` and the like.
fn folder_name(folder: &Path) -> String {
    let resolved = folder.canonicalize().unwrap_or_else(|_| folder.into());
    resolved
        .file_name()
        .map_or_else(String::new, |name| name.to_string_lossy().into_owned())
}

fn parse_machine_file(path: &Path, text: &str) -> Result<MachineFile, ModelError> {
    let refused = |error: toml::de::Error| ModelError::Toml {
        path: path.to_path_buf(),
        line: error
            .span()
            .map_or(1, |span| line_of(text.as_bytes(), span.start)),
        message: error.message().to_owned(),
    };
    let schema = toml::from_str::<SchemaOnly>(text).map_err(refused)?.schema;
    if schema != Some(SCHEMA) {
        let found = schema.map_or_else(|| "none is stated".to_owned(), |is| format!("it is {is}"));
        return Err(ModelError::setting(
            path,
            "schema",
            format!("must be {SCHEMA} for this version of the program, but {found}"),
        ));
    }
    toml::from_str(text).map_err(refused)
}

fn upper_axis(path: &Path, jaws: &[JawEntry]) -> Result<super::JawAxis, ModelError> {
    let place = |wanted| jaws.iter().find(|jaw| jaw.place == wanted);
    let (Some(upper), Some(lower), 2) =
        (place(JawPlace::Upper), place(JawPlace::Lower), jaws.len())
    else {
        return Err(ModelError::setting(
            path,
            "jaws",
            "two pairs are wanted, one with place = \"upper\" and one with \"lower\"",
        ));
    };
    if upper.moves_along == lower.moves_along {
        return Err(ModelError::setting(
            path,
            "jaws.moves_along",
            "one pair moves along x and one along y",
        ));
    }
    if let (Some(upper_cm), Some(lower_cm)) = (upper.source_distance_cm, lower.source_distance_cm)
        && upper_cm >= lower_cm
    {
        return Err(ModelError::setting(
            path,
            "jaws.source_distance_cm",
            format!(
                "the upper pair, at {upper_cm} cm, must be nearer the source than the lower, at {lower_cm} cm"
            ),
        ));
    }
    Ok(upper.moves_along.axis())
}

fn collimation(
    path: &Path,
    jaws: &[JawEntry],
    banks: &[LeafBankEntry],
) -> Result<Collimation, ModelError> {
    for (index, bank) in banks.iter().enumerate() {
        let key = format!("leaf_banks {}, boundaries_cm", index + 1);
        if bank.boundaries_cm.len() < 2 {
            return Err(ModelError::setting(
                path,
                key,
                "at least two boundaries make a leaf pair",
            ));
        }
        for &boundary in &bank.boundaries_cm {
            if let Some(objection) = Quantity::DevicePosition.objection(boundary) {
                return Err(ModelError::setting(path, key, objection));
            }
        }
        if let Some((before, after)) = first_fall(&bank.boundaries_cm) {
            return Err(ModelError::setting(
                path,
                key,
                format!("must rise, but {after} follows {before}"),
            ));
        }
    }
    let travel = |outward_cm: Option<f64>, across_cm: Option<f64>| Travel {
        outward_cm,
        across_cm,
    };
    Ok(Collimation {
        jaws: jaws
            .iter()
            .map(|jaw| JawPair {
                moves_along: AxisEntry::axis(jaw.moves_along),
                source_distance_cm: jaw.source_distance_cm,
                transmission: jaw.transmission,
                travel: travel(jaw.outward_limit_cm, jaw.across_limit_cm),
            })
            .collect(),
        leaf_banks: banks
            .iter()
            .map(|bank| LeafBank {
                moves_along: AxisEntry::axis(bank.moves_along),
                source_distance_cm: bank.source_distance_cm,
                boundaries_cm: bank.boundaries_cm.clone(),
                transmission: bank.transmission,
                leaf_end_offset_cm: bank.leaf_end_offset_cm,
                travel: travel(bank.outward_limit_cm, bank.across_limit_cm),
            })
            .collect(),
    })
}

fn first_fall(numbers: &[f64]) -> Option<(f64, f64)> {
    numbers
        .iter()
        .zip(numbers.iter().skip(1))
        .find(|(before, after)| before >= after)
        .map(|(&before, &after)| (before, after))
}

/// Two beams that one plan's energy could mean would make the choice a guess.
fn refuse_second(path: &Path, known: &[BeamModel], beam: &BeamModel) -> Result<(), ModelError> {
    for other in known {
        if other.label == beam.label {
            return Err(ModelError::setting(
                path,
                "beams.label",
                format!("`{}` is given twice", beam.label),
            ));
        }
        let same_energy = other.radiation == beam.radiation
            && (other.nominal_energy - beam.nominal_energy).abs() <= tolerance::ENERGY;
        let same_mode = (other.fluence_mode_ids.is_empty() && beam.fluence_mode_ids.is_empty())
            || other
                .fluence_mode_ids
                .iter()
                .any(|id| beam.fluence_mode_ids.contains(id));
        if same_energy && same_mode {
            return Err(ModelError::setting(
                path,
                "beams",
                format!(
                    "`{}` and `{}` have the same energy and fluence mode, so a plan could mean either",
                    other.label, beam.label
                ),
            ));
        }
    }
    Ok(())
}
