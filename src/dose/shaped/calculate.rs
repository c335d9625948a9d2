//! One beam by scatter integration, from the plan's beam and the model to a
//! trace with its spread and everything that stands in the way.

use super::bank::{Bank, banks};
use super::blocks::BlockShape;
use super::depth_track::DepthTrack;
use super::head::heights;
use super::moments::{StepLimits, moments};
use super::range::{OneAperture, RangeQuestion, outside_range};
use super::results::{IntervalSource, ShapedResult, Shares};
use super::scatter_weight::scatter_weight;
use super::spread::{DepthSpread, spread_of};
use super::standing::{Standing, SumError};
use super::sum::{Sums, add_up};
use super::trace::trace_of;
use crate::beam_model::{MachineModel, OffAxisKind};
use crate::dose::delivery::{Interval, same_aperture};
use crate::dose::placement::BeamGeometry;
use crate::dose::{
    BeamCalculation, FieldModel, Method, Obstacle, ObstacleKind, PlacedWedge, Squares, Technique,
    Tray,
};
use crate::plan::{Beam, BlockType, LeafAxis};
use crate::quantity::{CollimatorSquare, PointSquare, tolerance};
use crate::settings::Site;

/// A beam that is to be integrated.
#[derive(Clone, Copy)]
pub(in crate::dose) struct ShapedField<'a> {
    pub(in crate::dose) beam: &'a Beam,
    pub(in crate::dose) delivered: &'a [Interval<'a>],
    pub(in crate::dose) machine: &'a MachineModel,
    pub(in crate::dose) model: FieldModel<'a>,
    pub(in crate::dose) geometry: &'a BeamGeometry,
    pub(in crate::dose) depths: &'a DepthTrack,
    /// 1-sigma uncertainty of the depth, cm, and its basis in words.
    pub(in crate::dose) depth_sigma: (f64, &'a str),
    pub(in crate::dose) tray: Option<&'a Tray>,
    /// What stands against the couch of the model: clauses that follow the remark on it.
    pub(in crate::dose) couch_doubts: &'a str,
    /// The wedge, with its item index in the beam.
    pub(in crate::dose) wedge: Option<(PlacedWedge<'a>, usize)>,
    pub(in crate::dose) site: &'a Site,
    pub(in crate::dose) steps: StepLimits,
}

/// Calculates the field and writes what was found into `result`.
pub(in crate::dose) fn calculate_shaped(field: &ShapedField<'_>, result: &mut BeamCalculation) {
    let banks = match banks(field.beam, field.machine) {
        Ok(banks) => banks,
        Err(obstacle) => return result.obstacles.push(obstacle),
    };
    let blocks = match block_shapes(field.beam) {
        Ok(blocks) => blocks,
        Err(obstacle) => return result.obstacles.push(obstacle),
    };
    let Some(standing) = standing(field, &banks, &blocks, result) else {
        return;
    };
    let moments = moments(field.delivered, &banks, field.steps);
    match add_up(&standing, &moments) {
        Ok(sums) => conclude(field, &standing, &sums, result),
        Err(error) => result.obstacles.push(sum_obstacle(&error)),
    }
}

/// What the calculation rests on; what the model lacks becomes an obstacle.
fn standing<'a>(
    field: &'a ShapedField<'_>,
    banks: &'a [Bank<'a>],
    blocks: &'a [BlockShape<'a>],
    result: &mut BeamCalculation,
) -> Option<Standing<'a>> {
    let model = field.model.beam;
    let name = &field.machine.name;
    let Some(penumbra) = model.penumbra else {
        result.obstacles.push(Obstacle::model(format!(
            "the beam model {name} gives no penumbra_sigma_cm for {}: shaped and moving fields need it",
            model.label
        )));
        return None;
    };
    let head = if banks.is_empty() {
        None
    } else {
        let heights = heights(field.machine, banks);
        match (&model.head_scatter, heights) {
            (Some(head), Ok(heights)) => Some((head, heights)),
            (_, Err(key)) => {
                result.obstacles.push(Obstacle::model(format!(
                    "the beam model {name} does not give {key}: the head scatter of an aperture needs it"
                )));
                return None;
            }
            (None, Ok(_)) => {
                result.obstacles.push(Obstacle::model(format!(
                    "the beam model {name} gives no usable extra_focal_distance_cm for {}: the head scatter of an aperture needs it",
                    model.label
                )));
                return None;
            }
        }
    };
    if let Some(obstacle) = jaws_beyond_leaves(field.delivered, banks) {
        result.obstacles.push(obstacle);
    }
    let upper_jaws = field.machine.collimation.jaw(field.machine.upper_jaws);
    Some(Standing {
        jaw_height_cm: upper_jaws
            .and_then(|jaw| jaw.source_distance_cm)
            .unwrap_or_default(),
        model: field.model,
        geometry: field.geometry,
        banks,
        blocks,
        head,
        depths: field.depths,
        penumbra,
        margin_cm: field.site.technical.edge_margin_cm,
        steps: field.steps,
        couch: true,
        wedge: field.wedge,
    })
}

