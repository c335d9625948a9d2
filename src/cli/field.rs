//! `counterfoil field`: one field typed by hand, every factor shown.

use std::io::Write;

use anyhow::{Context, bail};

use super::args::{FieldArguments, SidesAt};
use super::exit::Exit;
use super::model::{named_beam, origin};
use super::settings::{effective, load};
use crate::beam_model::{
    BeamModel, MachineModel, ModelSet, ReferenceOutput, TableKind, WedgeModel, WedgeModelKind,
};
use crate::dose::{
    FactorName, FieldDepth, FieldInput, FieldModel, FieldWedge, Form, Mayneord, PlacedWedge,
    RayPoint, Typed, dose_per_mu, mayneord, outside_method,
};
use crate::quantity::Quantity;
use crate::report::trace_text;
use crate::settings::Site;

/// Calculates one field.
pub(super) fn run(arguments: FieldArguments, out: &mut dyn Write) -> anyhow::Result<Exit> {
    check(&arguments)?;
    let effective = effective(&arguments.common)?;
    let models = match arguments.machine {
        Some(_) => load(&effective.models_folder)?,
        None => ModelSet::default(),
    };
    let model = chosen_model(&arguments, &models)?;
    calculate(&arguments, model, &effective.site, out)
}

fn calculate(
    arguments: &FieldArguments,
    model: Option<(&MachineModel, &BeamModel)>,
    site: &Site,
    out: &mut dyn Write,
) -> anyhow::Result<Exit> {
    let mut typed = typed_factors(arguments);
    let corrected = corrected_pdd(arguments, model)?;
    if let Some((mayneord, words)) = &corrected {
        typed.push((
            FactorName::PercentDepthDose,
            Typed {
                value: mayneord.pdd_percent / 100.0,
                source: words.clone(),
            },
        ));
    }
    let field = field_input(arguments, model, typed)?;
    let trace = dose_per_mu(&field)?;
    if arguments.json {
        serde_json::to_writer_pretty(&mut *out, &trace)?;
        writeln!(out)?;
    } else {
        write!(out, "{}", trace_text(&trace))?;
        if let Some((mayneord, _)) = &corrected {
            writeln!(
                out,
                "Mayneord F = {:.6}, PDD = {:.3} %",
                mayneord.factor, mayneord.pdd_percent
            )?;
        }
        if let Some(dose_gy) = arguments.dose {
            let mu = 100.0 * dose_gy / trace.dose_per_mu_cgy;
            writeln!(out, "MU for {dose_gy} Gy = {mu:.3}")?;
        }
        if let Some(mu) = arguments.mu {
            let dose_gy = mu * trace.dose_per_mu_cgy / 100.0;
            writeln!(out, "dose of {mu} MU = {dose_gy:.4} Gy")?;
        }
        if let Some((machine, _)) = model {
            writeln!(
                out,
                "model {} ({} data): {}",
                machine.name,
                origin(machine),
                machine.provenance.remark
            )?;
        }
    }
    let d_max_cm = arguments
        .d_max
        .or_else(|| model.map(|(_, beam)| beam.d_max_cm));
    let outside = outside_method(&field, d_max_cm, site.technical.edge_margin_cm);
    if !arguments.json {
        for reason in &outside {
            writeln!(out, "no verification: {}", reason.message)?;
        }
        if d_max_cm.is_none() {
            writeln!(
                out,
                "the depth of dose maximum is not known (--d-max): whether the point lies in the build-up was not checked"
            )?;
        }
    }
    Ok(if outside.is_empty() {
        Exit::Within
    } else {
        Exit::Incomplete
    })
}

