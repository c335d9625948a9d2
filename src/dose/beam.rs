//! One beam of a plan from end to end: technique, point, geometry, depth,
//! devices, factors, limits, spread. What the plan alone gives is filled in
//! also when no model is there or no method covers the beam. Whether the dose
//! is the planned one is judged in `audit`.

use super::aperture::{mean_openings, point_square, view_between};
use super::delivery::{Interval, delivering_points, intervals};
use super::depth::find_depths;
use super::depth_question::{DepthFindings, DepthQuestion, DepthRow};
use super::limits::outside_method;
use super::modifier::{Modifiers, bolus, couch, couch_doubts, hardware};
use super::placement::{Placement, place};
use super::point::choose_point;
use super::prerequisite::{
    group_obstacles, meterset_obstacle, photon_model, reading_obstacles, sad_obstacles,
};
use super::shaped::{DepthTrack, ShapedField, calculate_shaped, track_depths};
use super::spread::{ELONGATED, expected_spread};
use super::sweep::{calculate_swept, motion_beside_sweep};
use super::technique::{
    classify_delivered, jaws_are_the_wedge, technique_obstacles, tilt_obstacles, wedge_in,
    wedged_field_is_integrated, wedges_stay_out,
};
use super::text::number;
use super::wedge::wedge_of;
use super::wedge_factor::reversal_remark;
use super::{
    BeamCalculation, DepthBasis, FactorError, FieldDepth, FieldInput, FieldModel, Form, Method,
    Obstacle, ObstacleKind, Squares, StepLimits, Technique, Trace, dose_per_mu,
};
use crate::beam_model::{MachineModel, OffAxisKind, TableKind, collimator_square};
use crate::plan::{Beam, ControlPoint, FractionGroup, Plan, RadiationType, ReferencedBeam};
use crate::quantity::tolerance;
use crate::settings::Site;

/// What the search for a machine's model came to.
#[derive(Clone, Debug)]
pub enum ModelAnswer<'a> {
    /// The model that serves the beam's machine.
    Found(&'a MachineModel),
    /// None does.
    Unknown {
        /// The names that some model serves.
        known_names: Vec<&'a str>,
    },
}

/// One beam to calculate.
#[derive(Clone, Debug)]
pub struct BeamRequest<'a> {
    /// The plan.
    pub plan: &'a Plan,
    /// Item index in `Plan::beams`.
    pub beam_index: usize,
    /// Item indices in `Plan::fraction_groups` and in that group's `beams`; `None` for a beam that no group references.
    pub group: Option<(usize, usize)>,
    /// The machine's model.
    pub model: ModelAnswer<'a>,
    /// The department's settings.
    pub site: &'a Site,
    /// The user's depth for this beam.
    pub depth_row: Option<&'a DepthRow>,
    /// How finely shaped and moving fields are integrated.
    pub steps: StepLimits,
}