/// Jaws that are open beyond the outermost leaves: what shields there is not known.
fn jaws_beyond_leaves(delivered: &[Interval<'_>], banks: &[Bank<'_>]) -> Option<Obstacle> {
    for bank in banks {
        let (least, greatest) = (bank.boundaries_cm.first()?, bank.boundaries_cm.last()?);
        let points = delivered
            .iter()
            .flat_map(|interval| [interval.start, interval.end]);
        for point in points {
            let across = match bank.axis {
                LeafAxis::X => point.jaws_y_cm.value(),
                LeafAxis::Y => point.jaws_x_cm.value(),
            };
            if let Some([low, high]) = across
                && (*low < least - tolerance::POSITION_CM
                    || *high > greatest + tolerance::POSITION_CM)
            {
                return Some(Obstacle {
                    kind: ObstacleKind::Technique,
                    message: format!(
                        "the jaws are open to {low:.1} and {high:.1} cm, beyond the outermost leaves at {least:.1} and {greatest:.1} cm: what shields there is not known"
                    ),
                });
            }
        }
    }
    None
}

/// Blocks with outline, side and transmission.
fn block_shapes(beam: &Beam) -> Result<Vec<BlockShape<'_>>, Obstacle> {
    beam.blocks
        .iter()
        .map(|block| {
            let name = block
                .name
                .value()
                .or(block.tray_id.value())
                .map_or("without a name", String::as_str);
            let missing = |what: &str| Obstacle {
                kind: ObstacleKind::Reading,
                message: format!("block {name:?}: {what}"),
            };
            let outline_cm = block
                .outline_cm
                .value()
                .filter(|outline| outline.len() >= 3)
                .ok_or_else(|| missing("Block Data (300A,0106) gives no outline"))?;
            let shields_inside = match block.block_type.value() {
                Some(BlockType::Shielding) => true,
                Some(BlockType::Aperture) => false,
                _ => {
                    return Err(missing(
                        "Block Type (300A,00F8) is neither SHIELDING nor APERTURE",
                    ));
                }
            };
            Ok(BlockShape {
                outline_cm,
                shields_inside,
                transmission: block.transmission.get().ok_or_else(|| {
                    missing("Block Transmission (300A,0102) is not given, and what scatters from under it is not known")
                })?,
            })
        })
        .collect()
}

fn sum_obstacle(error: &SumError) -> Obstacle {
    let (kind, message) = match error {
        SumError::Missing(what) => (ObstacleKind::Reading, format!("{what} is not given")),
        SumError::Range(which, range) => (
            ObstacleKind::TableRange,
            format!("outside the method's range: {}: {range}", which.title()),
        ),
        SumError::Squares(depth_cm) => (
            ObstacleKind::TableRange,
            format!(
                "outside the method's range: at depth {depth_cm:.2} cm the depth table holds too few field sides to tell scatter from primary"
            ),
        ),
    };
    Obstacle { kind, message }
}

