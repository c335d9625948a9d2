//! The plain texts: a trace that can be redone by pocket calculator, and a
//! plan that can be held against a printout.

use std::sync::Arc;

use counterfoil::dose::{Factor, FactorName, Input, Trace};
use counterfoil::plan::{
    Beam, ControlPoint, DeviceKind, DoseReference, Effect, FractionGroup, LeafPositions,
    LimitingDevice, NoteKind, NoteScope, Plan, RadiationType, ReadingNote, ReferencedBeam, Wedge,
    WedgeKind,
};
use counterfoil::quantity::{Given, Point};
use counterfoil::report::{ControlPointDetail, plan_text, trace_text};

fn trace(values: &[(FactorName, f64)]) -> Trace {
    Trace::new(
        "D'0 * Sc * Sp".to_owned(),
        "a source",
        vec![Input {
            name: "equivalent square of the collimator",
            symbol: "c",
            value: 12.0,
            unit: "cm",
            source: "jaws 10 x 15 cm".to_owned(),
        }],
        values
            .iter()
            .map(|(name, value)| Factor {
                name: *name,
                value: *value,
                source: format!("typed\u{1b}[2J {}", name.title()),
            })
            .collect(),
    )
}

fn line<'a>(text: &'a str, start: &str) -> &'a str {
    text.lines()
        .find(|line| line.trim_start().starts_with(start))
        .unwrap_or_else(|| panic!("no line {start:?} in\n{text}"))
}

#[test]
fn verify_trace_text_shows_every_factor() {
    // By hand: 1.000 * 1.024 * 1.0757 = 1.1015168.
    let text = trace_text(&trace(&[
        (FactorName::ReferenceOutput, 1.0),
        (FactorName::CollimatorScatter, 1.024),
        (FactorName::PhantomScatter, 1.0757),
    ]));
    assert!(
        text.starts_with("dose per MU = D'0 * Sc * Sp\n    (a source)\n"),
        "{text}"
    );
    assert!(line(&text, "c ").contains("12.000  cm"), "{text}");
    assert!(
        line(&text, "Sc").contains("collimator scatter factor"),
        "{text}"
    );
    assert!(line(&text, "Sp").contains("1.07570"), "{text}");
    assert!(line(&text, "product").contains("1.1015  cGy/MU"), "{text}");
    assert!(
        line(&text, "1.00000 *").ends_with("1.00000 * 1.02400 * 1.07570 = 1.1015 cGy/MU"),
        "{text}"
    );
    assert!(!text.contains('\u{1b}'), "{text:?}");
    // Values stand in one column: every row's unit column begins at the same place.
    let column = line(&text, "symbol").find("source").unwrap();
    assert_eq!(line(&text, "Sc").find("typed"), Some(column), "{text}");
}

#[test]
fn property_printed_factors_multiply_to_the_printed_product() {
    let names = [
        FactorName::ReferenceOutput,
        FactorName::CollimatorScatter,
        FactorName::PhantomScatter,
        FactorName::TissuePhantomRatio,
        FactorName::OffAxisRatio,
        FactorName::InverseSquare,
    ];
    for step in 0..200 {
        let value = |place: usize| 0.7 + 0.001_234_567 * f64::from(step) + 0.01 * (place as f64);
        let values: Vec<(FactorName, f64)> = names
            .iter()
            .enumerate()
            .map(|(place, name)| (*name, value(place)))
            .collect();
        let text = trace_text(&trace(&values));
        let (factors, product) = text
            .trim_end()
            .lines()
            .last()
            .unwrap()
            .split_once(" = ")
            .unwrap();
        let again: f64 = factors
            .split(" * ")
            .map(|factor| factor.parse::<f64>().unwrap())
            .product();
        let product: f64 = product.trim_end_matches(" cGy/MU").parse().unwrap();
        // Half a digit of the product, and six times half a digit of a factor of 0.7 or more.
        let bound = 0.000_05 + 6.0 * 0.000_005 / 0.7 * product;
        assert!((again - product).abs() <= bound, "{again} {product}");
    }
}

