//! One beam of a machine: reference output, depth-dose table, output factors,
//! off-axis ratios, transmissions and uncertainties.

use std::sync::Arc;

use serde::Serialize;

use super::scatter::{NoKernel, ScatterAtDepth, ScatterKernel, ScatterRow};
use super::{Grid, HeadScatter, Lookup, OutOfRange, ProofPoint, WedgeModel};
use crate::plan::{BeamEnergy, RadiationType};
use crate::quantity::{
    CollimatorSquare, PointSquare, ReferenceDepthSquare, SurfaceSquare, normal_between, tolerance,
};

/// One photon beam.
#[derive(Clone, Debug)]
pub struct BeamModel {
    /// Energy label as in outputs: `6`, `18`, `6-FFF`.
    pub label: String,
    /// Radiation type.
    pub radiation: RadiationType,
    /// Nominal energy, MV or MeV.
    pub nominal_energy: f64,
    /// Fluence mode IDs of a non-standard (unflattened) beam; empty for a standard one.
    pub fluence_mode_ids: Vec<String>,
    /// Dose per MU at the reference point.
    pub output: ReferenceOutput,
    /// Depth of dose maximum, cm: the deepest over the sides. Shallower points lie in the build-up.
    pub d_max_cm: f64,
    /// What the depth table holds.
    pub table_kind: TableKind,
    /// The depth table, depth_cm down, side_cm across, normalised to 1 (TPR) or 100 (PDD) at d0.
    pub depth_table: Grid,
    /// Sc and Sp by side.
    pub output_factors: OutputTable,
    /// Off-axis ratios.
    pub off_axis: OffAxis,
    /// Exchange coefficient k of the collimator: c = (1+k) L U / (k L + U), U the upper and L the lower opening.
    pub exchange_k: f64,
    /// The primary's penumbra; `None` when not given.
    pub penumbra: Option<Penumbra>,
    /// Source to the plane that head scatter seems to come from, cm; `None` when not given.
    pub extra_focal_distance_cm: Option<f64>,
    /// Tray transmission by tray ID.
    pub trays: Vec<(String, f64)>,
    /// Wedges.
    pub wedges: Vec<WedgeModel>,
    /// Couch transmission by gantry angle.
    pub couch: Vec<CouchArc>,
    /// Uncertainties, 1 sigma.
    pub uncertainty: BeamUncertainty,
    /// Measured points that prove the beam.
    pub proof: Vec<ProofPoint>,
    /// Head scatter as two sources; `None` when the model does not give the distances that it needs.
    pub head_scatter: Option<HeadScatter>,
    /// Scatter kernel of the tables, worked out when first asked for.
    pub(super) kernel: Arc<ScatterKernel>,
}

/// D'0 and where it holds: a 10 cm x 10 cm field at the isocentre plane, depth d0, source distance `S_ref`.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct ReferenceOutput {
    /// D'0, cGy/MU.
    pub dose_per_mu_cgy: f64,
    /// d0, cm: the normalisation depth of tables and of Sp.
    pub depth_cm: f64,
    /// `S_ref`, cm: source to reference point.
    pub source_distance_cm: f64,
}

/// What a depth table holds.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum TableKind {
    /// Tissue-phantom ratio by depth and side at the point.
    Tpr,
    /// Percent depth dose by depth and side at the surface, at this SSD.
    Pdd {
        /// SSD of the measurement, cm.
        ssd_cm: f64,
    },
}

/// Output factors: side_cm, Sc, Sp.
#[derive(Clone, Debug)]
pub struct OutputTable {
    /// Sc by side at the isocentre plane, as a grid of one column.
    pub sc: Grid,
    /// Sp by side at the normalisation depth, as a grid of one column.
    pub sp: Grid,
}

/// Off-axis ratios, radius_cm (projected to the isocentre plane) down, depth_cm across.
#[derive(Clone, Debug)]
pub struct OffAxis {
    /// In air or in water.
    pub kind: OffAxisKind,
    /// The ratios.
    pub grid: Grid,
}

/// How off-axis ratios were obtained.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, serde::Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum OffAxisKind {
    /// Primary, in air, with softening at depth: the depth is along the ray.
    InAir,
    /// In a flat water phantom: obliquity is in it, the depth is perpendicular.
    InWater,
}

/// Couch transmission over an arc of gantry angles.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct CouchArc {
    /// From this gantry angle, degrees, clockwise ...
    pub from_deg: f64,
    /// ... to this one, through 360 when `to` is less than `from`.
    pub to_deg: f64,
    /// Transmission, a share.
    pub transmission: f64,
}

