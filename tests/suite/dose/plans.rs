//! Whole beams: which technique, point, depth and devices a plan comes to, and
//! that no doubt passes as a verification.

use std::sync::Arc;

use counterfoil::beam_model::{CouchArc, MachineModel};
use counterfoil::dose::{
    BeamCalculation, BeamRequest, DepthBasis, DepthRow, FactorName, Method, ModelAnswer,
    ObstacleKind, PointBasis, StepLimits, Technique, calculate_beam,
};
use counterfoil::plan::{
    Accessory, Applicator, Block, Bolus, Compensator, DeliveryType, DeviceKind, DoseReference,
    Effect, LeafPositions, LimitingDevice, NoteKind, NoteScope, PatientSetup, Plan, PointDepth,
    PointDepthPlace, RadiationType, ReadingNote, ReferencedDose, Wedge, WedgePosition,
};
use counterfoil::quantity::{Given, Point};
use counterfoil::settings::Site;

use super::shaped_model::shaped_machine;
use super::{
    assert_close, calculate, calculate_with, kinds, plain_plan, plan_with, plan_with_points, tg71,
    verified_cgy_per_mu,
};

/// 10 x 10 at the isocentre, 10 cm deep: the reference conditions of the data set, 0.8 cGy/MU by definition.
#[test]
fn verify_reference_conditions_from_a_plan() {
    let result = calculate(&plain_plan());
    assert_close(verified_cgy_per_mu(&result), 0.8, 1e-12);
    assert_eq!(result.technique, Technique::Static);
    assert_eq!(result.remarks, Vec::<String>::new());
    let depth = &result.depths[0];
    assert_eq!((depth.basis, depth.independent), (DepthBasis::Ssd, false));
    assert_close(depth.effective_cm, 10.0, 1e-12);
    assert_eq!(result.point.as_ref().unwrap().basis, PointBasis::Beam);
    // Stated output, table and scatter uncertainties of the test model (0.5, 0.5, 0.3, 0.3) and the depth:
    // TPR(10.1) = 1 - 0.1 * 0.073/2 = 0.99635, TPR(9.9) = 1 + 0.1 * 0.074/2 = 1.0037 (10 x 10 column): 3.675 % per cm * 0.3 cm.
    let depth_percent = 100.0 * (1.0037_f64 / 0.99635).ln() / 0.2 * 0.3;
    let wanted = (0.5_f64.powi(2) * 2.0 + 0.3_f64.powi(2) * 2.0 + depth_percent.powi(2)).sqrt();
    assert_close(result.spread.unwrap().percent, wanted, 1e-9);
}

/// The same plan by the data set's depth doses: PDD(10) is 100 at d0 whatever the side, so 0.8 again.
#[test]
fn verify_reference_conditions_by_depth_dose() {
    assert_close(
        verified_cgy_per_mu(&calculate_with(&plain_plan(), &tg71("tg71-pdd"))),
        0.8,
        1e-12,
    );
}

/// Fixed SSD with a depth-dose table: the SSD form is used. Isocentre on the surface at SSD 100, 10 x 10
/// there, point 10 cm below: 0.8 * 1 * Sp(11) 1.010 * 1 * (100/110)^2 = 0.667769 (299.505 MU for 200 cGy).
#[test]
fn verify_fixed_ssd_plan() {
    let mut plan = plan_with_points(|point| point.ssd_cm = Given::stated(100.0));
    plan.patient_setups[0].technique = Given::stated("FIXED_SSD".to_owned());
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(1.0, 8.0, 30.0));
    let by_pdd = calculate_with(&plan, &tg71("tg71-pdd"));
    assert_close(200.0 / verified_cgy_per_mu(&by_pdd), 299.505, 5e-4);
    let trace = by_pdd.trace.unwrap();
    assert!(trace.factor(FactorName::PercentDepthDose).is_some());
    let by_tpr = calculate(&plan).trace.unwrap();
    assert!(by_tpr.factor(FactorName::TissuePhantomRatio).is_some());
    assert_close(by_tpr.dose_per_mu_cgy, trace.dose_per_mu_cgy, 1e-12);
}

/// A setup technique of FIXED_SSD calls for the SSD form of a depth-dose table also where the isocentre lies
/// in the patient; ISOCENTRIC does not. The dose is one.
#[test]
fn verify_form_follows_the_setup() {
    let machine = tg71("tg71-pdd");
    let mut plan = plain_plan();
    let isocentric = calculate_with(&plan, &machine).trace.unwrap();
    assert!(isocentric.factor(FactorName::TissuePhantomRatio).is_some());
    plan.patient_setups[0].technique = Given::stated("FIXED_SSD".to_owned());
    let fixed = calculate_with(&plan, &machine).trace.unwrap();
    assert!(fixed.factor(FactorName::PercentDepthDose).is_some());
    assert_close(fixed.dose_per_mu_cgy, isocentric.dose_per_mu_cgy, 1e-12);
}

fn technique(change: impl FnOnce(&mut Plan)) -> Technique {
    calculate(&plan_with(change)).technique
}

fn with_leaves(plan: &mut Plan, positions_cm: &[f64]) {
    let beam = &mut plan.beams[0];
    beam.devices.push(LimitingDevice {
        kind: DeviceKind::Mlcx { layer: 0 },
        pairs: Given::stated(4),
        source_distance_cm: Given::Absent,
        boundaries_cm: Given::stated(vec![-10.0, -5.0, 0.0, 5.0, 10.0]),
    });
    for point in &mut beam.control_points {
        point.leaves = vec![LeafPositions {
            kind: DeviceKind::Mlcx { layer: 0 },
            positions_cm: Given::stated(Arc::from(positions_cm)),
        }];
    }
}