/// Everything that can be worked out about one beam, with every obstacle.
#[must_use]
pub fn calculate_beam(request: &BeamRequest<'_>) -> BeamCalculation {
    let plan = request.plan;
    let unreadable = Beam::default();
    let beam = plan.beams.get(request.beam_index).unwrap_or(&unreadable);
    let delivered = intervals(beam);
    let technique = classify_delivered(beam, &delivered);
    let mut result = described(request, beam, &delivered, technique);
    let group = request
        .group
        .and_then(|(group, _)| plan.fraction_groups.get(group));
    let reference = request
        .group
        .zip(group)
        .and_then(|((_, reference), group)| group.beams.get(reference));

    result.obstacles.extend(reading_obstacles(request));
    if technique == Technique::Setup {
        return result;
    }
    let technique_obstacles = technique_obstacles(beam, technique, &delivered);
    result.obstacles.extend(technique_obstacles.iter().cloned());
    basic_obstacles(request, beam, &delivered, group, reference, &mut result);

    let model = photon_model(request, beam, &mut result);
    let at = delivered
        .first()
        .map(|interval| interval.start)
        .or(beam.control_points.first());
    let Some(at) = at else {
        return result;
    };
    let placement = place_point(request, beam, at, reference, technique, &mut result);
    let (depths, track) = depths_of(
        request,
        beam,
        reference,
        &delivered,
        &placement,
        &mut result,
    );
    let long = technique == Technique::Static && is_long(at, model, &placement);
    let integrated = long
        || is_shaped(technique)
        || technique == Technique::Wedge && wedged_field_is_integrated(beam, &delivered);
    let devices = devices_of(
        (beam, &delivered),
        at,
        (technique, integrated),
        model,
        &depths,
        &mut result,
    );
    let rectangle = matches!(technique, Technique::Static | Technique::Wedge);
    if let (true, Some(model), Some([x_cm, y_cm])) = (rectangle, model, openings(at)) {
        result.squares = Some(Squares {
            collimator: collimator_square(x_cm, y_cm, model.upper_jaws, model.beam.exchange_k),
            phantom: placement.ray.map(|ray| point_square(x_cm, y_cm, ray)),
        });
    }
    if beam.radiation.value() == Some(&RadiationType::Photon)
        && devices.uncovered.is_empty()
        && let Some(model) = model
    {
        // A wedge that could not be placed must not pass for an open field.
        let placed = devices.wedge.is_some() || devices.swept.is_some();
        let wedged = technique == Technique::Wedge && placed;
        if (technique == Technique::Static || wedged) && !integrated {
            calculate(
                request,
                at,
                model,
                &placement,
                &depths,
                &devices,
                &mut result,
            );
        } else if integrated
            && technique_obstacles.is_empty()
            && (wedged || technique != Technique::Wedge)
        {
            let mut by_square = long.then(|| result.clone());
            calculate_by_integration(
                request,
                (beam, &delivered),
                model,
                (&placement, &depths, track.as_ref()),
                &devices,
                &mut result,
            );
            if let Some(other) = &mut by_square {
                calculate(request, at, model, &placement, &depths, &devices, other);
                result.remarks.extend(square_remark(&result, other));
            }
        }
    }
    result.obstacles.extend(devices.uncovered);
    result.remarks.extend(devices.remarks);
    result
}

