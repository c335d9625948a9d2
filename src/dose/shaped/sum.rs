//! Adds the moments of a beam up: the dose per MU, and the means over the
//! meterset from which each factor of the trace is made, so that their product is
//! the dose and not an approximation of it.

use super::beside::Surroundings;
use super::exposure::Exposure;
use super::fluence_image::FluenceSum;
use super::instant::Instant;
use super::jaw_scatter::JawScatter;
use super::moments::Moment;
use super::opening::Opening;
use super::parts::Parts;
use super::results::ControlPointDose;
use super::standing::{Standing, SumError};
use crate::dose::RayPoint;

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
    /// Gap area over gap width of the leaves.
    pub(super) gap_area_cm2: f64,
    pub(super) gap_width_cm: f64,
    /// Share of the meterset with the wedge in the beam.
    pub(super) wedge_share: f64,
    /// Share of the meterset with the couch in the beam, and its transmission.
    pub(super) couch_share: f64,
    pub(super) fluence: FluenceSum,
    pub(super) surroundings: Surroundings,
    pub(super) intervals: Vec<ControlPointDose>,
    pub(super) moments: usize,
    /// The opening of the last moment with blocks cut out: for a field that stands still, the field.
    pub(super) opening: Opening,
    pub(super) ray: RayPoint,
}

/// Adds the moments up.
pub(super) fn add_up(standing: &Standing<'_>, moments: &[Moment<'_>]) -> Result<Sums, SumError> {
    let first = moments.first().ok_or(SumError::Missing("a meterset"))?;
    let mut sums = Sums::new(standing, standing.ray(first)?);
    let mut opening = Opening::default();
    let mut jaws: Option<JawScatter> = None;
    for moment in moments {
        opening
            .set(standing.banks, moment.between, standing.steps.leaf_cm)
            .ok_or(SumError::Missing("the position of a leaf or jaw"))?;
        let ray = standing.ray(moment)?;
        let at = Instant::new(standing, moment, &mut opening, ray, &mut jaws)?;
        sums.take(standing, moment, &at, &opening, ray);
    }
    sums.opening = opening;
    Ok(sums)
}

impl Sums {
    fn new(standing: &Standing<'_>, ray: RayPoint) -> Self {
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
            gap_area_cm2: 0.0,
            gap_width_cm: 0.0,
            wedge_share: 0.0,
            couch_share: 0.0,
            fluence: FluenceSum::new(),
            surroundings: Surroundings::new(standing.margin_cm, standing.penumbra),
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
        self.exposure.add(&at.exposure, weight);
        self.least_depth_cm = self.least_depth_cm.min(at.least_depth_cm);
        self.gap_area_cm2 += weight * opening.gap_area_cm2;
        self.gap_width_cm += weight * opening.gap_width_cm;
        if at.wedge.is_some() {
            self.wedge_share += weight;
        }
        if at.couch.is_some() {
            self.couch_share += weight;
        }
        self.fluence.add(opening, weight);
        self.surroundings.add(opening, ray, weight);
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