const OPEN: [f64; 8] = [-6.0, -6.0, -6.0, -6.0, 6.0, 6.0, 6.0, 6.0];

fn with_wedge(plan: &mut Plan, in_beam: Given<bool>) {
    let beam = &mut plan.beams[0];
    beam.wedges.push(Wedge {
        number: Given::stated(1),
        ..Wedge::default()
    });
    for point in &mut beam.control_points {
        point.wedges = vec![WedgePosition {
            wedge_number: Given::stated(1),
            in_beam: in_beam.clone(),
        }];
    }
}

#[test]
fn verify_techniques() {
    let end = 1;
    for delivery in [
        DeliveryType::Setup,
        DeliveryType::OpenPortfilm,
        DeliveryType::TrmtPortfilm,
        DeliveryType::Verification,
    ] {
        assert_eq!(
            technique(|plan| plan.beams[0].delivery = Given::stated(delivery)),
            Technique::Setup
        );
    }
    assert_eq!(
        technique(|plan| plan.beams[0].delivery = Given::Absent),
        Technique::Static
    );
    assert_eq!(
        technique(|plan| plan.beams[0].radiation = Given::stated(RadiationType::Electron)),
        Technique::Electron
    );
    assert_eq!(
        technique(|plan| plan.beams[0].control_points[end].gantry_deg = Given::stated(10.0)),
        Technique::Arc
    );
    // A whole turn ends where it began.
    assert_eq!(
        technique(|plan| plan.beams[0].control_points[0].gantry_direction =
            Given::stated("CW".to_owned())),
        Technique::Arc
    );
    // 359.999 and 0 are one angle.
    assert_eq!(
        technique(|plan| plan.beams[0].control_points[end].gantry_deg = Given::stated(359.999)),
        Technique::Static
    );
    assert_eq!(
        technique(|plan| plan.beams[0].control_points[end].jaws_y_cm = Given::stated([-5.0, 2.0])),
        Technique::Dynamic
    );
    // Out all the time: open. In, or not said: wedged.
    assert_eq!(
        technique(|plan| with_wedge(plan, Given::stated(false))),
        Technique::Static
    );
    assert_eq!(
        technique(|plan| with_wedge(plan, Given::stated(true))),
        Technique::Wedge
    );
    assert_eq!(
        technique(|plan| with_wedge(plan, Given::Absent)),
        Technique::Wedge
    );
    assert_eq!(
        technique(|plan| plan.beams[0].wedges.push(Wedge::default())),
        Technique::Wedge
    );
    assert_eq!(
        technique(|plan| plan.beams[0].blocks.push(Block::default())),
        Technique::Blocked
    );
}

#[test]
fn verify_leaves() {
    assert_eq!(
        technique(|plan| with_leaves(plan, &OPEN)),
        Technique::Static
    );
    // At the jaw edge is not inside it.
    let flush = [-6.0, -5.0, -5.0, -6.0, 6.0, 5.0, 5.0, 6.0];
    assert_eq!(
        technique(|plan| with_leaves(plan, &flush)),
        Technique::Static
    );
    let cutting = [-6.0, -4.9, -6.0, -6.0, 6.0, 6.0, 6.0, 6.0];
    assert_eq!(
        technique(|plan| with_leaves(plan, &cutting)),
        Technique::Mlc
    );
    // Closed outside the jaws (rows beyond y = 5) does not matter.
    let closed_outside = [0.0, -6.0, -6.0, 0.0, 0.0, 6.0, 6.0, 0.0];
    assert_eq!(
        technique(|plan| with_leaves(plan, &closed_outside)),
        Technique::Static
    );
    // Too few positions: not known, so not static.
    assert_eq!(
        technique(|plan| with_leaves(plan, &OPEN[..6])),
        Technique::Mlc
    );
    // Leaves do not reach to the jaws' edge.
    assert_eq!(
        technique(|plan| {
            with_leaves(plan, &OPEN);
            for point in &mut plan.beams[0].control_points {
                point.jaws_y_cm = Given::stated([-11.0, 5.0]);
            }
        }),
        Technique::Mlc
    );
    // Without jaws on an axis the leaves close it.
    let plan = plan_with(|plan| {
        with_leaves(plan, &OPEN);
        for point in &mut plan.beams[0].control_points {
            point.jaws_x_cm = Given::Absent;
        }
    });
    let result = calculate(&plan);
    assert_eq!(result.technique, Technique::Mlc);
    assert_close(result.x_cm.unwrap(), 12.0, 1e-12);
    // The TG-71 model says nothing of leaves: no number, and the reason is the model's.
    assert_eq!(result.trace, None);
    assert_eq!(kinds(&result), [ObstacleKind::Model]);
    let message = &result.obstacles[0].message;
    assert!(
        message.contains("the plan has the leaf bank MLCX"),
        "{message}"
    );
    // Leaves along y: the second bank at negative y, the first boundary at negative x.
    let mlcy = |positions_cm: [f64; 8]| {
        technique(|plan| {
            with_leaves(plan, &positions_cm);
            plan.beams[0].devices[2].kind = DeviceKind::Mlcy { layer: 0 };
            for point in &mut plan.beams[0].control_points {
                point.leaves[0].kind = DeviceKind::Mlcy { layer: 0 };
                point.jaws_y_cm = Given::stated([-3.0, 3.0]);
            }
        })
    };
    let between = [-4.0, -4.0, -4.0, -4.0, 4.0, 4.0, 4.0, 4.0];
    assert_eq!(mlcy(between), Technique::Static);
    assert_eq!(
        technique(|plan| with_leaves(plan, &between)),
        Technique::Mlc
    );
}