/// How the primary is blurred by source size and electron range: one Gaussian, or two for an edge with a tail.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Penumbra {
    /// Sigma in the plane of the point, cm.
    pub sigma_cm: f64,
    /// Share of the tail, 0 to 0.5.
    pub tail_share: f64,
    /// The tail's sigma, cm; at least `sigma_cm`.
    pub tail_sigma_cm: f64,
}

impl Penumbra {
    /// Blurred primary fluence in the middle of a square of this side, cm, 1 without blur.
    #[must_use]
    pub fn on_axis_of_square(&self, side_cm: f64) -> f64 {
        let half_cm = side_cm / 2.0;
        let gaussian = |sigma_cm| normal_between([-half_cm, half_cm], sigma_cm).powi(2);
        let main = gaussian(self.sigma_cm);
        main + (gaussian(self.tail_sigma_cm) - main) * self.tail_share
    }
}

/// 1-sigma uncertainties of a beam's data, per cent of dose.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct BeamUncertainty {
    /// Reference output.
    pub output_percent: f64,
    /// Depth table.
    pub depth_table_percent: f64,
    /// Sc.
    pub head_scatter_percent: f64,
    /// Sp.
    pub phantom_scatter_percent: f64,
    /// Off-axis ratio, away from the axis.
    pub off_axis_percent: f64,
    /// Tray, couch and similar transmissions, each.
    pub transmission_percent: f64,
}

impl BeamModel {
    /// Whether this is the beam that a plan's energy names. A fluence mode that
    /// is not stated matches a standard beam only (the caller notes it).
    #[must_use]
    pub fn matches(&self, radiation: &RadiationType, energy: &BeamEnergy) -> bool {
        let Some(&nominal) = energy.nominal.value() else {
            return false;
        };
        if *radiation != self.radiation || (nominal - self.nominal_energy).abs() > tolerance::ENERGY
        {
            return false;
        }
        match energy.fluence_mode.value().map(String::as_str) {
            None | Some("STANDARD") => self.fluence_mode_ids.is_empty(),
            Some(_) => energy
                .fluence_mode_id
                .value()
                .is_some_and(|id| self.fluence_mode_ids.iter().any(|known| known == id)),
        }
    }

    /// Sc of a collimator opening.
    ///
    /// # Errors
    /// When the side is outside the table.
    pub fn sc(&self, square: CollimatorSquare) -> Result<Lookup, OutOfRange> {
        self.output_factors.sc.at(square.side_cm(), 0.0)
    }

    /// Sp of the field at the plane of the point.
    ///
    /// # Errors
    /// When the side is outside the table.
    pub fn sp(&self, square: PointSquare) -> Result<Lookup, OutOfRange> {
        self.output_factors.sp.at(square.side_cm(), 0.0)
    }

    /// Sp of the field at the normalisation depth.
    ///
    /// # Errors
    /// When the side is outside the table.
    pub fn sp_at_d0(&self, square: ReferenceDepthSquare) -> Result<Lookup, OutOfRange> {
        self.output_factors.sp.at(square.side_cm(), 0.0)
    }

    /// TPR(d, s_d), normalised to 1 at d0. From a TPR table directly; from a PDD table by
    /// TPR(d, s_d) = PDD(d, s, SSD)/100 * ((SSD + d)/(SSD + d0))^2 * Sp(s_d0)/Sp(s_d)
    /// (AAPM TG-71) at the table's own SSD.
    ///
    /// # Errors
    /// When depth or side is outside the measured tables.
    pub fn tpr(&self, depth_cm: f64, square: PointSquare) -> Result<Lookup, OutOfRange> {
        match self.table_kind {
            TableKind::Tpr => self.depth_table.at(depth_cm, square.side_cm()),
            TableKind::Pdd { ssd_cm } => {
                let d0_cm = self.output.depth_cm;
                let spd_cm = ssd_cm + depth_cm;
                let surface = square.at_surface(ssd_cm, spd_cm);
                let at_d0 = square.at_reference_depth(ssd_cm, d0_cm, spd_cm);
                let pdd = self.depth_table.at(depth_cm, surface.side_cm())?;
                let sp_d0 = self.sp_at_d0(at_d0)?;
                let sp_d = self.sp(square)?;
                let value = pdd.value / 100.0 * (spd_cm / (ssd_cm + d0_cm)).powi(2) * sp_d0.value
                    / sp_d.value;
                Ok(Lookup::converted(value, [pdd, sp_d0, sp_d]))
            }
        }
    }

