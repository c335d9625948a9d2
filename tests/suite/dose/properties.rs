//! What must hold for any field, whatever the numbers.

use counterfoil::beam_model::{JawAxis, MachineModel, collimator_square};
use counterfoil::dose::{
    FactorName, FieldDepth, FieldInput, FieldModel, Form, RayPoint, Typed, dose_per_mu,
};
use counterfoil::quantity::{Given, Point, sterling_side_cm};
use proptest::prelude::*;

use super::{assert_close, calculate_with, plan_with_points, tg71};

fn field<'a>(
    machine: &'a MachineModel,
    side_cm: [f64; 2],
    spd_cm: f64,
    depth_cm: f64,
) -> FieldInput<'a> {
    FieldInput {
        model: Some(FieldModel {
            beam: &machine.beams[0],
            upper_jaws: machine.upper_jaws,
        }),
        jaws_x_cm: [-0.5 * side_cm[0], 0.5 * side_cm[0]],
        jaws_y_cm: [-0.5 * side_cm[1], 0.5 * side_cm[1]],
        ray: RayPoint::on_axis(spd_cm, 100.0),
        depth: FieldDepth {
            perpendicular_cm: Some(depth_cm),
            effective_cm: depth_cm,
            source: "typed".to_owned(),
        },
        form: Form::Isocentric,
        tray: None,
        wedge: None,
        couch: None,
        reference: None,
        typed: Vec::new(),
    }
}

fn cgy_per_mu(field: &FieldInput<'_>) -> f64 {
    dose_per_mu(field).unwrap().dose_per_mu_cgy
}