/// A move between repeated weights delivers nothing: neither motion nor a second aperture.
#[test]
fn verify_moves_without_dose() {
    let with_third = |weights: [f64; 3], jaws: [[f64; 2]; 3]| {
        plan_with(|plan| {
            let points = &mut plan.beams[0].control_points;
            points.push(points[1].clone());
            for ((point, weight), jaws_cm) in points.iter_mut().zip(weights).zip(jaws) {
                point.cumulative_weight = Given::stated(weight);
                point.jaws_x_cm = Given::stated(jaws_cm);
            }
        })
    };
    let (wide, narrow) = ([-5.0, 5.0], [-3.0, 3.0]);
    let moved_before = calculate(&with_third([0.0, 0.0, 1.0], [narrow, wide, wide]));
    assert_eq!(moved_before.technique, Technique::Static);
    assert_close(verified_cgy_per_mu(&moved_before), 0.8, 1e-12);
    let moved_after = calculate(&with_third([0.0, 1.0, 1.0], [wide, wide, narrow]));
    assert_eq!(moved_after.technique, Technique::Static);
    let four = plan_with(|plan| {
        let points = &mut plan.beams[0].control_points;
        points.push(points[1].clone());
        points.push(points[1].clone());
        for ((point, weight), jaws_cm) in points
            .iter_mut()
            .zip([0.0, 0.25, 0.25, 1.0])
            .zip([wide, wide, narrow, narrow])
        {
            point.cumulative_weight = Given::stated(weight);
            point.jaws_x_cm = Given::stated(jaws_cm);
        }
    });
    let segmented = calculate(&four);
    assert_eq!(segmented.technique, Technique::Segmented);
    // A quarter of the meterset 10 cm wide, the rest 6 cm: 0.25 * 10 + 0.75 * 6 = 7.
    assert_close(segmented.x_cm.unwrap(), 7.0, 1e-12);
    let moving = calculate(&with_third([0.0, 0.5, 1.0], [wide, narrow, narrow]));
    assert_eq!(moving.technique, Technique::Dynamic);
    // The TG-71 model states no penumbra, so neither is calculated.
    for result in [&segmented, &moving] {
        assert_eq!(result.trace, None);
        assert_eq!(kinds(result), [ObstacleKind::Model]);
        let message = &result.obstacles[0].message;
        assert!(message.contains("penumbra_sigma_cm"), "{message}");
    }
    // Nothing delivered at all.
    let nothing = calculate(&with_third([0.0, 0.0, 0.0], [wide, wide, wide]));
    assert!(kinds(&nothing).contains(&ObstacleKind::Reading));
}

/// Collimator, couch or isocentre that change while meterset accrues never pass as static.
#[test]
fn verify_turning_parts_are_refused() {
    type Change = fn(&mut counterfoil::plan::ControlPoint);
    let changes: [Change; 7] = [
        |point| point.collimator_deg = Given::stated(5.0),
        |point| point.couch_deg = Given::stated(5.0),
        |point| point.isocentre = Given::stated(Point::new(1.0, -2.0, 31.0)),
        |point| point.couch_pitch_deg = Given::stated(2.0),
        |point| point.eccentric_deg = Given::stated(2.0),
        |point| point.gantry_pitch_deg = Given::stated(2.0),
        |point| point.collimator_deg = Given::Absent,
    ];
    for (index, change) in changes.into_iter().enumerate() {
        let result = calculate(&plan_with(|plan| {
            change(&mut plan.beams[0].control_points[1])
        }));
        assert!(
            kinds(&result).contains(&ObstacleKind::Technique),
            "change {index}"
        );
    }
    let directed = calculate(&plan_with(|plan| {
        plan.beams[0].control_points[0].collimator_direction = Given::stated("CC".to_owned());
    }));
    assert_eq!(kinds(&directed), [ObstacleKind::Technique]);
}

fn reference(number: i32, kind: &str, point: Option<[f64; 3]>) -> DoseReference {
    DoseReference {
        number: Given::stated(number),
        uid: Given::stated(format!("2.25.{number}")),
        reference_type: Given::stated(kind.to_owned()),
        point: point.map_or(Given::Absent, |[x, y, z]| {
            Given::stated(Point::new(x, y, z))
        }),
        ..DoseReference::default()
    }
}

const ISOCENTRE: [f64; 3] = [1.0, -2.0, 30.0];
const ELSEWHERE: [f64; 3] = [2.0, -2.0, 30.0];

/// A plan without Beam Dose Specification Point.
fn unpointed(change: impl FnOnce(&mut Plan)) -> Plan {
    plan_with(|plan| {
        plan.fraction_groups[0].beams[0].specification_point = Given::Absent;
        change(plan);
    })
}

fn name_at_control_points(plan: &mut Plan, numbers: &[i32]) {
    for point in &mut plan.beams[0].control_points {
        point.referenced_doses = numbers
            .iter()
            .map(|&number| ReferencedDose {
                number: Given::stated(number),
                cumulative_coefficient: Given::Absent,
                point_depth: None,
            })
            .collect();
    }
}

fn basis(result: &BeamCalculation) -> Option<PointBasis> {
    result.point.as_ref().map(|point| point.basis)
}