/// Numbers nobody can mean are refused with the unit slip that would explain them.
fn check(arguments: &FieldArguments) -> anyhow::Result<()> {
    let lengths = [
        ("--depth", Some(arguments.depth), Quantity::Depth),
        (
            "--effective-depth",
            arguments.effective_depth,
            Quantity::Depth,
        ),
        ("--d-max", arguments.d_max, Quantity::Depth),
        (
            "--reference-depth",
            arguments.reference_depth,
            Quantity::Depth,
        ),
        ("--sad", Some(arguments.sad), Quantity::SourceAxisDistance),
        ("--ssd", arguments.ssd, Quantity::SourceSurfaceDistance),
        (
            "--pdd-ssd",
            arguments.pdd_ssd,
            Quantity::SourceSurfaceDistance,
        ),
        (
            "--reference-distance",
            arguments.reference_distance,
            Quantity::SourceSurfaceDistance,
        ),
        ("--output", arguments.output, Quantity::ReferenceOutput),
        (
            "--tray-factor",
            arguments.tray_factor,
            Quantity::Transmission,
        ),
        (
            "--couch-factor",
            arguments.couch_factor,
            Quantity::Transmission,
        ),
        (
            "--wedge-factor",
            arguments.wedge_factor,
            Quantity::Transmission,
        ),
        (
            "--other-factor",
            arguments.other_factor,
            Quantity::Transmission,
        ),
        ("--dose", arguments.dose, Quantity::BeamDose),
        ("--mu", arguments.mu, Quantity::BeamMeterset),
    ];
    for (option, value, quantity) in lengths {
        if let Some(objection) = value.and_then(|value| quantity.objection(value)) {
            bail!("{option}: {objection}");
        }
    }
    let ratios = [
        ("--sc", arguments.sc),
        ("--sp", arguments.sp),
        ("--tpr", arguments.tpr),
        ("--pdd", arguments.pdd),
        ("--oar", arguments.oar),
    ];
    for (option, value) in ratios {
        if value.is_some_and(|value| !(value.is_finite() && value > 0.0)) {
            bail!("{option}: must be a number above 0");
        }
    }
    if arguments.pdd.is_some_and(|percent| percent < 1.5) {
        bail!("--pdd is in per cent: 66.7, not 0.667");
    }
    Ok(())
}

fn chosen_model<'a>(
    arguments: &FieldArguments,
    models: &'a ModelSet,
) -> anyhow::Result<Option<(&'a MachineModel, &'a BeamModel)>> {
    let Some(name) = &arguments.machine else {
        return Ok(None);
    };
    let energy = arguments
        .energy
        .as_deref()
        .with_context(|| format!("--energy is needed with --machine {name}"))?;
    let (machine, beam) = named_beam(models, name, energy)?;
    Ok(Some((machine, beam)))
}

fn typed_factors(arguments: &FieldArguments) -> Vec<(FactorName, Typed)> {
    let typed_pdd = arguments
        .pdd
        .filter(|_| arguments.pdd_ssd.is_none())
        .map(|percent| percent / 100.0);
    [
        (FactorName::CollimatorScatter, arguments.sc),
        (FactorName::PhantomScatter, arguments.sp),
        (FactorName::TissuePhantomRatio, arguments.tpr),
        (FactorName::PercentDepthDose, typed_pdd),
        (FactorName::OffAxisRatio, arguments.oar),
        (FactorName::Wedge, arguments.wedge_factor),
        (FactorName::Tray, arguments.tray_factor),
        (FactorName::Couch, arguments.couch_factor),
        (FactorName::OtherTransmission, arguments.other_factor),
    ]
    .into_iter()
    .filter_map(|(name, value)| value.map(|value| (name, Typed::new(value))))
    .collect()
}

/// The typed depth dose taken to the field's SSD by Mayneord's factor, when it was typed for another.
fn corrected_pdd(
    arguments: &FieldArguments,
    model: Option<(&MachineModel, &BeamModel)>,
) -> anyhow::Result<Option<(Mayneord, String)>> {
    let Some((from_ssd_cm, percent)) = arguments.pdd_ssd.zip(arguments.pdd) else {
        return Ok(None);
    };
    let to_ssd_cm = arguments.ssd.context("--pdd-ssd needs --ssd as well")?;
    let d0_cm = arguments
        .reference_depth
        .or_else(|| model.map(|(_, beam)| beam.output.depth_cm))
        .context("--pdd-ssd needs --reference-depth, the depth that the PDD is normalised at")?;
    let mayneord = mayneord(percent, from_ssd_cm, to_ssd_cm, arguments.depth, d0_cm);
    let words = format!(
        "typed {percent} % at SSD {from_ssd_cm} cm, times Mayneord's F {:.6}",
        mayneord.factor
    );
    Ok(Some((mayneord, words)))
}