/// What the plan says of the beam as such.
fn described(
    request: &BeamRequest<'_>,
    beam: &Beam,
    delivered: &[Interval<'_>],
    technique: Technique,
) -> BeamCalculation {
    let first = delivered
        .first()
        .map(|interval| interval.start)
        .or(beam.control_points.first());
    let last = delivered
        .last()
        .map(|interval| interval.end)
        .or(beam.control_points.last());
    let [x_cm, y_cm] = mean_openings(beam, delivered);
    BeamCalculation {
        beam_index: request.beam_index,
        group_index: request.group.map(|(group, _)| group),
        reference_index: request.group.map(|(_, reference)| reference),
        technique,
        gantry_deg: first.and_then(|point| point.gantry_deg.get()),
        gantry_end_deg: last.and_then(|point| point.gantry_deg.get()),
        collimator_deg: first.and_then(|point| point.collimator_deg.get()),
        couch_deg: first.and_then(|point| point.couch_deg.get()),
        x_cm,
        y_cm,
        squares: None,
        point: None,
        depths: Vec::new(),
        plan_ssd_cm: first.and_then(|point| point.ssd_cm.get()),
        trace: None,
        method: None,
        shaped: None,
        spread: None,
        obstacles: Vec::new(),
        remarks: Vec::new(),
        view: first
            .zip(last)
            .map(|(first, last)| view_between(beam, first, last))
            .unwrap_or_default(),
    }
}

fn basic_obstacles(
    request: &BeamRequest<'_>,
    beam: &Beam,
    delivered: &[Interval<'_>],
    group: Option<&FractionGroup>,
    reference: Option<&ReferencedBeam>,
    result: &mut BeamCalculation,
) {
    result
        .obstacles
        .extend(group_obstacles(request, group, reference));
    result.obstacles.extend(meterset_obstacle(beam, reference));
    result.obstacles.extend(sad_obstacles(beam));
    if delivered.is_empty() {
        result.obstacles.push(Obstacle {
            kind: ObstacleKind::Reading,
            message: "no meterset accrues between the beam's control points: what they deliver is not stated".to_owned(),
        });
    }
    if beam.dosimeter_unit.is_absent() {
        result.remarks.push(
            "Primary Dosimeter Unit (300A,00B3) is not stated; the meterset is taken as MU"
                .to_owned(),
        );
    }
    if beam.energy.fluence_mode.is_absent()
        && beam.radiation.value() == Some(&RadiationType::Photon)
    {
        result.remarks.push(
            "the fluence mode is not stated; the beam is taken as a flattened one".to_owned(),
        );
    }
    if wedges_stay_out(beam, result.technique) {
        result
            .remarks
            .push("the beam declares a wedge that is never in: it is open".to_owned());
    }
}

fn place_point(
    request: &BeamRequest<'_>,
    beam: &Beam,
    at: &ControlPoint,
    reference: Option<&ReferencedBeam>,
    technique: Technique,
    result: &mut BeamCalculation,
) -> Placement {
    let choice = choose_point(request.plan, beam, reference, &request.site.point);
    result.obstacles.extend(choice.obstacles);
    result.remarks.extend(choice.remarks);
    result.obstacles.extend(tilt_obstacles(at));
    let placement = place(request.plan, beam, at, choice.chosen, technique);
    result.obstacles.extend(placement.obstacles.iter().cloned());
    result.remarks.extend(placement.remarks.iter().cloned());
    result.view.point_cm = placement.ray.map(|ray| ray.projected_cm);
    result.point.clone_from(&placement.point);
    placement
}

fn depths_of(
    request: &BeamRequest<'_>,
    beam: &Beam,
    reference: Option<&ReferencedBeam>,
    delivered: &[Interval<'_>],
    placement: &Placement,
    result: &mut BeamCalculation,
) -> (DepthFindings, Option<DepthTrack>) {
    let question = DepthQuestion {
        plan: request.plan,
        beam,
        reference,
        point: placement.point.as_ref(),
        ray: placement.ray,
        delivering: &delivering_points(delivered),
        row: request.depth_row,
        limit_cm: request.site.technical.depth_disagreement_mm / 10.0,
    };
    let (found, track) = if result.technique == Technique::Arc {
        track_depths(&question, placement.geometry.as_ref(), delivered)
    } else {
        let found = find_depths(&question);
        let track = found.candidates.first().map(DepthTrack::of);
        (found, track)
    };
    result.depths.clone_from(&found.candidates);
    result.obstacles.extend(found.obstacles.iter().cloned());
    result.remarks.extend(found.remarks.iter().cloned());
    (found, track)
}

fn devices_of<'a>(
    (beam, delivered): (&Beam, &[Interval<'_>]),
    at: &ControlPoint,
    (technique, integrated): (Technique, bool),
    model: Option<FieldModel<'a>>,
    depths: &DepthFindings,
    result: &mut BeamCalculation,
) -> Modifiers<'a> {
    if technique == Technique::Electron {
        return Modifiers::default();
    }
    let mut devices = hardware(beam, model.map(|model| model.beam));
    if jaws_are_the_wedge(beam, delivered) {
        devices.remarks.push(
            "a dynamic wedge: the motion of its jaw, as the control points spell it out, is integrated; no wedge factor is applied"
                .to_owned(),
        );
    } else if wedge_in(beam, delivered) {
        let found = wedge_of(beam, delivered, model.map(|model| model.beam));
        devices.wedge = found.wedge;
        if found.swept.is_some() {
            devices.uncovered.extend(motion_beside_sweep(technique));
        }
        devices.swept = found.swept;
        devices.uncovered.extend(found.obstacles);
        devices.remarks.extend(found.remarks);
    }
    if let (Some(model), Some(gantry_deg)) = (model, at.gantry_deg.get())
        && !integrated
    {
        let couch_deg = at.couch_deg.get().unwrap_or_default();
        couch(model.beam, gantry_deg, couch_deg, depths, &mut devices);
    }
    let (obstacle, remark) = bolus(beam, depths);
    result.obstacles.extend(obstacle);
    result.remarks.extend(remark);
    devices
}

/// What the equivalent square would have given for a field that was integrated for its length.
fn square_remark(integrated: &BeamCalculation, by_square: &BeamCalculation) -> Option<String> {
    let dose = |result: &BeamCalculation| Some(result.trace.as_ref()?.dose_per_mu_cgy);
    Some(format!(
        "a field more than twice as long as wide: its phantom scatter is integrated; by its equivalent square the dose would be {} % of this",
        number(100.0 * dose(by_square)? / dose(integrated)?)
    ))
}

/// Whether the equivalent square of a field of jaws alone is too coarse, and the model has what the integration needs. An
/// off-axis ratio measured in water is only good for the factors.
fn is_long(at: &ControlPoint, model: Option<FieldModel<'_>>, placement: &Placement) -> bool {
    let (Some([x_cm, y_cm]), Some(model), Some(ray)) = (openings(at), model, placement.ray) else {
        return false;
    };
    let beam = model.beam;
    let on_axis = ray.off_axis_cm() < tolerance::POSITION_CM;
    x_cm.max(y_cm) > ELONGATED * x_cm.min(y_cm) + tolerance::POSITION_CM
        && beam.penumbra.is_some()
        && (on_axis || beam.off_axis.kind == OffAxisKind::InAir)
}

fn openings(at: &ControlPoint) -> Option<[f64; 2]> {
    let (x_cm, y_cm) = (at.jaws_x_cm.get()?, at.jaws_y_cm.get()?);
    let sides = [x_cm[1] - x_cm[0], y_cm[1] - y_cm[0]];
    sides
        .iter()
        .all(|&side_cm| side_cm > tolerance::POSITION_CM)
        .then_some(sides)
}

fn calculate(
    request: &BeamRequest<'_>,
    at: &ControlPoint,
    model: FieldModel<'_>,
    placement: &Placement,
    depths: &DepthFindings,
    devices: &Modifiers<'_>,
    result: &mut BeamCalculation,
) {
    let (Some(jaws_x_cm), Some(jaws_y_cm)) = (at.jaws_x_cm.get(), at.jaws_y_cm.get()) else {
        result.obstacles.push(Obstacle {
            kind: ObstacleKind::Reading,
            message: "neither jaws nor leaves limit the field on one axis: its size is not given"
                .to_owned(),
        });
        return;
    };
    if openings(at).is_none() {
        result.obstacles.push(Obstacle {
            kind: ObstacleKind::Reading,
            message: "the jaw opening is closed or inverted".to_owned(),
        });
        return;
    }
    let (Some(ray), Some(depth)) = (placement.ray, depths.candidates.first()) else {
        return;
    };
    let ssd_form = depth.perpendicular_cm.and(depth.ssd_cm).filter(|&ssd_cm| {
        matches!(model.beam.table_kind, TableKind::Pdd { .. })
            && ssd_cm > 0.0
            && (placement.fixed_ssd || ssd_cm >= ray.sad_cm - tolerance::POSITION_CM)
    });
    let field = FieldInput {
        model: Some(model),
        jaws_x_cm,
        jaws_y_cm,
        ray,
        depth: FieldDepth {
            perpendicular_cm: depth.perpendicular_cm,
            effective_cm: depth.effective_cm,
            source: depth.source.clone(),
        },
        form: ssd_form.map_or(Form::Isocentric, |ssd_cm| Form::FixedSsd { ssd_cm }),
        tray: devices.tray.clone(),
        wedge: devices.wedge,
        couch: devices.couch,
        reference: None,
        typed: Vec::new(),
    };
    let site = request.site;
    result.obstacles.extend(outside_method(
        &field,
        Some(model.beam.d_max_cm),
        site.technical.edge_margin_cm,
    ));
    result.remarks.extend(reversal_remark(&field));
    match dose_per_mu(&field) {
        Ok(trace) => {
            let (sigma_cm, name) = depth_sigma(depth.basis, site);
            result.spread = Some(expected_spread(&field, model.beam, sigma_cm, name));
            note_result(trace, result);
        }
        Err(error) => result.obstacles.push(factor_obstacle(&error)),
    }
}

fn note_result(trace: Trace, result: &mut BeamCalculation) {
    result.trace = Some(trace);
    result.method = Some(Method::Factors);
}

fn factor_obstacle(error: &FactorError) -> Obstacle {
    match error {
        FactorError::OutOfRange { .. } => Obstacle {
            kind: ObstacleKind::TableRange,
            message: format!("outside the method's range: {error}"),
        },
        FactorError::MissingFactor { .. } => Obstacle {
            kind: ObstacleKind::Model,
            message: error.to_string(),
        },
        FactorError::Unusable { .. } => Obstacle {
            kind: ObstacleKind::Reading,
            message: error.to_string(),
        },
    }
}

/// Whether the technique is integrated rather than multiplied out.
const fn is_shaped(technique: Technique) -> bool {
    matches!(
        technique,
        Technique::Mlc
            | Technique::Blocked
            | Technique::Segmented
            | Technique::Dynamic
            | Technique::Arc
    )
}

/// Leaves, blocks, segments, arcs.
fn calculate_by_integration(
    request: &BeamRequest<'_>,
    (beam, delivered): (&Beam, &[Interval<'_>]),
    model: FieldModel<'_>,
    (placement, depths, track): (&Placement, &DepthFindings, Option<&DepthTrack>),
    devices: &Modifiers<'_>,
    result: &mut BeamCalculation,
) {
    let ModelAnswer::Found(machine) = request.model else {
        return;
    };
    let (Some(geometry), Some(track), Some(depth)) = (
        placement.geometry.as_ref(),
        track,
        depths.candidates.first(),
    ) else {
        return;
    };
    let couch_deg = delivered
        .first()
        .and_then(|interval| interval.start.couch_deg.get())
        .unwrap_or_default();
    let field = ShapedField {
        beam,
        delivered,
        machine,
        model,
        geometry,
        depths: track,
        depth_sigma: depth_sigma(depth.basis, request.site),
        tray: devices.tray.as_ref(),
        couch_doubts: &couch_doubts(couch_deg, depths),
        wedge: devices.wedge.map(|wedge| (wedge.placed, wedge.index)),
        site: request.site,
        steps: request.steps,
    };
    match (&devices.swept, delivered.first()) {
        (Some((planned, name)), Some(first)) => {
            calculate_swept(&field, (planned, name), first.start, result);
        }
        _ => calculate_shaped(&field, result),
    }
}

/// 1-sigma uncertainty of a depth, cm, and its basis in words.
fn depth_sigma(basis: DepthBasis, site: &Site) -> (f64, &'static str) {
    let sigma = &site.depth_uncertainty;
    let (sigma_mm, name) = match basis {
        DepthBasis::Table => (sigma.table_mm, "the depth table"),
        DepthBasis::Plan => (sigma.plan_mm, "the plan's point depth"),
        DepthBasis::Ssd => (sigma.ssd_mm, "SSD and a flat surface"),
    };
    (sigma_mm / 10.0, name)
}