#[test]
fn verify_order_of_points() {
    let named = calculate(&unpointed(|plan| {
        plan.dose_references = vec![
            reference(1, "TARGET", Some(ELSEWHERE)),
            reference(2, "ORGAN_AT_RISK", Some(ISOCENTRE)),
        ];
        plan.fraction_groups[0].beams[0].dose_reference_uid = Given::stated("2.25.2".to_owned());
    }));
    assert_eq!(basis(&named), Some(PointBasis::Reference));
    assert_close(verified_cgy_per_mu(&named), 0.8, 1e-12);

    let by_points = calculate(&unpointed(|plan| {
        plan.dose_references = vec![
            reference(1, "TARGET", Some(ELSEWHERE)),
            reference(2, "TARGET", Some(ISOCENTRE)),
            reference(3, "TARGET", None),
        ];
        name_at_control_points(plan, &[2, 3]);
    }));
    assert_eq!(basis(&by_points), Some(PointBasis::Reference));
    assert_close(verified_cgy_per_mu(&by_points), 0.8, 1e-12);

    let target = calculate(&unpointed(|plan| {
        plan.dose_references = vec![
            DoseReference {
                number: Given::Absent,
                ..reference(0, "TARGET", Some(ELSEWHERE))
            },
            reference(3, "TARGET", Some(ELSEWHERE)),
            reference(1, "ORGAN_AT_RISK", Some(ELSEWHERE)),
            reference(2, "TARGET", Some(ISOCENTRE)),
        ];
    }));
    assert_eq!(basis(&target), Some(PointBasis::Target));
    assert_close(verified_cgy_per_mu(&target), 0.8, 1e-12);
    assert_eq!(target.remarks.len(), 1);
}

#[test]
fn verify_points_in_doubt_are_obstacles() {
    // Not stated: a number at the isocentre, no verification.
    let isocentre = calculate(&unpointed(|_| {}));
    assert_eq!(basis(&isocentre), Some(PointBasis::Isocentre));
    assert_eq!(kinds(&isocentre), [ObstacleKind::Point]);
    assert!(isocentre.is_calculated());

    let two_points = calculate(&plan_with(|plan| {
        plan.dose_references = vec![reference(1, "TARGET", Some(ELSEWHERE))];
        plan.fraction_groups[0].beams[0].dose_reference_uid = Given::stated("2.25.1".to_owned());
    }));
    assert_eq!(kinds(&two_points), [ObstacleKind::Point]);

    let several = calculate(&unpointed(|plan| {
        plan.dose_references = vec![
            reference(1, "TARGET", Some(ISOCENTRE)),
            reference(2, "ORGAN_AT_RISK", Some(ELSEWHERE)),
        ];
        name_at_control_points(plan, &[1, 2]);
    }));
    assert_eq!(kinds(&several), [ObstacleKind::Point]);

    let contradicting = calculate(&unpointed(|plan| {
        plan.dose_references = vec![
            reference(1, "TARGET", Some(ISOCENTRE)),
            reference(2, "TARGET", Some(ELSEWHERE)),
        ];
        plan.fraction_groups[0].beams[0].dose_reference_uid = Given::stated("2.25.1".to_owned());
        name_at_control_points(plan, &[2]);
    }));
    assert_eq!(kinds(&contradicting), [ObstacleKind::Point]);

    // The dose belongs to a reference without coordinates, or to none in the plan: a target point elsewhere is no answer.
    for uid in ["2.25.1", "2.25.9"] {
        let volume = calculate(&unpointed(|plan| {
            plan.dose_references = vec![
                reference(1, "TARGET", None),
                reference(2, "TARGET", Some(ISOCENTRE)),
            ];
            plan.fraction_groups[0].beams[0].dose_reference_uid = Given::stated(uid.to_owned());
        }));
        assert_eq!(kinds(&volume), [ObstacleKind::Point]);
    }
}

#[test]
fn verify_isocentre_serves_where_the_site_says_so() {
    let plan = unpointed(|plan| plan.identity.model_name = Given::stated("Planner".to_owned()));
    let mut site = Site::default();
    let machine = tg71("tg71-tpr");
    let mut calculate_for = |allowed: &str| {
        site.point.isocentre_serves_for = vec![allowed.to_owned()];
        calculate_beam(&request(&plan, &machine, &site, None))
    };
    assert_close(verified_cgy_per_mu(&calculate_for("Planner")), 0.8, 1e-12);
    assert_eq!(kinds(&calculate_for("planner")), [ObstacleKind::Point]);
}

fn request<'a>(
    plan: &'a Plan,
    machine: &'a MachineModel,
    site: &'a Site,
    depth_row: Option<&'a DepthRow>,
) -> BeamRequest<'a> {
    BeamRequest {
        plan,
        beam_index: 0,
        group: Some((0, 0)),
        model: ModelAnswer::Found(machine),
        site,
        depth_row,
        steps: StepLimits::default(),
    }
}

fn with_row(plan: &Plan, row: &DepthRow) -> BeamCalculation {
    calculate_beam(&request(
        plan,
        &tg71("tg71-tpr"),
        &Site::default(),
        Some(row),
    ))
}

fn row(depth_cm: f64, effective_depth_cm: Option<f64>, ssd_cm: Option<f64>) -> DepthRow {
    DepthRow {
        sop_instance_uid: "2.25.100".to_owned(),
        beam_number: 1,
        depth_cm,
        effective_depth_cm,
        ssd_cm,
        independent: true,
    }
}

fn set(place: PointDepthPlace, [depth, equivalent, ssd]: [Option<f64>; 3]) -> PointDepth {
    let given = |value: Option<f64>| value.map_or(Given::Absent, Given::stated);
    PointDepth {
        place,
        cumulative_weight: Given::Absent,
        depth_cm: given(depth),
        equivalent_depth_cm: given(equivalent),
        ssd_cm: given(ssd),
        source_to_external_contour_cm: Given::Absent,
        averaged: Given::Absent,
    }
}

fn with_sets(sets: Vec<PointDepth>) -> Plan {
    plan_with(|plan| plan.fraction_groups[0].beams[0].point_depths = sets)
}

