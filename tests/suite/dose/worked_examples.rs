//! Published and hand-worked monitor-unit examples, through the calculation
//! itself with the factors typed or the published tables.

use counterfoil::beam_model::ReferenceOutput;
use counterfoil::dose::{
    FactorError, FactorName, FieldDepth, FieldInput, FieldModel, Form, RayPoint, Typed,
    dose_per_mu, mayneord,
};
use counterfoil::plan::DoseReference;
use counterfoil::quantity::{Given, Patient, Point};

use super::{assert_close, calculate_with, plain_plan, tg71};

/// A symmetric field on the axis without a model.
fn typed_field<'a>(
    side_cm: [f64; 2],
    spd_cm: f64,
    depth_cm: f64,
    form: Form,
    reference: ReferenceOutput,
    typed: &[(FactorName, f64)],
) -> FieldInput<'a> {
    FieldInput {
        model: None,
        jaws_x_cm: [-0.5 * side_cm[0], 0.5 * side_cm[0]],
        jaws_y_cm: [-0.5 * side_cm[1], 0.5 * side_cm[1]],
        ray: RayPoint::on_axis(spd_cm, 100.0),
        depth: FieldDepth {
            perpendicular_cm: Some(depth_cm),
            effective_cm: depth_cm,
            source: "typed".to_owned(),
        },
        form,
        tray: None,
        wedge: None,
        couch: None,
        reference: Some(reference),
        typed: typed
            .iter()
            .map(|&(name, value)| (name, Typed::new(value)))
            .collect(),
    }
}

fn mu_for(dose_cgy: f64, field: &FieldInput<'_>) -> f64 {
    dose_cgy / dose_per_mu(field).unwrap().dose_per_mu_cgy
}

/// 1 cGy/MU at the dose maximum of 1 cm, at this distance from the source.
fn four_mv(source_distance_cm: f64) -> ReferenceOutput {
    ReferenceOutput {
        dose_per_mu_cgy: 1.0,
        depth_cm: 1.0,
        source_distance_cm,
    }
}

use FactorName::{
    CollimatorScatter as Sc, PercentDepthDose as Pdd, PhantomScatter as Sp,
    TissuePhantomRatio as Tpr,
};

/// Khan, The Physics of Radiation Therapy, chapter on dose calculation (from memory): 200 cGy,
/// 4 MV, 15 x 15 at SSD 100, 10 cm deep: 298 MU. To the digit:
/// 200 / (1 * 1.020 * 1.010 * 0.651) = 200 / 0.6706602 = 298.214.
#[test]
fn verify_fixed_ssd_of_100() {
    let field = typed_field(
        [15.0, 15.0],
        110.0,
        10.0,
        Form::FixedSsd { ssd_cm: 100.0 },
        four_mv(101.0),
        &[(Sc, 1.020), (Sp, 1.010), (Pdd, 0.651)],
    );
    assert_close(mu_for(200.0, &field), 298.214, 0.0005);
}

/// Same source (from memory), SSD 120, 15 x 15 at the skin, so 12.5 at 100 cm: 422 MU. To the digit:
/// 200 / (1.010 * 1.010 * 0.667 * (101/121)^2) = 421.880.
#[test]
fn verify_extended_ssd_of_120() {
    let field = typed_field(
        [12.5, 12.5],
        130.0,
        10.0,
        Form::FixedSsd { ssd_cm: 120.0 },
        four_mv(101.0),
        &[(Sc, 1.010), (Sp, 1.010), (Pdd, 0.667)],
    );
    assert_close(mu_for(200.0, &field), 421.880, 0.0005);
    let trace = dose_per_mu(&field).unwrap();
    // The side at the normalisation depth: 15 * 121 / 120 = 15.125.
    assert_close(trace.input("s_d0").unwrap().value, 15.125, 1e-9);
    assert_close(
        trace.factor(FactorName::InverseSquare).unwrap().value,
        (101.0_f64 / 121.0).powi(2),
        1e-12,
    );
}