proptest! {
    /// In air (no phantom: scatter and attenuation typed as 1) the dose falls with the square of the distance.
    #[test]
    fn property_inverse_square_in_air(near_cm in 60.0..150.0_f64, far_cm in 60.0..150.0_f64) {
        let machine = tg71("tg71-tpr");
        let in_air = |spd_cm| {
            let mut field = field(&machine, [10.0, 10.0], spd_cm, 0.0);
            field.typed = [FactorName::PhantomScatter, FactorName::TissuePhantomRatio]
                .map(|name| (name, Typed::new(1.0)))
                .into();
            cgy_per_mu(&field)
        };
        let ratio = in_air(near_cm) / in_air(far_cm);
        prop_assert!((ratio / (far_cm / near_cm).powi(2) - 1.0).abs() < 1e-12);
    }

    /// Field and point mirrored together give the same dose.
    #[test]
    fn property_mirror_symmetry(
        jaws in prop::array::uniform4(3.0..15.0_f64),
        at in prop::array::uniform2(-2.0..2.0_f64),
        depth_cm in 2.0..14.0_f64,
    ) {
        let machine = tg71("tg71-tpr");
        let mut one = field(&machine, [10.0, 10.0], 100.0, depth_cm);
        one.jaws_x_cm = [-jaws[0], jaws[1]];
        one.jaws_y_cm = [-jaws[2], jaws[3]];
        one.ray.projected_cm = at;
        one.depth.effective_cm = depth_cm / one.ray.cosine();
        let mut other = one.clone();
        other.jaws_x_cm = [-jaws[1], jaws[0]];
        other.ray.projected_cm = [-at[0], at[1]];
        prop_assert!((cgy_per_mu(&one) / cgy_per_mu(&other) - 1.0).abs() < 1e-12);
    }

    /// Depth dose and tissue-phantom ratio are two ways to one dose: with either table, on and off the
    /// axis, with a radiological depth that differs, at any SSD.
    #[test]
    fn property_both_forms_agree(
        pdd_table in any::<bool>(),
        side in prop::array::uniform2(6.0..20.0_f64),
        ssd_cm in 85.0..120.0_f64,
        depth_cm in 2.0..14.0_f64,
        effective in 0.85..1.05_f64,
        at in prop::array::uniform2(-4.0..4.0_f64),
    ) {
        let machine = tg71(if pdd_table { "tg71-pdd" } else { "tg71-tpr" });
        let mut isocentric = field(&machine, side, ssd_cm + depth_cm, depth_cm);
        isocentric.ray.projected_cm = at;
        isocentric.depth.effective_cm = (depth_cm / isocentric.ray.cosine() * effective).max(1.5);
        let mut fixed = isocentric.clone();
        fixed.form = Form::FixedSsd { ssd_cm };
        let ratio = cgy_per_mu(&fixed) / cgy_per_mu(&isocentric);
        prop_assert!((ratio - 1.0).abs() < 1e-9, "ratio {ratio}");
    }

    /// Deeper is less, beyond the dose maximum.
    #[test]
    fn property_dose_falls_with_depth(side_cm in 5.0..20.0_f64, depth_cm in 2.0..22.0_f64) {
        let machine = tg71("tg71-tpr");
        let dose = |depth_cm| cgy_per_mu(&field(&machine, [side_cm, side_cm], 100.0, depth_cm));
        prop_assert!(dose(depth_cm + 1.0) < dose(depth_cm));
    }

    /// A larger field gives more dose.
    #[test]
    fn property_dose_rises_with_the_side(side_cm in 5.0..25.0_f64, depth_cm in 10.0..22.0_f64) {
        let machine = tg71("tg71-tpr");
        let dose = |side_cm| cgy_per_mu(&field(&machine, [side_cm, side_cm], 100.0, depth_cm));
        prop_assert!(dose(side_cm + 1.0) > dose(side_cm));
    }

    /// The collimator turned by a quarter and the jaws with it: the same opening in the patient. At 90 degrees
    /// x_b lies where y_b was and y_b where -x_b was, so the new X jaws are the old Y jaws and the new Y
    /// jaws the old X jaws with their sign changed. With an exchange coefficient of 1 the dose is the same.
    #[test]
    fn property_quarter_turn_of_collimator(
        jaws in prop::array::uniform4(4.0..14.0_f64),
        at in prop::array::uniform2(-2.5..2.5_f64),
    ) {
        let machine = tg71("tg71-tpr");
        let mut plan = plan_with_points(|point| {
            point.jaws_x_cm = Given::stated([-jaws[0], jaws[1]]);
            point.jaws_y_cm = Given::stated([-jaws[2], jaws[3]]);
        });
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(1.0 + at[0], -2.0, 30.0 + at[1]));
        let straight = calculate_with(&plan, &machine);
        for point in &mut plan.beams[0].control_points {
            point.collimator_deg = Given::stated(90.0);
            point.jaws_x_cm = Given::stated([-jaws[2], jaws[3]]);
            point.jaws_y_cm = Given::stated([-jaws[1], jaws[0]]);
        }
        let turned = calculate_with(&plan, &machine);
        prop_assert_eq!(&straight.obstacles, &vec![]);
        prop_assert_eq!(&turned.obstacles, &vec![]);
        let ratio = straight.trace.unwrap().dose_per_mu_cgy / turned.trace.unwrap().dose_per_mu_cgy;
        prop_assert!((ratio - 1.0).abs() < 1e-12);
    }

    /// Couch and patient turned together about the vertical, beam from above with the collimator turned along: nothing changes.
    #[test]
    fn property_couch_turn_undone_by_collimator(turn_deg in 0.0..360.0_f64, at in prop::array::uniform2(-2.5..2.5_f64)) {
        let machine = tg71("tg71-tpr");
        let mut plan = plan_with_points(|point| point.jaws_y_cm = Given::stated([-8.0, 9.0]));
        plan.fraction_groups[0].beams[0].specification_point =
            Given::stated(Point::new(1.0 + at[0], -2.5, 30.0 + at[1]));
        let straight = calculate_with(&plan, &machine);
        for point in &mut plan.beams[0].control_points {
            point.couch_deg = Given::stated(turn_deg);
            point.collimator_deg = Given::stated(turn_deg);
        }
        let turned = calculate_with(&plan, &machine);
        let (one, other) = (straight.point.unwrap(), turned.point.unwrap());
        for (a, b) in one.projected_cm.unwrap().into_iter().zip(other.projected_cm.unwrap()) {
            prop_assert!((a - b).abs() < 1e-9);
        }
    }
}

