//! Generated fields as plans: leaf positions for apertures whose edges lie on
//! leaf boundaries, one or more segments, the point and its depth.

use std::sync::Arc;

use counterfoil::beam_model::MachineModel;
use counterfoil::dose::{BeamCalculation, BeamRequest, ModelAnswer, StepLimits, calculate_beam};
use counterfoil::plan::{ControlPoint, DeviceKind, LeafPositions, LimitingDevice, Plan};
use counterfoil::quantity::{Given, Point};
use counterfoil::settings::Site;

use super::reference::Rectangle;
use crate::dose::plain_plan;

/// Half the width of the leaf bank, cm.
pub(super) const BANK_CM: f64 = 20.0;

/// Width of a leaf, cm.
pub(super) const LEAF_CM: f64 = 0.5;

/// One aperture with its share of the meterset: for every leaf pair the gap, closed when empty.
#[derive(Clone, Debug)]
pub(super) struct Aperture {
    pub(super) gaps_cm: Vec<Option<[f64; 2]>>,
    pub(super) share: f64,
}

/// A field in water.
#[derive(Clone, Debug)]
pub(super) struct Field {
    /// What sort of field, for the report.
    pub(super) class: &'static str,
    pub(super) apertures: Vec<Aperture>,
    /// The point in the collimator system, cm: its projection on the isocentre plane, and its distance from the source.
    pub(super) point_cm: [f64; 2],
    pub(super) spd_cm: f64,
    /// Perpendicular to the flat surface, cm.
    pub(super) depth_cm: f64,
}

impl Aperture {
    /// All leaves closed.
    pub(super) fn closed(share: f64) -> Self {
        Self {
            gaps_cm: vec![None; (2.0 * BANK_CM / LEAF_CM) as usize],
            share,
        }
    }

    /// Opens the pairs between two boundaries; boundaries are multiples of the leaf width.
    pub(super) fn open(mut self, x_cm: [f64; 2], y_cm: [f64; 2]) -> Self {
        let pair = |y_cm: f64| ((y_cm + BANK_CM) / LEAF_CM).round() as usize;
        for gap in &mut self.gaps_cm[pair(y_cm[0])..pair(y_cm[1])] {
            *gap = Some(x_cm);
        }
        self
    }

    /// The rectangle of each open pair, cm at the isocentre plane.
    pub(super) fn rectangles(&self) -> Vec<Rectangle> {
        let pairs = self.gaps_cm.iter().enumerate();
        pairs
            .filter_map(|(pair, gap)| {
                let low_cm = pair as f64 * LEAF_CM - BANK_CM;
                Some(((*gap)?, [low_cm, low_cm + LEAF_CM]))
            })
            .collect()
    }

    fn positions_cm(&self) -> Arc<[f64]> {
        // Closed pairs meet far from the field.
        let side = |index: usize| {
            self.gaps_cm
                .iter()
                .map(move |gap| gap.map_or(-19.0, |gap| gap[index]))
        };
        side(0).chain(side(1)).collect()
    }
}

impl Field {
    /// The rectangles of an aperture from the point, in the point's plane, cm.
    pub(super) fn seen_from_point(&self, aperture: &Aperture) -> Vec<Rectangle> {
        let scale = self.spd_cm / 100.0;
        let [x, y] = self.point_cm;
        aperture
            .rectangles()
            .into_iter()
            .map(|(x_cm, y_cm)| {
                (
                    x_cm.map(|edge| (edge - x) * scale),
                    y_cm.map(|edge| (edge - y) * scale),
                )
            })
            .collect()
    }

    /// Least distance of the point from an edge of any aperture, in its plane, cm; negative under a leaf.
    pub(super) fn edge_distance_cm(&self) -> f64 {
        let distance = |aperture: &Aperture| {
            // The closed parts of every leaf pair's band, and what lies beyond the bank.
            let scale = self.spd_cm / 100.0;
            let [x, y] = self.point_cm;
            let mut least = BANK_CM - y.abs();
            for (pair, gap) in aperture.gaps_cm.iter().enumerate() {
                let low = pair as f64 * LEAF_CM - BANK_CM;
                let off = (low - y).max(y - low - LEAF_CM).max(0.0);
                let along = gap.map_or(0.0, |gap| (x - gap[0]).min(gap[1] - x).max(0.0));
                least = least.min(off.hypot(along));
            }
            least * scale
        };
        self.apertures
            .iter()
            .map(distance)
            .fold(f64::INFINITY, f64::min)
    }

    /// The plan: step and shoot when there are several apertures.
    pub(super) fn plan(&self) -> Plan {
        let mut plan = plain_plan();
        // Gantry, collimator and couch 0, head first supine, isocentre at (1, -2, 30).
        let height_cm = 100.0 - self.spd_cm;
        let [x, y] = self.point_cm.map(|cm| cm * self.spd_cm / 100.0);
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(1.0 + x, -2.0 - height_cm, 30.0 + y));
        let beam = &mut plan.beams[0];
        beam.machine = Given::stated("KERNEL".to_owned());
        beam.devices.push(LimitingDevice {
            kind: DeviceKind::Mlcx { layer: 0 },
            pairs: Given::stated(80),
            source_distance_cm: Given::Absent,
            boundaries_cm: Given::stated(
                (-40..=40).map(|edge| f64::from(edge) * LEAF_CM).collect(),
            ),
        });
        let first = beam.control_points[0].clone();
        let at = |aperture: &Aperture, weight: f64| ControlPoint {
            cumulative_weight: Given::stated(weight),
            jaws_x_cm: Given::stated([-BANK_CM, BANK_CM]),
            jaws_y_cm: Given::stated([-BANK_CM, BANK_CM]),
            ssd_cm: Given::stated(self.spd_cm - self.depth_cm),
            leaves: vec![LeafPositions {
                kind: DeviceKind::Mlcx { layer: 0 },
                positions_cm: Given::stated(aperture.positions_cm()),
            }],
            ..first.clone()
        };
        beam.control_points.clear();
        let mut weight = 0.0;
        for aperture in &self.apertures {
            beam.control_points.push(at(aperture, weight));
            weight += aperture.share;
            beam.control_points.push(at(aperture, weight));
        }
        beam.final_cumulative_weight = Given::stated(weight);
        plan
    }

    /// What the program makes of it.
    pub(super) fn calculate(&self, machine: &MachineModel, steps: StepLimits) -> BeamCalculation {
        calculate(&self.plan(), machine, steps)
    }
}

/// The first beam of a plan.
pub(super) fn calculate(plan: &Plan, machine: &MachineModel, steps: StepLimits) -> BeamCalculation {
    calculate_beam(&BeamRequest {
        plan,
        beam_index: 0,
        group: Some((0, 0)),
        model: ModelAnswer::Found(machine),
        site: &Site::default(),
        depth_row: None,
        steps,
    })
}

/// Dose per MU, whatever stands in the way of calling it verified.
pub(super) fn cgy_per_mu(calculation: &BeamCalculation) -> f64 {
    let trace = calculation.trace.as_ref();
    trace
        .unwrap_or_else(|| panic!("{:?}", calculation.obstacles))
        .dose_per_mu_cgy
}
