//! Adds the moments of a beam up: the dose per MU, and the means over the
//! meterset from which each factor of the trace is made, so that their product is
//! the dose and not an approximation of it.

use super::bank::Bank;
use super::blocks::{BlockShape, cut_blocks};
use super::depth_track::DepthTrack;
use super::exposure::{Exposure, expose, open_fluence_beside};
use super::fluence_image::FluenceSum;
use super::head::{Heights, aperture_over_jaws};
use super::moments::{Moment, StepLimits};
use super::opening::Opening;
use super::results::ControlPointDose;
use super::trace::off_axis_depth_cm;
use crate::beam_model::scatter::{NoKernel, ScatterAtDepth};
use crate::beam_model::{BeamModel, CouchArc, HeadScatter, OffAxisKind, OutOfRange, Penumbra};
use crate::dose::aperture::collimator_square;
use crate::dose::placement::BeamGeometry;
use crate::dose::{FactorName, FieldModel, PlacedWedge, RayPoint};
use crate::quantity::{CollimatorSquare, PointSquare, tolerance};

/// Everything that does not change from moment to moment.
pub(super) struct Standing<'a> {
    pub(super) model: FieldModel<'a>,
    pub(super) geometry: &'a BeamGeometry,
    pub(super) banks: &'a [Bank<'a>],
    pub(super) blocks: &'a [BlockShape<'a>],
    pub(super) head: Option<(&'a HeadScatter, Heights)>,
    pub(super) depths: &'a DepthTrack,
    pub(super) penumbra: Penumbra,
    /// The fluence is compared with that at this distance from the point, cm in its plane.
    pub(super) margin_cm: f64,
    pub(super) steps: StepLimits,
    /// Height of the upper jaws, cm from the source; used below the smallest opening of the Sc table only.
    pub(super) jaw_height_cm: f64,
    /// Whether the couch counts by the gantry angle.
    pub(super) couch: bool,
    /// The wedge, with its item index in every control point's wedge positions.
    pub(super) wedge: Option<(PlacedWedge<'a>, usize)>,
}

/// Where the fluence beside the point is looked at, as shares of the margin: along the axes half-way and at its end,
/// between them at three quarters. Blurred by the penumbra, a leaf edge is half a centimetre wide.
const PLACES: [[f64; 2]; 12] = [
    [0.5, 0.0],
    [-0.5, 0.0],
    [0.0, 0.5],
    [0.0, -0.5],
    [1.0, 0.0],
    [-1.0, 0.0],
    [0.0, 1.0],
    [0.0, -1.0],
    [0.53, 0.53],
    [-0.53, 0.53],
    [0.53, -0.53],
    [-0.53, -0.53],
];

/// Why the moments could not be added up.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum SumError {
    /// A position, an angle or a depth is missing.
    Missing(&'static str),
    /// A table does not reach.
    Range(FactorName, OutOfRange),
    /// Too few squares of the depth table reach this depth, cm.
    Squares(f64),
}

impl From<NoKernel> for SumError {
    fn from(why: NoKernel) -> Self {
        match why {
            NoKernel::Range(range) => Self::Range(FactorName::ApertureInPhantom, range),
            NoKernel::Squares(depth_cm) => Self::Squares(depth_cm),
        }
    }
}

/// A dose in its four parts: primary through the opening and through leaves and blocks, scatter likewise.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Parts(pub(super) [f64; 4]);

impl Parts {
    fn of(exposure: &Exposure, primary: f64) -> Self {
        Self([
            exposure.open_fluence * primary,
            exposure.leak_fluence * primary,
            exposure.open_scatter,
            exposure.leak_scatter,
        ])
    }

    fn add(&mut self, other: Self, factor: f64) {
        for (sum, part) in self.0.iter_mut().zip(other.0) {
            *sum += part * factor;
        }
    }

    /// The whole, the scatter with its off-axis weight.
    pub(super) fn total(self, scatter_weight: f64) -> f64 {
        let [open, leak, open_scatter, leak_scatter] = self.0;
        open + leak + scatter_weight * (open_scatter + leak_scatter)
    }

    /// The four parts, the scatter with its off-axis weight.
    pub(super) fn weighted(self, scatter_weight: f64) -> [f64; 4] {
        let [open, leak, open_scatter, leak_scatter] = self.0;
        [
            open,
            leak,
            scatter_weight * open_scatter,
            scatter_weight * leak_scatter,
        ]
    }
}

/// Sums over the meterset.
#[derive(Clone, Debug)]
pub(super) struct Sums {
    /// Inverse square.
    pub(super) inverse_square: f64,
    /// The same times head scatter.
    pub(super) head: f64,
    /// The same times the dose in phantom per unit fluence.
    pub(super) in_phantom: Parts,
    /// The same times the off-axis ratio.
    pub(super) off_axis: Parts,
    /// The same times the wedge.
    pub(super) wedge: Parts,
    /// The same times the couch.
    pub(super) couch: Parts,
    /// Plain means: K(d, 0), Sc of the jaws, effective depth, SPD, off-axis radius, side of the jaws.
    pub(super) primary: f64,
    pub(super) jaw_sc: f64,
    pub(super) effective_cm: f64,
    pub(super) spd_cm: f64,
    pub(super) off_axis_cm: f64,
    pub(super) jaw_side_cm: f64,
    pub(super) exposure: Exposure,
    /// Least depth, as the build-up counts it, cm.
    pub(super) least_depth_cm: f64,
    /// Dose while the jaws stand below the smallest opening of the Sc table, in units of `couch`.
    pub(super) below_table: Parts,
    /// Open fluence at [`PLACES`] beside the point.
    pub(super) beside: [f64; PLACES.len()],
    /// Gap area over gap width of the leaves.
    pub(super) gap_area_cm2: f64,
    pub(super) gap_width_cm: f64,
    /// Share of the meterset with the wedge in the beam.
    pub(super) wedge_share: f64,
    /// Share of the meterset with the couch in the beam, and its transmission.
    pub(super) couch_share: f64,
    pub(super) fluence: FluenceSum,
    pub(super) intervals: Vec<ControlPointDose>,
    pub(super) moments: usize,
    /// The opening of the last moment with blocks cut out: for a field that stands still, the field.
    pub(super) opening: Opening,
    pub(super) ray: RayPoint,
}

/// Head scatter of the jaws, kept while the jaws stand still.
struct JawScatter {
    jaws_cm: [[f64; 2]; 2],
    side_cm: f64,
    sc: f64,
    below_table: bool,
}

/// Adds the moments up.
pub(super) fn add_up(standing: &Standing<'_>, moments: &[Moment<'_>]) -> Result<Sums, SumError> {
    let first = moments.first().ok_or(SumError::Missing("a meterset"))?;
    let mut sums = Sums::new(standing.ray(first)?);
    let mut opening = Opening::default();
    let mut jaws: Option<JawScatter> = None;
    for moment in moments {
        opening
            .set(standing.banks, moment.between)
            .ok_or(SumError::Missing("the position of a leaf or jaw"))?;
        let ray = standing.ray(moment)?;
        let at = Instant::new(standing, moment, &mut opening, ray, &mut jaws)?;
        sums.take(standing, moment, &at, &opening, ray);
    }
    sums.opening = opening;
    Ok(sums)
}