/// Same source (from memory), isocentric 6 x 6, 8 cm deep: 265 MU when calibrated at the isocentre,
/// 200 / (0.787 * 0.970 * 0.990) = 264.636; 259 MU when calibrated at SSD 100,
/// the same over (101/100)^2 = 259.421.
#[test]
fn verify_isocentric() {
    let factors = [(Tpr, 0.787), (Sc, 0.970), (Sp, 0.990)];
    let field = |reference| {
        typed_field(
            [6.0, 6.0],
            100.0,
            8.0,
            Form::Isocentric,
            reference,
            &factors,
        )
    };
    assert_close(mu_for(200.0, &field(four_mv(100.0))), 264.636, 0.0005);
    assert_close(mu_for(200.0, &field(four_mv(101.0))), 259.421, 0.0005);
}

/// Cobalt-60 from SSD 80 to 100, 10 cm deep, dose maximum at 0.5 cm, PDD 58.4:
/// F = (100.5/80.5)^2 (90/110)^2 = 1.043374, PDD 60.933 (same source, from memory).
#[test]
fn verify_mayneord() {
    let moved = mayneord(58.4, 80.0, 100.0, 10.0, 0.5);
    assert_close(moved.factor, 1.043_374, 5e-7);
    assert_close(moved.pdd_percent, 60.933, 5e-4);
}

pub(super) fn tg71_field<'a>(
    model: FieldModel<'a>,
    side_cm: [f64; 2],
    spd_cm: f64,
    depth_cm: f64,
    form: Form,
) -> FieldInput<'a> {
    FieldInput {
        model: Some(model),
        reference: None,
        ..typed_field(side_cm, spd_cm, depth_cm, form, four_mv(0.0), &[])
    }
}

/// AAPM TG-71 6 MV tables (public copy), D'0 = 0.8 at SSD 90, d0 = 10. SSD 100, 10 x 10 at the
/// skin, 10 cm deep, 200 cGy. By hand: Sc(10) 1, s_d0 = 11 so Sp = (1.000 + 1.020)/2 = 1.010,
/// PDD(10) 100, (100/110)^2 = 0.826446: 200 / (0.8 * 1.010 * 0.826446) = 299.505.
#[test]
fn verify_tg71_tables_at_ssd_100() {
    let machine = tg71("tg71-pdd");
    let model = FieldModel {
        beam: &machine.beams[0],
        upper_jaws: machine.upper_jaws,
    };
    let form = Form::FixedSsd { ssd_cm: 100.0 };
    let field = tg71_field(model, [10.0, 10.0], 110.0, 10.0, form);
    assert_close(mu_for(200.0, &field), 299.505, 0.0005);
}

/// The same tables, SSD 100, 12 x 20, 8 cm deep, 180 cGy. By hand: c = s = 2*12*20/32 = 15,
/// Sc = (1.014 + 1.018)/2 = 1.016; s_d0 = 16.5, Sp = 1.051 + (1.076 - 1.051) * 0.5/4 = 1.054125;
/// PDD(8, 15) 110.3; (100/110)^2: 180 / (0.8 * 1.016 * 1.054125 * 1.103 * 0.826446) = 230.466.
#[test]
fn verify_tg71_tables_for_a_rectangle() {
    let machine = tg71("tg71-pdd");
    let model = FieldModel {
        beam: &machine.beams[0],
        upper_jaws: machine.upper_jaws,
    };
    let form = Form::FixedSsd { ssd_cm: 100.0 };
    let field = tg71_field(model, [12.0, 20.0], 108.0, 8.0, form);
    assert_close(mu_for(180.0, &field), 230.466, 0.0005);
}

/// The same data set with its TPR table: isocentric 15 x 15, 12 cm deep, wedge factor 0.70, tray 0.97, 200 cGy.
/// By hand: Sc = (1.014 + 1.018)/2 = 1.016, Sp = (1.037 + 1.051)/2 = 1.044, TPR(12, 15) 0.936,
/// distance 100 = S_ref: 200 / (0.8 * 1.016 * 1.044 * 0.936 * 0.70 * 0.97) = 370.852.
#[test]
fn verify_tg71_tables_isocentric_with_wedge_and_tray_typed() {
    let machine = tg71("tg71-tpr");
    let model = FieldModel {
        beam: &machine.beams[0],
        upper_jaws: machine.upper_jaws,
    };
    let mut field = tg71_field(model, [15.0, 15.0], 100.0, 12.0, Form::Isocentric);
    field.typed = vec![
        (FactorName::Wedge, Typed::new(0.70)),
        (FactorName::Tray, Typed::new(0.97)),
    ];
    assert_close(mu_for(200.0, &field), 370.852, 0.0005);
}