#[test]
fn verify_order_of_depths() {
    let plan = with_sets(vec![set(
        PointDepthPlace::ReferencedBeam,
        [Some(10.0), Some(8.0), Some(90.0)],
    )]);
    let result = calculate(&plan);
    // On the axis at 100 cm: TPR(8, 10 x 10) 1.074 in the data set's table.
    assert_close(verified_cgy_per_mu(&result), 0.8 * 1.074, 1e-12);
    let bases: Vec<DepthBasis> = result.depths.iter().map(|depth| depth.basis).collect();
    assert_eq!(bases, [DepthBasis::Plan, DepthBasis::Ssd]);

    let result = with_row(&plan, &row(12.0, None, None));
    assert_close(verified_cgy_per_mu(&result), 0.8 * 0.927, 1e-12);
    let bases: Vec<DepthBasis> = result.depths.iter().map(|depth| depth.basis).collect();
    assert_eq!(
        bases,
        [DepthBasis::Table, DepthBasis::Plan, DepthBasis::Ssd]
    );
    assert!(result.depths[0].independent);
}

/// Off the axis: the plan's point depth is along the ray, the flat-surface one perpendicular. Point 6 cm toward
/// the right of the observer at the isocentre's distance: ray length sqrt(100^2 + 6^2) = 100.17984,
/// cosine 0.998205; SSD 90 on the axis: 10 cm perpendicular, 10.017984 along the ray.
#[test]
fn verify_depth_conventions_off_axis() {
    let plan = plan_with(|plan| {
        let reference = &mut plan.fraction_groups[0].beams[0];
        reference.specification_point = Given::stated(Point::new(7.0, -2.0, 30.0));
        reference.point_depths = vec![set(
            PointDepthPlace::ReferencedBeam,
            [Some(10.017_984), None, None],
        )];
        for point in &mut plan.beams[0].control_points {
            point.jaws_x_cm = Given::stated([-10.0, 10.0]);
        }
    });
    let result = calculate(&plan);
    assert_eq!(result.obstacles, []);
    for depth in &result.depths {
        assert_close(depth.perpendicular_cm.unwrap(), 10.0, 1e-6);
        assert_close(depth.along_ray_cm.unwrap(), 10.017_984, 1e-6);
        assert_close(depth.effective_cm, 10.017_984, 1e-6);
        assert_close(depth.ssd_cm.unwrap(), 90.0, 1e-6);
    }
}

#[test]
fn verify_depths_in_doubt_are_obstacles() {
    use PointDepthPlace::{ControlPoint, ReferencedBeam, VerificationControlPoint};
    let depth_only = |value| [Some(value), None, None];
    // Two places that contradict each other by more than the built-in 5 mm.
    let two = calculate(&with_sets(vec![
        set(ReferencedBeam, depth_only(10.0)),
        set(VerificationControlPoint(0), depth_only(10.6)),
    ]));
    assert_eq!(kinds(&two), [ObstacleKind::Depth]);
    let near = calculate(&with_sets(vec![
        set(ReferencedBeam, depth_only(10.0)),
        set(VerificationControlPoint(0), depth_only(10.4)),
    ]));
    assert_eq!(kinds(&near), []);
    // A set whose depth and SSD do not add up to the point's distance of 100 cm.
    let inside = calculate(&with_sets(vec![set(
        ReferencedBeam,
        [Some(10.0), None, Some(88.0)],
    )]));
    assert_eq!(kinds(&inside), [ObstacleKind::Depth]);
    // A set with an SSD alone: 100 - 90 = 10.
    let ssd_alone = calculate(&with_sets(vec![set(
        ReferencedBeam,
        [None, None, Some(90.0)],
    )]));
    assert_close(verified_cgy_per_mu(&ssd_alone), 0.8, 1e-12);
    // Control points' depths count only for the point's own dose reference.
    let at_points = |point: Option<[f64; 3]>| {
        let plan = plan_with(|plan| {
            plan.dose_references = vec![reference(1, "TARGET", point)];
            name_at_control_points(plan, &[1]);
            for control_point in &mut plan.beams[0].control_points {
                control_point.referenced_doses[0].point_depth =
                    Some(set(ControlPoint, depth_only(12.0)));
            }
        });
        calculate(&plan).depths[0].basis
    };
    assert_eq!(at_points(Some(ISOCENTRE)), DepthBasis::Plan);
    assert_eq!(at_points(Some(ELSEWHERE)), DepthBasis::Ssd);
    assert_eq!(at_points(None), DepthBasis::Ssd);
    // A reference without coordinates, but the one the beam's dose belongs to.
    let named = plan_with(|plan| {
        plan.dose_references = vec![reference(1, "TARGET", None)];
        plan.fraction_groups[0].beams[0].dose_reference_uid = Given::stated("2.25.1".to_owned());
        name_at_control_points(plan, &[1]);
        for control_point in &mut plan.beams[0].control_points {
            control_point.referenced_doses[0].point_depth =
                Some(set(ControlPoint, depth_only(12.0)));
        }
    });
    assert_eq!(calculate(&named).depths[0].basis, DepthBasis::Plan);
    // SSD beyond the point: above the surface.
    let above = calculate(&plan_with_points(|point| {
        point.ssd_cm = Given::stated(101.0)
    }));
    assert!(kinds(&above).contains(&ObstacleKind::Depth));
    assert_eq!(above.trace, None);
    // SSD that changes though nothing moves.
    let changing = calculate(&plan_with(|plan| {
        plan.beams[0].control_points[1].ssd_cm = Given::stated(91.0);
    }));
    assert_eq!(kinds(&changing), [ObstacleKind::Depth]);
    // None at all.
    let none = calculate(&plan_with_points(|point| point.ssd_cm = Given::Absent));
    assert_eq!(kinds(&none), [ObstacleKind::Depth]);
    assert_eq!((none.trace, none.depths.len()), (None, 0));
    // A row that contradicts itself.
    let row_off = with_row(&plain_plan(), &row(10.0, None, Some(85.0)));
    assert_eq!(kinds(&row_off), [ObstacleKind::Depth]);
}