fn field_input<'a>(
    arguments: &FieldArguments,
    model: Option<(&'a MachineModel, &'a BeamModel)>,
    typed: Vec<(FactorName, Typed)>,
) -> anyhow::Result<FieldInput<'a>> {
    let sad_cm = match model {
        Some((machine, _)) if (machine.sad_cm - arguments.sad).abs() > 1e-6 => bail!(
            "--sad {} differs from the model's {}",
            arguments.sad,
            machine.sad_cm
        ),
        _ => arguments.sad,
    };
    let spd_cm = arguments
        .ssd
        .map_or(sad_cm, |ssd_cm| ssd_cm + arguments.depth);
    let scale = match (arguments.sides_at, arguments.ssd) {
        (SidesAt::Isocentre, _) => 1.0,
        (SidesAt::Surface, Some(ssd_cm)) => sad_cm / ssd_cm,
        (SidesAt::Surface, None) => sad_cm / (sad_cm - arguments.depth),
        (SidesAt::Point, _) => sad_cm / spd_cm,
    };
    let side = |single: Option<super::args::Opening>| {
        single
            .or(arguments.square)
            .map(|opening| opening.positions_cm.map(|position_cm| position_cm * scale))
    };
    let (Some(jaws_x_cm), Some(jaws_y_cm)) = (side(arguments.x), side(arguments.y)) else {
        bail!("the field's sides are needed: --square, or --x and --y");
    };
    let typed_pdd = typed
        .iter()
        .any(|(name, _)| *name == FactorName::PercentDepthDose);
    let table_is_pdd =
        model.is_some_and(|(_, beam)| matches!(beam.table_kind, TableKind::Pdd { .. }));
    let form = match arguments.ssd {
        Some(ssd_cm) if typed_pdd || (table_is_pdd && arguments.tpr.is_none()) => {
            Form::FixedSsd { ssd_cm }
        }
        None if typed_pdd => bail!("--pdd belongs to a fixed SSD: give --ssd, or type --tpr"),
        _ => Form::Isocentric,
    };
    let ray = RayPoint {
        projected_cm: arguments.point.unwrap_or_default().0,
        spd_cm,
        sad_cm,
    };
    Ok(FieldInput {
        model: model.map(|(machine, beam)| FieldModel {
            beam,
            upper_jaws: machine.upper_jaws,
        }),
        jaws_x_cm,
        jaws_y_cm,
        ray,
        depth: FieldDepth {
            perpendicular_cm: Some(arguments.depth),
            effective_cm: arguments
                .effective_depth
                .unwrap_or(arguments.depth / ray.cosine()),
            source: "typed".to_owned(),
        },
        form,
        tray: None,
        wedge: wedge(arguments, model)?,
        couch: None,
        reference: reference(arguments, model)?,
        typed,
    })
}

/// The model's wedge of the typed ID, as it lies.
fn wedge<'a>(
    arguments: &FieldArguments,
    model: Option<(&'a MachineModel, &'a BeamModel)>,
) -> anyhow::Result<Option<FieldWedge<'a>>> {
    let (Some(id), Some(orientation_deg)) = (&arguments.wedge, arguments.wedge_orientation) else {
        return Ok(None);
    };
    let (_, beam) = model.context("--wedge needs a model (--machine, --energy)")?;
    let known = beam.wedge(id).with_context(|| {
        let ids: Vec<&str> = beam.wedges.iter().flat_map(WedgeModel::ids).collect();
        format!(
            "the beam model has no wedge {id} for {}; it has {}",
            beam.label,
            if ids.is_empty() {
                "none".to_owned()
            } else {
                ids.join(", ")
            }
        )
    })?;
    if let Some(objection) = Quantity::Angle.objection(orientation_deg) {
        bail!("--wedge-orientation: {objection}");
    }
    let share_in = arguments.wedge_share.unwrap_or(1.0);
    if !(share_in > 0.0 && share_in <= 1.0) {
        bail!("--wedge-share: {share_in} is no share above 0 and at most 1");
    }
    if share_in < 1.0 && known.kind() != WedgeModelKind::Motorised {
        bail!("--wedge-share: {id} is a {} wedge", known.kind().term());
    }
    let placed = PlacedWedge::new(known, orientation_deg).with_context(|| {
        format!(
            "{id} is a dynamic wedge: its factor depends on how the jaw moves; type --wedge-factor"
        )
    })?;
    Ok(Some(FieldWedge {
        placed,
        share_in,
        index: 0,
    }))
}

/// D'0 with its place: typed, the model's, or a mixture of both.
fn reference(
    arguments: &FieldArguments,
    model: Option<(&MachineModel, &BeamModel)>,
) -> anyhow::Result<Option<ReferenceOutput>> {
    let of_model = model.map(|(_, beam)| beam.output);
    let any_typed = arguments.output.is_some()
        || arguments.reference_depth.is_some()
        || arguments.reference_distance.is_some();
    if !any_typed {
        return Ok(None);
    }
    let missing = |option: &str| format!("{option} is needed, or a model (--machine, --energy)");
    Ok(Some(ReferenceOutput {
        dose_per_mu_cgy: arguments
            .output
            .or(of_model.map(|output| output.dose_per_mu_cgy))
            .with_context(|| missing("--output"))?,
        depth_cm: arguments
            .reference_depth
            .or(of_model.map(|output| output.depth_cm))
            .with_context(|| missing("--reference-depth"))?,
        source_distance_cm: arguments
            .reference_distance
            .or(of_model.map(|output| output.source_distance_cm))
            .with_context(|| missing("--reference-distance"))?,
    }))
}