/// A plan in the geometry of pydicom's example plan (`rtplan.dcm`): 20 x 20, SSD 89.843, a point
/// 2.73 cm off-axis and 9.70 cm deep below a flat surface, 116.0037 MU. With the TG-71 tables, by
/// hand: Sc(20) 1.024; s_d = 20 * 0.99543 = 19.9086, Sp = 1.051 + 0.025 * 3.9086/4 = 1.07543; TPR 1.0092;
/// OAR 1.0146; (100/99.543)^2 = 1.0092: 1.160037 * 0.8 * 1.024 * 1.07543 * 1.0092 * 1.0146 * 1.0092 = 1.056 Gy
/// within 0.003.
#[test]
fn verify_example_plan_off_axis() {
    let mut plan = plain_plan();
    let isocentre = Point::<Patient>::new(1.0, -2.0, 30.0);
    for point in &mut plan.beams[0].control_points {
        point.ssd_cm = Given::stated(89.843);
        point.jaws_x_cm = Given::stated([-10.0, 10.0]);
        point.jaws_y_cm = Given::stated([-10.0, 10.0]);
    }
    // Supine, gantry 0: 0.457 cm toward the source is 0.457 cm anterior.
    let off_axis_cm = 2.73 * 99.543 / 100.0;
    plan.fraction_groups[0].beams[0].specification_point = Given::stated(Point::new(
        isocentre.x_cm + off_axis_cm,
        isocentre.y_cm - 0.457,
        isocentre.z_cm,
    ));
    let result = calculate_with(&plan, &tg71("tg71-tpr"));
    let trace = result.trace.as_ref().unwrap();
    for (name, wanted, within) in [
        (FactorName::CollimatorScatter, 1.024, 5e-5),
        (FactorName::PhantomScatter, 1.075_43, 5e-6),
        (FactorName::TissuePhantomRatio, 1.0092, 2e-4),
        (FactorName::OffAxisRatio, 1.0146, 5e-5),
        (FactorName::InverseSquare, 1.0092, 5e-5),
    ] {
        assert_close(trace.factor(name).unwrap().value, wanted, within);
    }
    assert_close(result.point.unwrap().off_axis_cm.unwrap(), 2.73, 1e-9);
    assert_close(1.160_037 * trace.dose_per_mu_cgy, 1.056, 0.003);
}

#[test]
fn verify_a_missing_factor_is_named() {
    let field = typed_field(
        [10.0, 10.0],
        100.0,
        10.0,
        Form::Isocentric,
        four_mv(100.0),
        &[(Sc, 1.0), (Sp, 1.0)],
    );
    assert_eq!(
        dose_per_mu(&field).unwrap_err(),
        FactorError::MissingFactor {
            which: FactorName::TissuePhantomRatio
        }
    );
}

/// The trace multiplies to the dose and says where each factor came from.
#[test]
fn verify_trace_can_be_redone_by_hand() {
    let mut plan = plain_plan();
    plan.dose_references.push(DoseReference::default());
    let result = calculate_with(&plan, &tg71("tg71-tpr"));
    let trace = result.trace.unwrap();
    assert_eq!(trace.formula, "D'0 * Sc * Sp * TPR * OAR * ISF");
    let product: f64 = trace.factors.iter().map(|factor| factor.value).product();
    assert_close(trace.dose_per_mu_cgy, product, 1e-15);
    // 10 x 10, 10 cm deep, at the isocentre: the reference conditions, 0.8 cGy/MU by definition.
    assert_close(trace.dose_per_mu_cgy, 0.8, 1e-12);
    assert!(trace.factors.iter().all(|factor| !factor.source.is_empty()));
}