/// Averages are used and told.
#[test]
fn verify_averages_are_told() {
    let mut averaged = set(PointDepthPlace::ReferencedBeam, [Some(10.0), None, None]);
    averaged.averaged = Given::stated(true);
    let result = calculate(&with_sets(vec![averaged]));
    assert_close(verified_cgy_per_mu(&result), 0.8, 1e-12);
    assert_eq!(result.remarks.len(), 1);
}

/// While the gantry turns the point has no one place in the beam: nothing is told that holds at one angle only,
/// and neither one depth nor one SSD stands for the whole arc.
#[test]
fn verify_arc_has_no_one_geometry() {
    let mut plan = with_sets(vec![set(
        PointDepthPlace::ReferencedBeam,
        [Some(11.0), Some(9.0), None],
    )]);
    plan.beams[0].control_points[1].gantry_deg = Given::stated(180.0);
    // An SSD at the first control point that the second merely inherits.
    plan.beams[0].control_points[1].ssd_cm = Given::Inherited {
        value: 90.0,
        from_control_point: 0,
    };
    let result = calculate(&plan);
    assert_eq!(result.technique, Technique::Arc);
    assert_eq!(kinds(&result), [ObstacleKind::Depth]);
    assert_eq!(
        (result.gantry_deg, result.gantry_end_deg),
        (Some(0.0), Some(180.0))
    );
    assert_eq!(result.point.unwrap().spd_cm, None);
    assert_eq!(result.view.point_cm, None);
    assert_eq!(result.depths, []);
    assert_eq!(result.trace, None);
}

/// An equivalent depth alone: no geometric depth, the TPR form.
#[test]
fn verify_equivalent_depth_alone() {
    let plan = with_sets(vec![set(
        PointDepthPlace::ReferencedBeam,
        [None, Some(8.0), None],
    )]);
    let result = calculate_with(&plan, &tg71("tg71-tpr"));
    assert_close(verified_cgy_per_mu(&result), 0.8 * 1.074, 1e-12);
    assert_eq!(result.depths[0].perpendicular_cm, None);
}

#[test]
fn verify_bolus() {
    let with_bolus = |plan: &mut Plan| plan.beams[0].boluses.push(Bolus::default());
    // SSD to bolus or to skin? Not said.
    assert_eq!(
        kinds(&calculate(&plan_with(with_bolus))),
        [ObstacleKind::Depth]
    );
    let mut plan = with_sets(vec![set(
        PointDepthPlace::ReferencedBeam,
        [Some(10.0), None, None],
    )]);
    with_bolus(&mut plan);
    assert_eq!(kinds(&calculate(&plan)), [ObstacleKind::Depth]);
    // A radiological depth counts it; a row is the user's word.
    let mut plan = with_sets(vec![set(
        PointDepthPlace::ReferencedBeam,
        [Some(10.0), Some(10.0), None],
    )]);
    with_bolus(&mut plan);
    let result = calculate(&plan);
    assert_eq!((kinds(&result), result.remarks.len()), (vec![], 1));
    let result = with_row(&plan_with(with_bolus), &row(10.0, None, None));
    assert_eq!((kinds(&result), result.remarks.len()), (vec![], 1));
}

fn accessory(kind: &str, id: &str) -> Accessory {
    Accessory {
        kind: Given::stated(kind.to_owned()),
        id: Given::stated(id.to_owned()),
        ..Accessory::default()
    }
}

#[test]
fn verify_devices_in_the_beam() {
    let mut machine = tg71("tg71-tpr");
    machine.beams[0].trays = vec![("T1".to_owned(), 0.97)];
    let with =
        |change: &dyn Fn(&mut Plan)| calculate_with(&plan_with(|plan| change(plan)), &machine);
    let tray = with(&|plan| plan.beams[0].accessories.push(accessory("TRAY", "T1 ")));
    assert_close(verified_cgy_per_mu(&tray), 0.8 * 0.97, 1e-12);
    // What no table covers: no number at all, jaws alone would pass wrongly.
    let uncovered: [&dyn Fn(&mut Plan); 5] = [
        &|plan| plan.beams[0].accessories.push(accessory("TRAY", "T2")),
        &|plan| plan.beams[0].accessories.push(accessory("RETICLE", "T1")),
        &|plan| plan.beams[0].applicators.push(Applicator::default()),
        &|plan| plan.beams[0].compensators.push(Compensator::default()),
        &|plan| {
            plan.beams[0].accessories = vec![accessory("TRAY", "T1"), accessory("TRAY", "T2")];
        },
    ];
    for change in uncovered {
        let result = with(change);
        assert_eq!(kinds(&result), [ObstacleKind::Technique]);
        assert_eq!(result.trace, None);
    }
    let other_device = with(&|plan| {
        plan.beams[0].devices[0].kind = DeviceKind::Other("IRIS".to_owned());
    });
    assert_eq!(kinds(&other_device), [ObstacleKind::Technique]);
    // A tray factor without a tray is told and not used.
    let factor = with(&|plan| plan.beams[0].total_block_tray_factor = Given::stated(0.97));
    assert_close(verified_cgy_per_mu(&factor), 0.8, 1e-12);
    assert_eq!(factor.remarks.len(), 1);
}