impl Standing<'_> {
    fn ray(&self, moment: &Moment<'_>) -> Result<RayPoint, SumError> {
        let gantry_deg = moment
            .gantry_deg
            .ok_or(SumError::Missing("a gantry angle"))?;
        self.geometry
            .ray_at(gantry_deg)
            .ok_or(SumError::Missing("the place of the point below the source"))
    }

    fn beam(&self) -> &BeamModel {
        self.model.beam
    }

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

    fn couch_at(&self, moment: &Moment<'_>) -> Option<CouchArc> {
        let gantry_deg = moment.gantry_deg?;
        self.couch
            .then(|| self.beam().couch_arc(gantry_deg.rem_euclid(360.0)))
            .flatten()
    }
}

/// What holds at one moment.
struct Instant<'a> {
    kernel: ScatterAtDepth<'a>,
    exposure: Exposure,
    inverse_square: f64,
    jaw_sc: f64,
    jaw_side_cm: f64,
    below_table: bool,
    aperture_over_jaws: f64,
    off_axis_ratio: f64,
    wedge: Option<f64>,
    couch: Option<CouchArc>,
    effective_cm: f64,
    least_depth_cm: f64,
}

impl<'a> Instant<'a> {
    fn new(
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

fn jaw_scatter<'j>(
    standing: &Standing<'_>,
    opening: &Opening,
    known: &'j mut Option<JawScatter>,
) -> Result<&'j JawScatter, SumError> {
    let stale = known
        .as_ref()
        .is_none_or(|known| known.jaws_cm != opening.jaws_cm);
    if stale {
        *known = Some(standing.jaw_scatter(opening.jaws_cm)?);
    }
    known.as_ref().ok_or(SumError::Missing("the jaws"))
}