    /// PDD(d, s, SSD) in per cent of the dose at d0, at any SSD. From a PDD table at its own
    /// SSD directly; else by way of TPR: PDD = 100 * TPR(d, s_d) * Sp(s_d)/Sp(s_d0) *
    /// ((SSD + d0)/(SSD + d))^2 (AAPM TG-71), with s_d the field of side s at the surface
    /// projected onto depth d.
    ///
    /// # Errors
    /// When depth or side is outside the measured tables.
    pub fn pdd_percent(
        &self,
        depth_cm: f64,
        square: SurfaceSquare,
        ssd_cm: f64,
    ) -> Result<Lookup, OutOfRange> {
        if let TableKind::Pdd {
            ssd_cm: table_ssd_cm,
        } = self.table_kind
            && (ssd_cm - table_ssd_cm).abs() < tolerance::POSITION_CM
        {
            return self.depth_table.at(depth_cm, square.side_cm());
        }
        let d0_cm = self.output.depth_cm;
        let spd_cm = ssd_cm + depth_cm;
        let at_point = PointSquare::new(square.side_cm() * spd_cm / ssd_cm);
        let tpr = self.tpr(depth_cm, at_point)?;
        let sp_d = self.sp(at_point)?;
        let sp_d0 = self.sp_at_d0(at_point.at_reference_depth(ssd_cm, d0_cm, spd_cm))?;
        let value =
            100.0 * tpr.value * sp_d.value / sp_d0.value * ((ssd_cm + d0_cm) / spd_cm).powi(2);
        Ok(Lookup::converted(value, [tpr, sp_d, sp_d0]))
    }

    /// Off-axis ratio at a radius projected to the isocentre plane; `depth_cm` along the ray for
    /// `InAir`, perpendicular to the surface for `InWater`.
    ///
    /// # Errors
    /// When radius or depth is outside the table.
    pub fn off_axis_ratio(&self, radius_cm: f64, depth_cm: f64) -> Result<Lookup, OutOfRange> {
        self.off_axis.grid.at(radius_cm, depth_cm)
    }

    /// The scatter kernel at an effective depth, cm.
    ///
    /// # Errors
    /// When the depth is outside the table, or too few squares reach it.
    pub fn scatter_at(&self, depth_cm: f64) -> Result<ScatterAtDepth<'_>, NoKernel> {
        self.kernel.at(self, depth_cm)
    }

    /// The depths of the table at which the scatter kernel can be had, with the squares that it was made from.
    pub fn scatter_rows(&self) -> impl Iterator<Item = ScatterRow<'_>> {
        self.kernel.rows(self)
    }

    /// Attenuation of the primary as the zero-field terms tell it between 10 and 20 cm, ln(K(10, 0)/K(20, 0))/10,
    /// per cm; `None` when the tables do not reach so far or hold doses that are not positive.
    #[must_use]
    pub fn primary_attenuation_per_cm(&self) -> Option<f64> {
        let primary = |depth_cm| Some(self.scatter_at(depth_cm).ok()?.primary());
        let per_cm = (primary(10.0)? / primary(20.0)?).ln() / 10.0;
        per_cm.is_finite().then_some(per_cm)
    }

    /// Transmission of a tray by its ID.
    #[must_use]
    pub fn tray_transmission(&self, tray_id: &str) -> Option<f64> {
        self.trays
            .iter()
            .find(|(id, _)| id == tray_id.trim())
            .map(|&(_, transmission)| transmission)
    }

    /// The wedge that a plan names by this ID.
    #[must_use]
    pub fn wedge(&self, wedge_id: &str) -> Option<&WedgeModel> {
        let wanted = wedge_id.trim();
        self.wedges
            .iter()
            .find(|wedge| wedge.ids().any(|id| id == wanted))
    }

    /// The couch arc that a gantry angle (0 <= a < 360) falls in.
    #[must_use]
    pub fn couch_arc(&self, gantry_deg: f64) -> Option<CouchArc> {
        self.couch.iter().copied().find(|arc| {
            if arc.from_deg <= arc.to_deg {
                (arc.from_deg..=arc.to_deg).contains(&gantry_deg)
            } else {
                gantry_deg >= arc.from_deg || gantry_deg <= arc.to_deg
            }
        })
    }
}