/// Gantry 180 with an arc from 150 to 210; at gantry 0 the couch is not in the beam.
#[test]
fn verify_couch_by_gantry_angle() {
    let mut machine = tg71("tg71-tpr");
    machine.beams[0].couch = vec![CouchArc {
        from_deg: 150.0,
        to_deg: 210.0,
        transmission: 0.975,
    }];
    let from_below = plan_with_points(|point| point.gantry_deg = Given::stated(180.0));
    let result = calculate_with(&from_below, &machine);
    assert_close(verified_cgy_per_mu(&result), 0.8 * 0.975, 1e-12);
    assert_eq!(result.remarks.len(), 1);
    assert_close(
        verified_cgy_per_mu(&calculate_with(&plain_plan(), &machine)),
        0.8,
        1e-12,
    );
}

/// Whether an effective depth may hold the couch already is told for the depth that is used, not for another.
#[test]
fn verify_couch_that_may_count_twice() {
    let mut machine = tg71("tg71-tpr");
    machine.beams[0].couch = vec![CouchArc {
        from_deg: 350.0,
        to_deg: 10.0,
        transmission: 0.975,
    }];
    let plan = with_sets(vec![set(
        PointDepthPlace::ReferencedBeam,
        [Some(10.0), Some(10.0), None],
    )]);
    let site = Site::default();
    let remark = |row: Option<&DepthRow>| {
        let result = calculate_beam(&request(&plan, &machine, &site, row));
        assert_close(verified_cgy_per_mu(&result), 0.8 * 0.975, 1e-12);
        result.remarks.concat()
    };
    assert!(remark(None).contains("counts twice"));
    assert!(!remark(Some(&row(10.0, None, None))).contains("counts twice"));
}

/// A long field is integrated, and the doubts about its couch are told as for one that goes by factors.
#[test]
fn verify_couch_of_a_long_field_that_may_count_twice() {
    let mut machine = shaped_machine();
    machine.beams[0].couch = vec![CouchArc {
        from_deg: 350.0,
        to_deg: 10.0,
        transmission: 0.975,
    }];
    let mut plan = with_sets(vec![set(
        PointDepthPlace::ReferencedBeam,
        [Some(10.0), Some(10.0), None],
    )]);
    for point in &mut plan.beams[0].control_points {
        point.jaws_x_cm = Given::stated([-12.0, 12.0]);
        point.jaws_y_cm = Given::stated([-4.0, 4.0]);
        point.couch_deg = Given::stated(15.0);
    }
    let result = calculate_beam(&request(&plan, &machine, &Site::default(), None));
    assert_eq!(result.method, Some(Method::ScatterIntegration));
    let remarks = result.remarks.concat();
    assert!(remarks.contains("counts twice"), "{remarks}");
    assert!(remarks.contains("turned couch"), "{remarks}");
}

/// What the plan alone gives is there without a model.
#[test]
fn verify_no_model() {
    let plan = plain_plan();
    let site = Site::default();
    let machine = tg71("tg71-tpr");
    let result = calculate_beam(&BeamRequest {
        model: ModelAnswer::Unknown {
            known_names: vec!["ALPHA", "BETA"],
        },
        ..request(&plan, &machine, &site, None)
    });
    assert_eq!(kinds(&result), [ObstacleKind::Model]);
    assert!(result.obstacles[0].message.contains("ALPHA, BETA"));
    assert_close(result.x_cm.unwrap(), 10.0, 1e-12);
    assert_close(result.depths[0].effective_cm, 10.0, 1e-12);
    assert_close(result.point.unwrap().spd_cm.unwrap(), 100.0, 1e-12);
    assert_eq!(result.view.point_cm, Some([0.0, 0.0]));
    assert_eq!(result.trace, None);
}

#[test]
fn verify_model_that_does_not_fit() {
    let energy = calculate(&plan_with(|plan| {
        plan.beams[0].energy.nominal = Given::stated(10.0)
    }));
    assert_eq!(kinds(&energy), [ObstacleKind::Model]);
    assert!(
        energy.obstacles[0].message.contains("10"),
        "{:?}",
        energy.obstacles
    );
    let unflattened = calculate(&plan_with(|plan| {
        plan.beams[0].energy.fluence_mode = Given::stated("NON_STANDARD".to_owned());
        plan.beams[0].energy.fluence_mode_id = Given::stated("FFF".to_owned());
    }));
    assert_eq!(kinds(&unflattened), [ObstacleKind::Model]);
    let sad = calculate(&plan_with(|plan| {
        plan.beams[0].sad_cm = Given::stated(80.0)
    }));
    assert!(kinds(&sad).contains(&ObstacleKind::Model));
    let changing = calculate(&plan_with(|plan| plan.beams[0].energy.changes = true));
    assert_eq!(kinds(&changing), [ObstacleKind::Technique]);
    // Not stated: the flattened beam, and said so.
    let unstated = calculate(&plan_with(|plan| {
        plan.beams[0].energy.fluence_mode = Given::Absent
    }));
    assert_close(verified_cgy_per_mu(&unstated), 0.8, 1e-12);
    assert_eq!(unstated.remarks.len(), 1);
}

#[test]
fn verify_meterset() {
    for meterset in [Given::Absent, Given::stated(0.0), Given::stated(-3.0)] {
        let result = calculate(&plan_with(|plan| {
            plan.fraction_groups[0].beams[0].meterset_mu = meterset;
        }));
        assert_eq!(kinds(&result), [ObstacleKind::Meterset]);
        assert!(result.is_calculated());
    }
    let minutes = calculate(&plan_with(|plan| {
        plan.beams[0].dosimeter_unit = Given::stated("MINUTE".to_owned());
    }));
    assert_eq!(kinds(&minutes), [ObstacleKind::Meterset]);
    let plan = plain_plan();
    let alone = calculate_beam(&BeamRequest {
        group: None,
        ..request(&plan, &tg71("tg71-tpr"), &Site::default(), None)
    });
    assert!(kinds(&alone).contains(&ObstacleKind::Meterset));
}