impl Standing<'_> {
    /// Sc of a jaw opening. Jaws that close in the course of a moving field pass below the table's smallest
    /// opening: from there the two-source fit leads on, and the share of the dose that rests on it is told.
    fn jaw_scatter(&self, jaws_cm: [[f64; 2]; 2]) -> Result<JawScatter, SumError> {
        let [x, y] = jaws_cm.map(|jaw| jaw[1] - jaw[0]);
        let beam = self.beam();
        let table = &beam.output_factors.sc;
        let least_cm = table.rows().first().copied().unwrap_or_default();
        let closed = x <= tolerance::POSITION_CM || y <= tolerance::POSITION_CM;
        let side_cm = if closed {
            0.0
        } else {
            collimator_square(x, y, self.model.upper_jaws, beam.exchange_k).side_cm()
        };
        let range = |range| SumError::Range(FactorName::CollimatorScatter, range);
        let (sc, below_table) = match &beam.head_scatter {
            Some(head) if side_cm < least_cm - tolerance::TABLE_EDGE_CM => {
                let at_least = beam.sc(CollimatorSquare::new(least_cm)).map_err(range)?;
                let seen = |jaws_cm: [[f64; 2]; 2]| {
                    let [x, y] = jaws_cm.map(|jaw_cm| {
                        // Both pairs at the height of the upper one: only the ratio of two small openings counts.
                        head.window(jaw_cm, 0.0, self.jaw_height_cm)
                    });
                    head.visible(x, y)
                };
                let square = [[-least_cm / 2.0, least_cm / 2.0]; 2];
                let ratio =
                    head.output(seen(jaws_cm), side_cm) / head.output(seen(square), least_cm);
                (at_least.value * ratio, true)
            }
            _ => (
                beam.sc(CollimatorSquare::new(side_cm))
                    .map_err(range)?
                    .value,
                false,
            ),
        };
        Ok(JawScatter {
            jaws_cm,
            side_cm,
            sc,
            below_table,
        })
    }
}

impl Sums {
    fn new(ray: RayPoint) -> Self {
        Self {
            inverse_square: 0.0,
            head: 0.0,
            in_phantom: Parts::default(),
            off_axis: Parts::default(),
            wedge: Parts::default(),
            couch: Parts::default(),
            primary: 0.0,
            jaw_sc: 0.0,
            effective_cm: 0.0,
            spd_cm: 0.0,
            off_axis_cm: 0.0,
            jaw_side_cm: 0.0,
            exposure: Exposure::default(),
            least_depth_cm: f64::INFINITY,
            below_table: Parts::default(),
            beside: [0.0; PLACES.len()],
            gap_area_cm2: 0.0,
            gap_width_cm: 0.0,
            wedge_share: 0.0,
            couch_share: 0.0,
            fluence: FluenceSum::new(),
            intervals: Vec::new(),
            moments: 0,
            opening: Opening::default(),
            ray,
        }
    }