fn plan() -> Plan {
    let mut plan = Plan::default();
    plan.identity.patient_id = Given::stated("INV-0001".to_owned());
    plan.identity.plan_label = Given::stated("box\u{1b}[31m\nnext".to_owned());
    plan.dose_references = vec![DoseReference {
        number: Given::stated(1),
        target_prescription_dose_gy: Given::stated(50.0),
        ..DoseReference::default()
    }];
    plan.fraction_groups = vec![FractionGroup {
        number: Given::stated(1),
        fractions_planned: Given::stated(25),
        beams: vec![ReferencedBeam {
            beam_number: Given::stated(7),
            meterset_mu: Given::stated(116.0037),
            beam_dose_gy: Given::stated(1.02754),
            specification_point: Given::stated(Point::new(1.0, -2.5, 0.25)),
            ..ReferencedBeam::default()
        }],
        ..FractionGroup::default()
    }];
    let first = ControlPoint {
        index: Given::stated(0),
        cumulative_weight: Given::stated(0.0),
        gantry_deg: Given::stated(270.0),
        ssd_cm: Given::stated(89.843),
        jaws_x_cm: Given::derived([-10.0, 10.0], "symmetric X jaws"),
        jaws_y_cm: Given::stated([-4.0, 7.5]),
        leaves: vec![LeafPositions {
            kind: DeviceKind::Mlcx { layer: 0 },
            positions_cm: Given::stated(Arc::from([-2.0, -3.0, 2.5, 3.5])),
        }],
        ..ControlPoint::default()
    };
    let second = ControlPoint {
        index: Given::stated(1),
        cumulative_weight: Given::stated(1.0),
        gantry_deg: Given::Inherited {
            value: 270.0,
            from_control_point: 0,
        },
        leaves: vec![LeafPositions {
            kind: DeviceKind::Mlcx { layer: 0 },
            positions_cm: Given::Inherited {
                value: Arc::from([-2.0, -3.0, 2.5, 3.5]),
                from_control_point: 0,
            },
        }],
        ..ControlPoint::default()
    };
    let mut beam = Beam {
        number: Given::stated(7),
        name: Given::stated("RLAT".to_owned()),
        radiation: Given::stated(RadiationType::Photon),
        devices: vec![LimitingDevice {
            kind: DeviceKind::Mlcx { layer: 0 },
            pairs: Given::stated(2),
            source_distance_cm: Given::Absent,
            boundaries_cm: Given::stated(vec![-1.0, 0.0, 1.0]),
        }],
        wedges: vec![Wedge {
            number: Given::stated(1),
            kind: Given::stated(WedgeKind::Standard),
            angle_deg: Given::stated(30.0),
            ..Wedge::default()
        }],
        control_points: vec![first, second],
        ..Beam::default()
    };
    beam.energy.nominal = Given::stated(6.0);
    plan.beams = vec![beam];
    plan.notes = vec![ReadingNote {
        scope: NoteScope::Beam(0),
        kind: NoteKind::MissingValue,
        effect: Effect::BlocksScope,
        place: "BeamSequence[0].SourceAxisDistance (300A,00B4)".to_owned(),
        message: "The source-axis distance is missing.".to_owned(),
        measured: None,
        limit: Some("60 to 150 cm".to_owned()),
    }];
    plan
}

#[test]
fn verify_plan_text_shows_values_and_where_they_stand() {
    let text = plan_text(&plan(), ControlPointDetail::All);
    let rows = [
        ("patient ID", 'S', "INV-0001"),
        ("patient's name", '-', ""),
        ("target prescription dose", 'S', "50 Gy"),
        ("fractions planned", 'S', "25"),
        ("meterset", 'S', "116.0037 MU"),
        ("beam dose in one fraction", 'S', "1.02754 Gy"),
        ("dose specification point", 'S', "(1, -2.5, 0.25) cm"),
        ("radiation", 'S', "PHOTON"),
        ("nominal energy", 'S', "6 MV"),
        ("source-axis distance", '-', ""),
        ("SSD", 'S', "89.843 cm"),
        (
            "jaws x",
            'D',
            "-10 to 10 cm   (opening 20 cm)   (symmetric X jaws)",
        ),
        ("jaws y", 'S', "-4 to 7.5 cm   (opening 11.5 cm)"),
        ("gantry", 'S', "270 deg"),
        ("angle", 'S', "30 deg"),
    ];
    for (name, marker, value) in rows {
        let start = format!("  {marker}  {name} ");
        let found = text
            .lines()
            .any(|line| format!("{line} ").starts_with(&start) && line.trim_end().ends_with(value));
        assert!(found, "{start}{value}\n{text}");
    }
    for part in [
        "  I  gantry                             270 deg   (from control point 0)",
        "S stated in the file here",
        "Beam 7 RLAT, item 1",
        "Control point 1 of 2",
        "pair   1   y   -1.00 to    0.00   x   -2.000 to    2.500 cm",
        "beam item 1, stops its verification: The source-axis distance is missing.",
        "at BeamSequence[0].SourceAxisDistance (300A,00B4)",
        "expected 60 to 150 cm",
        "-  absent: plan name, ",
    ] {
        assert!(text.contains(part), "{part}\n{text}");
    }
    // The overview: number, name, energy, three angles, both openings, SSD, meterset, dose, control points.
    let overview = "7 RLAT 6 270 - - -10 to 10 -4 to 7.5 89.84 116.0037 MU 1.02754 2";
    assert!(
        text.lines()
            .any(|line| line.split_whitespace().eq(overview.split(' '))),
        "{overview}\n{text}"
    );
    assert_eq!(
        text.matches("pair   1").count(),
        1,
        "an inherited set is not repeated"
    );
    assert!(
        !text.contains('\u{1b}') && text.contains("box[31m next"),
        "{text}"
    );
}

#[test]
fn verify_plan_text_first_control_point_says_what_it_leaves_out() {
    let text = plan_text(&plan(), ControlPointDetail::First);
    assert!(
        text.contains("1 further control point is not shown"),
        "{text}"
    );
    assert!(!text.contains("Control point 1 of 2"), "{text}");
    let empty = plan_text(&Plan::default(), ControlPointDetail::First);
    assert!(empty.contains("no dose reference"), "{empty}");
}
