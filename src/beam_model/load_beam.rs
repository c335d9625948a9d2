//! One beam: its entry in `machine.toml` joined with its tables, and rules over
//! several of its keys. The tables themselves are for `load_tables`.

use std::sync::Arc;

use super::load_tables::{load_depth_table, load_off_axis, load_output_factors};
use super::load_wedge::load_wedges;
use super::machine_file::{BeamEntry, CouchEntry, DepthKindEntry, NormalisedAt, RadiationEntry};
use super::model_folder::ModelFolder;
use super::scatter::ScatterKernel;
use super::{
    BeamModel, BeamUncertainty, CouchArc, ModelError, Penumbra, ProofPoint, ReferenceOutput,
    TableKind,
};
use crate::plan::RadiationType;
use crate::quantity::tolerance;

/// Joins a beam's entry with its tables.
pub(super) fn load_beam(
    files: &mut ModelFolder,
    mut entry: BeamEntry,
) -> Result<BeamModel, ModelError> {
    let path = files.machine_path();
    let key = |name: &str| format!("beams {}, {name}", entry.label);
    let output = ReferenceOutput {
        dose_per_mu_cgy: entry.reference.dose_per_mu_cgy,
        depth_cm: entry.reference.depth_cm,
        source_distance_cm: entry.reference.source_distance_cm,
    };
    if entry.depth_table.d_max_cm > output.depth_cm + tolerance::TABLE_EDGE_CM {
        return Err(ModelError::setting(
            &path,
            key("reference.depth_cm"),
            format!(
                "the normalisation depth {} cm lies in the build-up, above d_max {} cm",
                output.depth_cm, entry.depth_table.d_max_cm
            ),
        ));
    }
    let table_kind = match (entry.depth_table.kind, entry.depth_table.ssd_cm) {
        (DepthKindEntry::Pdd, Some(ssd_cm)) => TableKind::Pdd { ssd_cm },
        (DepthKindEntry::Pdd, None) => {
            return Err(ModelError::setting(
                &path,
                key("depth_table.ssd_cm"),
                "a PDD table needs the SSD that it was measured at",
            ));
        }
        (_, Some(_)) => {
            return Err(ModelError::setting(
                &path,
                key("depth_table.ssd_cm"),
                "a TPR or TMR does not depend on SSD: leave the key out",
            ));
        }
        (DepthKindEntry::Tmr, None) if entry.depth_table.normalised_at == NormalisedAt::D0 => {
            return Err(ModelError::setting(
                &path,
                key("depth_table.normalised_at"),
                "a TMR is normalised at d_max; one normalised at d0 is a TPR",
            ));
        }
        (_, None) => TableKind::Tpr,
    };
    let depth_table = load_depth_table(files, &entry.depth_table, table_kind, output.depth_cm)?;
    let output_factors = load_output_factors(files, &entry.output_factors.file)?;
    let off_axis = load_off_axis(files, &entry.off_axis.file, entry.off_axis.kind)?;
    let mut trays: Vec<(String, f64)> = Vec::new();
    for tray in &entry.trays {
        if trays.iter().any(|(id, _)| *id == tray.id) {
            return Err(ModelError::setting(
                &path,
                key("trays.id"),
                format!("`{}` is given twice", tray.id),
            ));
        }
        trays.push((tray.id.clone(), tray.transmission));
    }
    let wedges = load_wedges(files, &entry.label, std::mem::take(&mut entry.wedges))?;
    let couch = entry.couch.iter().map(couch_arc).collect::<Vec<_>>();
    if let Some((one, other)) = first_overlap(&couch) {
        return Err(ModelError::setting(
            &path,
            key("couch"),
            format!(
                "the arcs {} to {} and {} to {} degrees overlap",
                one.from_deg, one.to_deg, other.from_deg, other.to_deg
            ),
        ));
    }
    let penumbra = penumbra(&entry)
        .map_err(|message| ModelError::setting(&path, key("penumbra_tail_share"), message))?;
    let uncertainty = BeamUncertainty {
        output_percent: entry.uncertainty.output_percent,
        depth_table_percent: entry.uncertainty.depth_table_percent,
        head_scatter_percent: entry.uncertainty.head_scatter_percent,
        phantom_scatter_percent: entry.uncertainty.phantom_scatter_percent,
        off_axis_percent: entry.uncertainty.off_axis_percent,
        transmission_percent: entry.uncertainty.transmission_percent,
    };
    let proof = entry.proof.into_iter().map(|point| ProofPoint {
        label: point.label,
        x_cm: point.x_cm,
        y_cm: point.y_cm,
        ssd_cm: point.ssd_cm,
        depth_cm: point.depth_cm,
        measured_cgy_per_mu: point.measured_cgy_per_mu,
    });
    let kernel = Arc::new(ScatterKernel::new(depth_table.rows()));
    Ok(BeamModel {
        radiation: match entry.radiation {
            RadiationEntry::Photon => RadiationType::Photon,
        },
        nominal_energy: entry.energy_mv,
        fluence_mode_ids: entry.fluence_mode_ids,
        output,
        d_max_cm: entry.depth_table.d_max_cm,
        table_kind,
        depth_table,
        output_factors,
        off_axis,
        exchange_k: entry.exchange_k,
        penumbra,
        extra_focal_distance_cm: entry.extra_focal_distance_cm,
        trays,
        wedges,
        couch,
        uncertainty,
        proof: proof.collect(),
        head_scatter: None,
        kernel,
        label: entry.label,
    })
}

/// One Gaussian, or two: a tail needs its share, its sigma and a main part that is narrower.
fn penumbra(entry: &BeamEntry) -> Result<Option<Penumbra>, &'static str> {
    let tail = (entry.penumbra_tail_share, entry.penumbra_tail_sigma_cm);
    match (entry.penumbra_sigma_cm, tail) {
        (sigma_cm, (None, None)) => Ok(sigma_cm.map(|sigma_cm| Penumbra {
            sigma_cm,
            tail_share: 0.0,
            tail_sigma_cm: sigma_cm,
        })),
        (Some(sigma_cm), (Some(tail_share), Some(tail_sigma_cm))) if tail_sigma_cm >= sigma_cm => {
            Ok(Some(Penumbra {
                sigma_cm,
                tail_share,
                tail_sigma_cm,
            }))
        }
        _ => Err(
            "a tail is given with penumbra_sigma_cm, penumbra_tail_share and a penumbra_tail_sigma_cm that is not smaller",
        ),
    }
}

fn couch_arc(entry: &CouchEntry) -> CouchArc {
    CouchArc {
        from_deg: entry.from_gantry_deg,
        to_deg: entry.to_gantry_deg,
        transmission: entry.transmission,
    }
}

/// Two couch arcs that share more than an end: the transmission there would depend on their order.
fn first_overlap(arcs: &[CouchArc]) -> Option<(CouchArc, CouchArc)> {
    let starts_inside = |outer: &CouchArc, inner: &CouchArc| {
        let length = (outer.to_deg - outer.from_deg).rem_euclid(360.0);
        let start = (inner.from_deg - outer.from_deg).rem_euclid(360.0);
        start < length
    };
    arcs.iter().enumerate().find_map(|(index, one)| {
        arcs.iter()
            .skip(index + 1)
            .find(|other| starts_inside(one, other) || starts_inside(other, one))
            .map(|other| (*one, *other))
    })
}
