//! Control points: the first, or all. Every value says whether this control
//! point stated it or an earlier one did.

use super::ControlPointDetail;
use super::lines::{Lines, as_is, in_unit, sides, yes_no};
use super::plan::{point, point_depth};
use super::units::energy_unit;
use crate::plan::{Beam, ControlPoint, LeafAxis, LeafPositions};
use crate::quantity::Given;
use crate::report::plain_text::rounded;

pub(super) fn control_points(lines: &mut Lines, beam: &Beam, detail: ControlPointDetail) {
    let total = beam.control_points.len();
    let shown = match detail {
        ControlPointDetail::First => 1,
        ControlPointDetail::All => total,
    };
    if total == 0 {
        lines.subheading("No control point");
    }
    for (position, control_point) in beam.control_points.iter().take(shown).enumerate() {
        lines.subheading(&format!(
            "Control point {position} of {total} (item order, from 0)"
        ));
        one(lines, beam, control_point);
    }
    if total > shown {
        lines.plain(&match total - shown {
            1 => "1 further control point is not shown: --control-points".to_owned(),
            left => format!("{left} further control points are not shown: --control-points"),
        });
    }
}

fn one(lines: &mut Lines, beam: &Beam, control_point: &ControlPoint) {
    let at = control_point;
    lines.given("index", &at.index, as_is);
    lines.given(
        "cumulative meterset weight",
        &at.cumulative_weight,
        in_unit(""),
    );
    lines.given("jaws x", &at.jaws_x_cm, sides);
    lines.given("jaws y", &at.jaws_y_cm, sides);
    lines.given("gantry", &at.gantry_deg, in_unit("deg"));
    lines.given("collimator", &at.collimator_deg, in_unit("deg"));
    lines.given("couch", &at.couch_deg, in_unit("deg"));
    lines.given("SSD", &at.ssd_cm, in_unit("cm"));
    lines.given("isocentre", &at.isocentre, point);
    lines.given("nominal energy", &at.energy, in_unit(energy_unit(beam)));
    lines.optional("surface entry point", &at.surface_entry, point);
    lines.optional(
        "source to external contour",
        &at.source_to_external_contour_cm,
        in_unit("cm"),
    );
    lines.optional("dose rate", &at.dose_rate_mu_per_min, in_unit("MU/min"));
    lines.optional("gantry direction", &at.gantry_direction, as_is);
    lines.optional("collimator direction", &at.collimator_direction, as_is);
    lines.optional("couch direction", &at.couch_direction, as_is);
    lines.optional("gantry pitch", &at.gantry_pitch_deg, in_unit("deg"));
    lines.optional(
        "couch top eccentric angle",
        &at.eccentric_deg,
        in_unit("deg"),
    );
    lines.optional(
        "couch top eccentric distance",
        &at.eccentric_axis_distance_cm,
        in_unit("cm"),
    );
    lines.optional("couch top pitch", &at.couch_pitch_deg, in_unit("deg"));
    lines.optional("couch top roll", &at.couch_roll_deg, in_unit("deg"));
    lines.optional("couch top vertical", &at.couch_vertical_cm, in_unit("cm"));
    lines.optional(
        "couch top longitudinal",
        &at.couch_longitudinal_cm,
        in_unit("cm"),
    );
    lines.optional("couch top lateral", &at.couch_lateral_cm, in_unit("cm"));
    lines.absent_names();
    for wedge in &at.wedges {
        let number = wedge
            .wedge_number
            .value()
            .map_or_else(|| "of unknown number".to_owned(), ToString::to_string);
        lines.given(
            &format!("wedge {number} in the beam"),
            &wedge.in_beam,
            yes_no,
        );
    }
    for leaves in &at.leaves {
        leaf_positions(lines, beam, leaves);
    }
    for dose in &at.referenced_doses {
        lines.given("dose reference number", &dose.number, as_is);
        lines.given(
            "cumulative dose coefficient",
            &dose.cumulative_coefficient,
            in_unit(""),
        );
        if let Some(depth) = &dose.point_depth {
            point_depth(lines, depth);
        }
    }
}

fn leaf_positions(lines: &mut Lines, beam: &Beam, leaves: &LeafPositions) {
    let name = format!("leaves {}", leaves.kind.term());
    lines.given(&name, &leaves.positions_cm, |positions| {
        format!("{} positions", positions.len())
    });
    // An inherited set was printed where it was stated, or the first control point has it.
    let (Given::Stated { value: positions }
    | Given::Derived {
        value: positions, ..
    }) = &leaves.positions_cm
    else {
        return;
    };
    let boundaries = beam
        .devices
        .iter()
        .find(|device| device.kind == leaves.kind)
        .and_then(|device| device.boundaries_cm.value());
    let (along, across) = match leaves.kind.leaf_axis() {
        Some(LeafAxis::Y) => ("y", "x"),
        _ => ("x", "y"),
    };
    let pairs = positions.len() / 2;
    let (lower, upper) = positions.split_at(pairs);
    for (pair, (from, to)) in lower.iter().zip(upper).enumerate() {
        let edge = |place: usize| boundaries.and_then(|list| list.get(place)).copied();
        let place = match (edge(pair), edge(pair + 1)) {
            (Some(low), Some(high)) => {
                format!("{across} {:>7} to {:>7}", rounded(low, 2), rounded(high, 2))
            }
            _ => format!("{across} unknown"),
        };
        lines.plain(&format!(
            "    pair {:>3}   {place}   {along} {:>8} to {:>8} cm",
            pair + 1,
            rounded(*from, 3),
            rounded(*to, 3)
        ));
    }
}
