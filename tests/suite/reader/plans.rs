//! Plans that several modules of the reader's tests use.

use crate::builder::{
    AccessorySpec, BeamSpec, BlockSpec, CompensatorSpec, DepthSpec, DeviceSpec, PlanSpec,
    PointSpec, ReferenceSpec, WedgeSpec,
};

/// A wedge of 30 degrees.
pub(super) fn wedge(number: i32) -> WedgeSpec {
    WedgeSpec {
        number,
        kind: "STANDARD".to_owned(),
        id: "W30".to_owned(),
        angle_deg: 30,
        factor: Some(0.5432),
        orientation_deg: 90.0,
        source_to_tray_cm: Some(58.5),
    }
}

/// A block with a square outline of 2 cm.
pub(super) fn block() -> BlockSpec {
    BlockSpec {
        number: 1,
        name: "Corner".to_owned(),
        kind: "SHIELDING".to_owned(),
        divergent: true,
        tray_id: Some("TRAY1".to_owned()),
        material: "LEAD".to_owned(),
        thickness_cm: Some(8.0),
        transmission: Some(0.03),
        source_to_tray_cm: Some(65.4),
        outline_cm: vec![[2.0, 2.0], [4.0, 2.0], [4.0, 4.0], [2.0, 4.0]],
    }
}

/// Three beams that between them hold everything the builder knows.
pub(super) fn everything() -> PlanSpec {
    let leaves: Vec<f64> = [-3.0; 20].into_iter().chain([3.5; 20]).collect();
    let mut first = BeamSpec::new(7, "Wedge, block, leaves")
        .with_machine("Birch")
        .with_jaws([-4.0, 6.25], [-7.5, 5.0])
        .with_leaves(DeviceSpec::leaves("MLCX", 20, 1.0), leaves)
        .with_gantry(271.5)
        .with_collimator(15.0)
        .with_couch(350.0)
        .with_isocentre([1.25, -20.5, 33.1])
        .with_wedge(wedge(3))
        .with_block(block())
        .with_bolus(12)
        .map_first(|point| {
            point.surface_entry_cm = Some([1.25, -30.5, 33.1]);
            point.source_to_external_contour_cm = Some(88.5);
            point.couch_cm = Some([-12.5, 100.0, 2.0]);
            point.couch_pitch_deg = Some(1.5);
            point.couch_roll_deg = Some(-0.5);
            point.gantry_pitch_deg = Some(0.0);
            point.doses = vec![(
                1,
                0.0,
                Some(DepthSpec {
                    depth_cm: Some(9.75),
                    ..DepthSpec::default()
                }),
            )];
        });
    first.description = Some("All of it".to_owned());
    first.total_tray_factor = Some(0.97);
    first.accessories = vec![AccessorySpec {
        number: 1,
        id: "GRATICULE1".to_owned(),
        kind: Some("GRATICULE".to_owned()),
    }];
    first.compensators = vec![CompensatorSpec {
        number: 1,
        id: "C1".to_owned(),
        material: "BRASS".to_owned(),
        transmission: Some([0.5, 0.6, 0.7, 0.8]),
        thickness_cm: Some([1.0, 1.5, 2.0, 2.5]),
    }];
    let mut reference = ReferenceSpec::new(7, 123.456_789, 0.987_654);
    reference.point_cm = Some([1.0, -21.0, 33.0]);
    reference.dose_meaning = Some("BEAM_LEVEL".to_owned());
    reference.dose_type = Some("PHYSICAL".to_owned());
    reference.depths = Some(DepthSpec {
        depth_cm: Some(9.75),
        equivalent_depth_cm: Some(9.5),
        ssd_cm: Some(90.25),
        source_to_external_contour_cm: Some(89.5),
        averaged: None,
        weight: None,
    });
    reference.averages = Some(DepthSpec {
        depth_cm: Some(9.625),
        ..DepthSpec::default()
    });
    reference.verification = vec![DepthSpec {
        weight: Some(0.0),
        depth_cm: Some(9.875),
        averaged: Some(false),
        ..DepthSpec::default()
    }];
    let electrons = BeamSpec::new(2, "Electrons")
        .with_machine("Birch")
        .with_electrons(9.0, "A10")
        .with_ssd(100.0);
    let arc = BeamSpec::new(5, "Arc")
        .with_machine("Birch")
        .with_fluence_mode("NON_STANDARD", Some("FFF"))
        .with_arc(340.0, "CW", 35);
    let mut spec = PlanSpec::default()
        .with_label("EVERYTHING")
        .with_uid_root("2.25.20240105.1");
    spec.beams = vec![first, electrons, arc];
    spec.groups[0].beams = vec![
        ReferenceSpec::new(2, 200.0, 1.8),
        reference,
        ReferenceSpec::new(5, 300.0, 2.0),
    ];
    spec.with_setup_beam(9)
}

/// An arc plan like a big export: two arcs of 178 control points, 60 leaf pairs.
pub(super) fn big_arcs() -> PlanSpec {
    let mut spec = PlanSpec::default().with_label("ARCS");
    spec.beams.clear();
    spec.groups[0].beams.clear();
    for number in 1..=2 {
        let positions = |index: u16| -> Vec<f64> {
            (0..120_u16)
                .map(|leaf| {
                    let step = f64::from((leaf * 7 + index * 13) % 40) / 16.0;
                    if leaf < 60 { -0.25 - step } else { 0.25 + step }
                })
                .collect()
        };
        let mut beam = BeamSpec::new(number, &format!("Arc {number}"))
            .with_gantry(181.0)
            .with_leaves(DeviceSpec::leaves("MLCX", 60, 0.5), positions(0))
            .with_arc(537.0, "CW", 178);
        let later: &mut [PointSpec] = &mut beam.control_points[1..];
        for (index, point) in (1_u16..).zip(later) {
            point.positions_cm = vec![("MLCX".to_owned(), positions(index))];
        }
        spec = spec.with_beam(beam, ReferenceSpec::new(number, 250.0, 1.0));
    }
    spec
}
