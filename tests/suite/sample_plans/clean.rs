//! Plans that are in order: setups, doses, devices and ways of stating things.

use super::course::{Course, ISOCENTRE_CM, PointStated, beam, beside_isocentre};
use super::sample::Sample;
use super::shapes::rowan_leaves;
use crate::builder::{AccessorySpec, BeamSpec, DepthSpec, Encoding};

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    vec![
        four_field_box(),
        fixed_ssd(),
        extended_ssd(),
        two_energies(),
        two_fraction_groups(),
        setup_fields(),
        without_filter(),
        point_depths(),
        through_couch(),
        low_weight(),
        tray(),
        parked_leaves(),
    ]
}

fn four_field_box() -> Sample {
    let field = |number, name, gantry_deg, x_cm, ssd_cm| {
        beam(number, name, "ROWAN-1", 18.0)
            .with_field(x_cm, 15.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(1, "Ash", "BOX", "Four-field box")
        .fractions(25)
        .treat(field(1, "Anterior", 0.0, 14.0, 88.5), 0.55, 0.6)
        .treat(field(2, "Left", 90.0, 12.0, 81.5), 0.45, -0.9)
        .treat(field(3, "Posterior", 180.0, 14.0, 87.6), 0.55, 1.1)
        .treat(field(4, "Right", 270.0, 12.0, 82.0), 0.45, -0.4)
        .sound(
            "four-field-box.dcm",
            "isocentric four-field box, 18 MV, point at the isocentre",
        )
}

fn fixed_ssd() -> Sample {
    // 20 cm between the surfaces, the point half-way, each beam's isocentre on the skin.
    let point_cm = [0.5, -2.0, 30.0];
    let field = |number, name, gantry_deg, skin_cm| {
        beam(number, name, "SORREL", 6.0)
            .with_field(12.0, 16.0)
            .with_gantry(gantry_deg)
            .with_isocentre([0.5, skin_cm, 30.0])
            .with_ssd(100.0)
    };
    Course::new(2, "Beech", "APPA", "Opposed fields at SSD 100")
        .fixed_ssd()
        .point(point_cm, PointStated::AtBeam)
        .fractions(10)
        .treat(field(1, "Anterior", 0.0, -12.0), 1.55, -0.7)
        .treat(field(2, "Posterior", 180.0, 8.0), 1.45, 0.9)
        .sound(
            "fixed-ssd.dcm",
            "fixed SSD of 100 cm on a machine with PDD tables",
        )
        .with_encoding(Encoding::ImplicitLittle)
}

fn extended_ssd() -> Sample {
    // Skin 20 cm beyond the isocentre, the point 8 cm below it.
    let point_cm = [0.0, 12.0, -5.0];
    let field = beam(1, "Anterior", "SORREL", 6.0)
        .with_field(18.0, 25.0)
        .with_isocentre([0.0, -16.0, -5.0])
        .with_ssd(120.0);
    Course::new(3, "Cedar", "SSD120", "Large field at SSD 120")
        .fixed_ssd()
        .point(point_cm, PointStated::AtBeam)
        .fractions(5)
        .treat(field, 4.0, 1.2)
        .sound(
            "extended-ssd.dcm",
            "extended SSD of 120 cm, one large field",
        )
}

fn two_energies() -> Sample {
    let field = |number, name, energy_mv, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-2", energy_mv)
            .with_field(9.5, 12.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(4, "Dogwood", "THREE", "Three fields, two energies")
        .fractions(28)
        .treat(field(1, "Anterior", 6.0, 0.0, 92.3), 0.8, -1.3)
        .treat(field(2, "Left", 18.0, 90.0, 83.9), 0.5, 0.3)
        .treat(field(3, "Right", 18.0, 270.0, 84.4), 0.5, 0.8)
        .sound("two-energies.dcm", "6 MV and 18 MV in one plan")
}

fn two_fraction_groups() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-1", 18.0)
            .with_field(12.0, 14.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(5, "Elder", "PHASES", "Two phases")
        .fractions(20)
        .treat(field(1, "Anterior", 0.0, 90.1), 1.05, 0.5)
        .treat(field(2, "Posterior", 180.0, 88.8), 0.95, -0.6)
        .fractions(5)
        .again(1, 0.7, 0.5)
        .treat(field(3, "Left", 90.0, 83.0), 0.65, 1.0)
        .treat(field(4, "Right", 270.0, 83.5), 0.65, -1.1)
        .sound(
            "two-fraction-groups.dcm",
            "two fraction groups; beam 1 is in both, with different MU",
        )
}

fn setup_fields() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-2", 6.0)
            .with_field(16.0, 18.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    let imaging = |number, name, gantry_deg| {
        let mut field: BeamSpec = beam(number, name, "ROWAN-2", 6.0)
            .with_field(20.0, 20.0)
            .with_gantry(gantry_deg)
            .map_first(|point| {
                // Kilovolts, as some systems write them, and nothing that only a treatment beam has.
                point.energy = Some(0.1);
                point.dose_rate_mu_per_min = None;
                point.ssd_cm = None;
            });
        field.delivery = Some("SETUP".to_owned());
        field.fluence = None;
        field
    };
    Course::new(6, "Fir", "APPA", "Opposed fields with imaging")
        .fractions(15)
        .treat(field(1, "Anterior", 0.0, 90.5), 1.4, 0.2)
        .treat(field(2, "Posterior", 180.0, 89.0), 1.26, -0.8)
        .map(|plan| {
            plan.beams.push(imaging(3, "kV anterior", 0.0));
            plan.beams.push(imaging(4, "kV left", 90.0));
        })
        .sound(
            "setup-fields.dcm",
            "two kV imaging fields (Treatment Delivery Type SETUP, no meterset) beside the treatment beams",
        )
}

fn without_filter() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "SORREL", 6.0)
            .with_field(5.5, 6.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
            .with_fluence_mode("NON_STANDARD", Some("FFF"))
            .map_first(|point| point.dose_rate_mu_per_min = Some(1400.0))
    };
    Course::new(7, "Ginkgo", "FFF", "Three fields without flattening filter")
        .point(ISOCENTRE_CM, PointStated::ByReference)
        .fractions(3)
        .treat(field(1, "Right oblique", 300.0, 90.4), 2.7, -0.5)
        .treat(field(2, "Anterior", 0.0, 93.2), 2.6, 1.4)
        .treat(field(3, "Left oblique", 60.0, 91.0), 2.7, 0.1)
        .sound(
            "flattening-filter-free.dcm",
            "6 MV without flattening filter (Fluence Mode ID FFF); the point is named by Referenced Dose Reference UID",
        )
}

fn point_depths() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-2", 6.0)
            .with_field(9.0, 10.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    let depths = |depth_cm, equivalent_cm| DepthSpec {
        depth_cm: Some(depth_cm),
        equivalent_depth_cm: Some(equivalent_cm),
        ssd_cm: Some(100.0 - depth_cm),
        ..DepthSpec::default()
    };
    Course::new(8, "Hazel", "LUNG", "Two fields through lung")
        .fractions(20)
        .treat(field(1, "Anterior", 0.0, 88.0), 1.5, 0.7)
        .treat(field(2, "Left", 90.0, 85.5), 1.25, -1.0)
        .map(|plan| {
            plan.groups[0].beams[0].depths = Some(depths(12.0, 8.6));
            plan.groups[0].beams[1].depths = Some(depths(14.5, 10.2));
        })
        .sound(
            "point-depths.dcm",
            "depth, equivalent depth and SSD of the point stated at the beam references; lung makes the equivalent depths smaller",
        )
}

fn through_couch() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-1", 6.0)
            .with_field(10.0, 11.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(9, "Ivy", "POBL", "Posterior obliques")
        .fractions(30)
        .treat(field(1, "Anterior", 0.0, 89.7), 0.8, -0.3)
        .treat(field(2, "Left posterior", 130.0, 86.4), 0.6, 0.6)
        .treat(field(3, "Right posterior", 230.0, 86.9), 0.6, -1.4)
        .sound(
            "through-couch.dcm",
            "two oblique beams through the couch; written big endian",
        )
        .with_encoding(Encoding::ExplicitBig)
}

fn low_weight() -> Sample {
    let field = |number, name, gantry_deg, x_cm, ssd_cm| {
        beam(number, name, "ROWAN-1", 18.0)
            .with_field(x_cm, 16.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(10, "Juniper", "TOPUP", "Opposed fields and a top-up")
        .fractions(25)
        .treat(field(1, "Anterior", 0.0, 15.0, 88.2), 0.97, 0.4)
        .treat(field(2, "Posterior", 180.0, 15.0, 87.3), 0.97, -0.5)
        .treat(field(3, "Left top-up", 90.0, 8.0, 80.6), 0.06, -4.5)
        .sound(
            "low-weight-beam.dcm",
            "a beam that adds 3 % of the dose, judged by its share of the total (its own shift is larger on purpose)",
        )
}

fn tray() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        let mut field = beam(number, name, "ROWAN-2", 6.0)
            .with_field(13.0, 17.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm);
        field.accessories = vec![AccessorySpec {
            number: 1,
            id: "TRAY-1".to_owned(),
            kind: Some("TRAY".to_owned()),
        }];
        field
    };
    Course::new(11, "Larch", "TRAY", "Opposed fields with a tray")
        .fractions(12)
        .treat(field(1, "Anterior", 0.0, 91.2), 1.6, 1.3)
        .treat(field(2, "Posterior", 180.0, 89.9), 1.4, -0.2)
        .sound("tray.dcm", "an empty block tray in each beam")
        .with_encoding(Encoding::ImplicitLittle)
}

fn parked_leaves() -> Sample {
    let positions: Vec<f64> = [-12.0; 60].into_iter().chain([12.0; 60]).collect();
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-1", 6.0)
            .with_jaws([-6.0, 6.5], [-7.0, 5.0])
            .with_leaves(rowan_leaves(), positions.clone())
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(12, "Maple", "PARKED", "Leaves parked")
        .point(beside_isocentre([0.5, 0.0, -1.0]), PointStated::AtBeam)
        .fractions(16)
        .treat(field(1, "Anterior", 0.0, 91.8), 1.4, -1.2)
        .treat(field(2, "Left", 90.0, 84.7), 1.26, 0.9)
        .sound(
            "parked-leaves.dcm",
            "leaves parked outside the jaws: the jaws alone shape the field",
        )
}