/// Nothing that is missing is taken as zero.
#[test]
fn verify_missing_attributes() {
    type Change = fn(&mut counterfoil::plan::ControlPoint);
    let changes: [Change; 4] = [
        |point| point.gantry_deg = Given::Absent,
        |point| point.collimator_deg = Given::Absent,
        |point| point.couch_deg = Given::Absent,
        |point| point.isocentre = Given::Absent,
    ];
    for change in changes {
        assert!(kinds(&calculate(&plan_with_points(change))).contains(&ObstacleKind::Reading));
    }
    for axis in [0, 1] {
        let open = calculate(&plan_with_points(|point| {
            if axis == 0 {
                point.jaws_x_cm = Given::Absent;
            } else {
                point.jaws_y_cm = Given::Absent;
            }
        }));
        assert_eq!(kinds(&open), [ObstacleKind::Reading]);
        assert_eq!(open.trace, None);
    }
    let no_sad = calculate(&plan_with(|plan| plan.beams[0].sad_cm = Given::Absent));
    assert!(kinds(&no_sad).contains(&ObstacleKind::Reading));
    assert_eq!(no_sad.trace, None);
    // Tilts are optional: absent is none, stated is used, an eccentric turn is refused.
    let eccentric = calculate(&plan_with_points(|point| {
        point.eccentric_deg = Given::stated(3.0)
    }));
    assert_eq!(kinds(&eccentric), [ObstacleKind::Technique]);
    let closed = calculate(&plan_with_points(|point| {
        point.jaws_x_cm = Given::stated([2.0, 2.0])
    }));
    assert!(kinds(&closed).contains(&ObstacleKind::Reading));
    assert_eq!(closed.trace, None);
}

/// The patient position matters unless the point is the isocentre.
#[test]
fn verify_patient_position() {
    let mut plan = plan_with(|plan| plan.patient_setups[0].position = Given::Absent);
    let result = calculate(&plan);
    assert_close(verified_cgy_per_mu(&result), 0.8, 1e-12);
    assert_eq!(result.remarks.len(), 1);
    plan.fraction_groups[0].beams[0].specification_point =
        Given::stated(Point::new(2.0, -2.0, 30.0));
    let result = calculate(&plan);
    assert!(kinds(&result).contains(&ObstacleKind::Reading));
    assert_eq!(result.trace, None);
}

/// Gantry 90: the source is on the left of a patient who lies supine with the head to the gantry, so a
/// point 2 cm to the left is 2 cm nearer (SPD 98); with the feet to the gantry it is on the right (SPD 102).
#[test]
fn verify_patient_position_of_the_beams_own_setup() {
    use counterfoil::plan::PatientPosition::{FeetFirstSupine, HeadFirstSupine};
    for (position, spd_cm) in [(HeadFirstSupine, 98.0), (FeetFirstSupine, 102.0)] {
        let mut plan = plan_with_points(|point| point.gantry_deg = Given::stated(90.0));
        let other = PatientSetup {
            number: Given::stated(2),
            position: Given::stated(position),
            ..PatientSetup::default()
        };
        plan.patient_setups.push(other);
        plan.beams[0].patient_setup_number = Given::stated(2);
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(3.0, -2.0, 30.0));
        let result = calculate(&plan);
        assert_eq!(result.obstacles, []);
        assert_close(result.point.unwrap().spd_cm.unwrap(), spd_cm, 1e-9);
        // 90 cm to the surface: 8 and 12 cm deep.
        assert_close(
            result.depths[0].perpendicular_cm.unwrap(),
            spd_cm - 90.0,
            1e-9,
        );
    }
    // No setup named, and two that differ: not known.
    let mut plan = plain_plan();
    plan.patient_setups.push(PatientSetup {
        position: Given::stated(FeetFirstSupine),
        ..PatientSetup::default()
    });
    plan.beams[0].patient_setup_number = Given::Absent;
    assert_eq!(kinds(&calculate(&plan)), [ObstacleKind::Reading]);
}

/// A reading note that blocks the beam, its group or the plan stands as an obstacle with place and message.
#[test]
fn verify_reading_notes() {
    let with_note = |scope, effect| {
        calculate(&plan_with(|plan| {
            plan.notes.push(ReadingNote {
                scope,
                kind: NoteKind::MalformedValue,
                effect,
                place: "BeamSequence[1].BeamName (300A,00C2)".to_owned(),
                message: "not readable".to_owned(),
                measured: None,
                limit: None,
            });
        }))
    };
    for (scope, effect, blocks) in [
        (NoteScope::Beam(0), Effect::BlocksScope, true),
        (NoteScope::Beam(1), Effect::BlocksScope, false),
        (NoteScope::FractionGroup(0), Effect::BlocksScope, true),
        (NoteScope::FractionGroup(1), Effect::BlocksScope, false),
        (NoteScope::Plan, Effect::BlocksScope, true),
        (NoteScope::Beam(1), Effect::BlocksPlan, true),
        (NoteScope::Beam(0), Effect::None, false),
    ] {
        let result = with_note(scope, effect);
        assert_eq!(
            kinds(&result).contains(&ObstacleKind::Reading),
            blocks,
            "{scope:?} {effect:?}"
        );
        if blocks {
            let message = &result.obstacles[0].message;
            assert!(message.contains("300A,00C2") && message.contains("not readable"));
        }
    }
}