/// The data set gives both a depth-dose and a TPR table: isocentric doses from the two, side 5 to 24 at the isocentre,
/// 2 to 20 cm deep. The set's own rounding (three figures) leaves a 95th percentile of 0.22 % when the tables are
/// converted cell by cell; here 0.3 % is asserted for it.
#[test]
fn validate_the_two_published_tables_give_one_dose() {
    let (by_tpr, by_pdd) = (tg71("tg71-tpr"), tg71("tg71-pdd"));
    let mut deviations: Vec<f64> = Vec::new();
    for side_cm in 5..=24 {
        for depth_cm in 2..=20 {
            let side = [f64::from(side_cm); 2];
            let dose = |machine| cgy_per_mu(&field(machine, side, 100.0, f64::from(depth_cm)));
            deviations.push(100.0 * (dose(&by_pdd) / dose(&by_tpr) - 1.0).abs());
        }
    }
    deviations.sort_by(f64::total_cmp);
    let at = |share: f64| deviations[((deviations.len() - 1) as f64 * share).round() as usize];
    let (median, p95, p99, maximum) = (at(0.5), at(0.95), at(0.99), at(1.0));
    println!(
        "PDD against TPR table, per cent: median {median:.3}, 95th {p95:.3}, 99th {p99:.3}, maximum {maximum:.3}"
    );
    assert!(median < 0.15 && p95 < 0.3 && p99 < 0.5 && maximum < 0.8);
}

/// Equivalent squares computed by hand from (1+k)XY/(kX+Y), Y the upper pair (Vadash & Bjarngard 1993):
/// k 1.8: 2.8*100/(9+20) = 9.655, 2.8*100/(36+5) = 6.829, 2.8*300/(18+30) = 17.500, 2.8*300/(54+10) = 13.125;
/// k 1: 8, 8, 15, 15, which is 2ab/(a+b).
#[test]
fn verify_equivalent_squares() {
    for (x_cm, y_cm, exchanged_cm, plain_cm) in [
        (5.0, 20.0, 9.655, 8.0),
        (20.0, 5.0, 6.829, 8.0),
        (10.0, 30.0, 17.500, 15.0),
        (30.0, 10.0, 13.125, 15.0),
    ] {
        let side = |upper, k| collimator_square(x_cm, y_cm, upper, k).side_cm();
        assert_close(side(JawAxis::Y, 1.8), exchanged_cm, 5e-4);
        assert_close(side(JawAxis::Y, 1.0), plain_cm, 1e-12);
        assert_close(sterling_side_cm(x_cm, y_cm), plain_cm, 1e-12);
        // The other pair being the upper one is the field with its sides exchanged.
        let exchanged = collimator_square(y_cm, x_cm, JawAxis::X, 1.8).side_cm();
        assert_close(exchanged, side(JawAxis::Y, 1.8), 1e-12);
    }
}

/// Turning the collimator and the field changes the dose by the collimator factor alone when the jaw pairs differ:
/// 6 x 20 and 20 x 6 with k 1.8: c = 2.8*120/(10.8+20) = 10.909 and 2.8*120/(36+6) = 8.000;
/// Sc 1 + 0.008 * 0.909/2 = 1.003636 and 0.990: ratio 1.013774.
#[test]
fn verify_exchange_of_the_jaws_is_visible() {
    let mut machine = tg71("tg71-tpr");
    machine.beams[0].exchange_k = 1.8;
    let tall = cgy_per_mu(&field(&machine, [6.0, 20.0], 100.0, 10.0));
    let wide = cgy_per_mu(&field(&machine, [20.0, 6.0], 100.0, 10.0));
    let tall_c_cm = 336.0 / 30.8;
    assert_close(
        tall / wide,
        (1.0 + 0.008 * (tall_c_cm - 10.0) / 2.0) / 0.990,
        1e-12,
    );
}