/// From the sums to what is reported.
fn conclude(
    field: &ShapedField<'_>,
    standing: &Standing<'_>,
    sums: &Sums,
    result: &mut BeamCalculation,
) {
    let beam = field.model.beam;
    if beam.off_axis.kind == OffAxisKind::InWater && sums.off_axis_cm >= tolerance::POSITION_CM {
        result.obstacles.push(Obstacle::model(format!(
            "the point is off the axis and the off-axis ratios of {} are measured in water, which holds the scatter of another field: the number shown may be wrong by several per cent",
            beam.label
        )));
    }
    // At the mean depth: for what describes the field, not for its dose.
    let Ok(kernel) = beam.scatter_at(sums.effective_cm) else {
        return;
    };
    let scatter_weight = scatter_weight(standing, sums, &kernel);
    let shaped = shaped_result(standing, sums, scatter_weight, field.steps);
    let fluence = sums.exposure.open_fluence + sums.exposure.leak_fluence;
    let scatter = sums.exposure.open_scatter + sums.exposure.leak_scatter;
    let equivalent_side_cm = kernel.side_with_scatter(scatter / (fluence * kernel.primary()));
    let trace = trace_of(
        sums,
        standing,
        (scatter_weight, equivalent_side_cm),
        field.tray,
    );
    // A covered point has scatter without primary: no square is like that.
    let has_square = equivalent_side_cm < kernel.sides_cm().1 - 0.01;
    result.squares = Some(Squares {
        collimator: CollimatorSquare::new(sums.jaw_side_cm),
        phantom: has_square.then(|| PointSquare::new(equivalent_side_cm)),
    });
    result.obstacles.extend(outside_range(&RangeQuestion {
        beam,
        sums,
        result: &shaped,
        kernel: &kernel,
        equivalent_side_cm,
        limits: &field.site.technical,
        one_aperture: one_aperture(result.technique, field.delivered, sums),
        scatter_weight,
    }));
    let (sigma_cm, name) = field.depth_sigma;
    result.spread = Some(spread_of(
        standing,
        sums,
        &shaped,
        (&kernel, equivalent_side_cm),
        &DepthSpread { sigma_cm, name },
        field.tray.is_some(),
    ));
    if sums.couch_share > 0.0 {
        result.remarks.push(format!(
            "couch transmission applied from the beam model for {:.0} % of the meterset; whether the planning system has the couch in its dose is not stated in the plan{}",
            100.0 * sums.couch_share, field.couch_doubts
        ));
    }
    if let Some(point) = &mut result.point
        && point.off_axis_cm.is_none()
    {
        point.off_axis_cm = Some(sums.off_axis_cm);
    }
    // A point on the axis stays where it is while the gantry turns.
    if result.view.point_cm.is_none() && sums.off_axis_cm < tolerance::POSITION_CM {
        result.view.point_cm = Some([0.0, 0.0]);
    }
    result.trace = Some(trace);
    result.method = Some(Method::ScatterIntegration);
    result.shaped = Some(shaped);
}

fn one_aperture(technique: Technique, delivered: &[Interval<'_>], sums: &Sums) -> OneAperture {
    let standing = matches!(
        technique,
        Technique::Mlc | Technique::Blocked | Technique::Wedge | Technique::Static
    );
    // A dynamic wedge moves a jaw that stands still in the plan.
    let moves = delivered
        .iter()
        .any(|interval| !same_aperture(interval.start, interval.end));
    if standing && !moves && sums.moments >= 1 {
        OneAperture::Yes
    } else {
        OneAperture::No
    }
}

fn shaped_result(
    standing: &Standing<'_>,
    sums: &Sums,
    scatter_weight: f64,
    steps: StepLimits,
) -> ShapedResult {
    let at_point = sums.exposure.open_fluence;
    let change = sums.surroundings.greatest_change(at_point);
    ShapedResult {
        shares: Shares::new(sums.couch.weighted(scatter_weight)),
        mean_leaf_gap_cm: (!standing.banks.is_empty() && sums.gap_width_cm > 0.0)
            .then(|| sums.gap_area_cm2 / sums.gap_width_cm),
        fluence_change_percent: if at_point > 0.0 {
            100.0 * change / at_point
        } else {
            f64::INFINITY
        },
        moments: sums.moments,
        steps,
        intervals_from: IntervalSource::ControlPoints,
        intervals: sums.intervals.clone(),
        fluence: sums.fluence.image(),
    }
}