    fn take(
        &mut self,
        standing: &Standing<'_>,
        moment: &Moment<'_>,
        at: &Instant<'_>,
        opening: &Opening,
        ray: RayPoint,
    ) {
        let weight = moment.weight;
        let primary = at.kernel.primary();
        let couch = at.couch.map_or(1.0, |arc| arc.transmission);
        let to_here = weight * at.inverse_square;
        self.inverse_square += to_here;
        let to_here = to_here * at.jaw_sc * at.aperture_over_jaws;
        self.head += to_here;
        let parts = Parts::of(&at.exposure, primary);
        self.in_phantom.add(parts, to_here);
        self.off_axis.add(parts, to_here * at.off_axis_ratio);
        let wedge = at.wedge.unwrap_or(1.0);
        self.wedge.add(parts, to_here * at.off_axis_ratio * wedge);
        let factor = to_here * at.off_axis_ratio * wedge * couch;
        self.couch.add(parts, factor);
        if at.below_table {
            self.below_table.add(parts, factor);
        }
        self.primary += weight * primary;
        self.jaw_sc += weight * at.jaw_sc;
        self.effective_cm += weight * at.effective_cm;
        self.spd_cm += weight * ray.spd_cm;
        self.off_axis_cm += weight * ray.off_axis_cm();
        self.jaw_side_cm += weight * at.jaw_side_cm;
        self.exposure.open_fluence += weight * at.exposure.open_fluence;
        self.exposure.leak_fluence += weight * at.exposure.leak_fluence;
        self.exposure.open_scatter += weight * at.exposure.open_scatter;
        self.exposure.leak_scatter += weight * at.exposure.leak_scatter;
        self.least_depth_cm = self.least_depth_cm.min(at.least_depth_cm);
        let margin_cm = standing.margin_cm;
        let places_cm = PLACES.map(|place| place.map(|share| share * margin_cm));
        let beside = open_fluence_beside(opening, ray, (&places_cm, margin_cm), &standing.penumbra);
        for (sum, fluence) in self.beside.iter_mut().zip(beside) {
            *sum += weight * fluence;
        }
        self.gap_area_cm2 += weight * opening.gap_area_cm2;
        self.gap_width_cm += weight * opening.gap_width_cm;
        if at.wedge.is_some() {
            self.wedge_share += weight;
        }
        if at.couch.is_some() {
            self.couch_share += weight;
        }
        self.fluence.add(opening, weight);
        self.moments += 1;
        self.note_interval(
            standing,
            moment,
            at,
            to_here * at.off_axis_ratio * couch,
            parts,
            ray,
        );
    }

    fn note_interval(
        &mut self,
        standing: &Standing<'_>,
        moment: &Moment<'_>,
        at: &Instant<'_>,
        factor: f64,
        parts: Parts,
        ray: RayPoint,
    ) {
        let mut dose = Parts::default();
        dose.add(parts, factor);
        // Without the off-axis weight of the scatter, which is known at the end only.
        let dose_per_mu_cgy = dose.total(1.0) * standing.beam().output.dose_per_mu_cgy;
        let head_scatter = at.jaw_sc * at.aperture_over_jaws;
        let in_phantom = parts.total(1.0);
        let fluence = at.exposure.open_fluence + at.exposure.leak_fluence;
        let percent = 100.0 * moment.weight;
        match self.intervals.last_mut() {
            Some(last) if last.from_control_point == moment.start_index => {
                let (old, new) = (last.meterset_percent, percent);
                let mean = |a: f64, b: f64| (a * old + b * new) / (old + new);
                last.effective_depth_cm = mean(last.effective_depth_cm, at.effective_cm);
                last.spd_cm = mean(last.spd_cm, ray.spd_cm);
                last.point_fluence = mean(last.point_fluence, fluence);
                last.head_scatter = mean(last.head_scatter, head_scatter);
                last.in_phantom = mean(last.in_phantom, in_phantom);
                last.gantry_deg = last
                    .gantry_deg
                    .zip(moment.gantry_deg)
                    .map(|(a, b)| mean(a, b));
                last.meterset_percent = old + new;
                last.dose_per_mu_cgy += dose_per_mu_cgy;
            }
            _ => self.intervals.push(ControlPointDose {
                from_control_point: moment.start_index,
                meterset_percent: percent,
                gantry_deg: moment.gantry_deg,
                effective_depth_cm: at.effective_cm,
                spd_cm: ray.spd_cm,
                point_fluence: fluence,
                head_scatter,
                in_phantom,
                dose_per_mu_cgy,
            }),
        }
    }
}
