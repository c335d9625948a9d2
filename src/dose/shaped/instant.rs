//! What holds at one moment: kernel, exposure, head scatter, distance, devices.

use super::blocks::cut_blocks;
use super::exposure::{Exposure, expose};
use super::head::aperture_over_jaws;
use super::jaw_scatter::{JawScatter, jaw_scatter};
use super::moments::Moment;
use super::opening::Opening;
use super::standing::{Standing, SumError};
use super::trace::off_axis_depth_cm;
use crate::beam_model::scatter::ScatterAtDepth;
use crate::beam_model::{CouchArc, OffAxisKind};
use crate::dose::{FactorName, RayPoint};
use crate::quantity::{PointSquare, tolerance};

/// What holds at one moment.
pub(super) struct Instant<'a> {
    pub(super) kernel: ScatterAtDepth<'a>,
    pub(super) exposure: Exposure,
    pub(super) inverse_square: f64,
    pub(super) jaw_sc: f64,
    pub(super) jaw_side_cm: f64,
    pub(super) below_table: bool,
    pub(super) aperture_over_jaws: f64,
    pub(super) off_axis_ratio: f64,
    pub(super) wedge: Option<f64>,
    pub(super) couch: Option<CouchArc>,
    pub(super) effective_cm: f64,
    pub(super) least_depth_cm: f64,
}

impl<'a> Instant<'a> {
    pub(super) fn new(
        standing: &'a Standing<'_>,
        moment: &Moment<'_>,
        opening: &mut Opening,
        ray: RayPoint,
        jaws: &mut Option<JawScatter>,
    ) -> Result<Self, SumError> {
        let beam = standing.beam();
        let depth = standing
            .depths
            .at(moment)
            .ok_or(SumError::Missing("the depth at a control point"))?;
        let tpr_depth_cm = match beam.off_axis.kind {
            OffAxisKind::InAir => depth.effective_cm,
            OffAxisKind::InWater => depth.effective_cm * ray.cosine(),
        };
        let kernel = beam.scatter_at(tpr_depth_cm)?;
        let jaw = jaw_scatter(standing, opening, jaws)?;
        let (jaw_side_cm, jaw_sc, below_table) = (jaw.side_cm, jaw.sc, jaw.below_table);
        let transmission = standing
            .banks
            .iter()
            .map(|bank| bank.model.transmission)
            .product();
        let aperture_over_jaws = standing.head.as_ref().map_or(1.0, |(head, heights)| {
            aperture_over_jaws(head, heights, opening, ray, (jaw_side_cm, transmission))
        });
        cut_blocks(opening, standing.blocks, standing.steps.strip_cm);
        let radius_cm = ray.off_axis_cm();
        let off_axis_ratio = if radius_cm < tolerance::POSITION_CM {
            1.0
        } else {
            let at_cm = off_axis_depth_cm(depth, tpr_depth_cm, beam, ray);
            beam.off_axis_ratio(radius_cm, at_cm)
                .map_err(|range| SumError::Range(FactorName::OffAxisRatio, range))?
                .value
        };
        let exposure = expose(opening, ray, &kernel, &standing.penumbra);
        Ok(Self {
            wedge: standing.wedge_at(moment, ray, &kernel, (&exposure, tpr_depth_cm))?,
            exposure,
            kernel,
            inverse_square: (beam.output.source_distance_cm / ray.spd_cm).powi(2),
            jaw_sc,
            jaw_side_cm,
            below_table,
            aperture_over_jaws,
            off_axis_ratio,
            couch: standing.couch_at(moment),
            effective_cm: depth.effective_cm,
            least_depth_cm: depth
                .perpendicular_cm
                .map_or(tpr_depth_cm, |depth_cm| depth_cm.min(tpr_depth_cm)),
        })
    }
}

impl Standing<'_> {
    /// What the wedge does at a moment: its factor for the square that scatters as the opening does, times its profile at
    /// the point; `None` when it is out.
    fn wedge_at(
        &self,
        moment: &Moment<'_>,
        ray: RayPoint,
        kernel: &ScatterAtDepth<'_>,
        (exposure, depth_cm): (&Exposure, f64),
    ) -> Result<Option<f64>, SumError> {
        let Some((wedge, index)) = &self.wedge else {
            return Ok(None);
        };
        let position = moment.between.start.wedges.get(*index);
        match position.and_then(|position| position.in_beam.get()) {
            Some(true) => {}
            Some(false) => return Ok(None),
            None => return Err(SumError::Missing("a wedge position")),
        }
        let fluence = exposure.open_fluence + exposure.leak_fluence;
        let scatter = exposure.open_scatter + exposure.leak_scatter;
        let (least_cm, greatest_cm) = kernel.sides_cm();
        let side_cm = kernel
            .side_with_scatter(scatter / (fluence * kernel.primary()))
            .clamp(least_cm, greatest_cm);
        let range = |range| SumError::Range(FactorName::Wedge, range);
        let factor = wedge
            .factor_at(depth_cm, PointSquare::new(side_cm))
            .map_err(range)?;
        let profile = wedge.profile_at(ray.projected_cm).map_err(range)?;
        Ok(Some(factor.value * profile.value))
    }
}
