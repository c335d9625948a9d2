//! One beam: what does not change from control point to control point.

use super::ControlPointDetail;
use super::control_point;
use super::lines::{Lines, as_is, in_unit};
use super::modifiers;
use super::units::energy_unit;
use crate::plan::{Beam, LimitingDevice};
use crate::report::plain_text::trimmed;

pub(super) fn beam(lines: &mut Lines, beam: &Beam, index: usize, detail: ControlPointDetail) {
    let number = beam
        .number
        .value()
        .map_or_else(|| "without number".to_owned(), ToString::to_string);
    let name = beam.name.value().map(String::as_str).unwrap_or_default();
    let title = format!("Beam {number} {name}");
    lines.heading(&format!("{}, item {}", title.trim_end(), index + 1));
    lines.given("beam number", &beam.number, as_is);
    lines.given("beam name", &beam.name, as_is);
    lines.optional("description", &beam.description, as_is);
    lines.given("beam type", &beam.beam_type, as_is);
    lines.given("radiation", &beam.radiation, |radiation| {
        radiation.term().to_owned()
    });
    lines.given("nominal energy", &beam.energy.nominal, |energy| {
        format!("{} {}", trimmed(*energy, 6), energy_unit(beam))
    });
    lines.optional("fluence mode", &beam.energy.fluence_mode, as_is);
    lines.optional("fluence mode ID", &beam.energy.fluence_mode_id, as_is);
    lines.given("treatment delivery type", &beam.delivery, |delivery| {
        delivery.term().to_owned()
    });
    lines.optional("high-dose technique", &beam.high_dose_technique, as_is);
    lines.given("machine", &beam.machine, as_is);
    lines.optional("machine manufacturer", &beam.machine_manufacturer, as_is);
    lines.optional("machine model", &beam.machine_model, as_is);
    lines.given("source-axis distance", &beam.sad_cm, in_unit("cm"));
    lines.given("dosimeter unit", &beam.dosimeter_unit, as_is);
    lines.given(
        "final cumulative weight",
        &beam.final_cumulative_weight,
        in_unit(""),
    );
    lines.optional("patient setup number", &beam.patient_setup_number, as_is);
    lines.optional(
        "tolerance table number",
        &beam.tolerance_table_number,
        as_is,
    );
    lines.absent_names();
    if beam.energy.changes {
        lines.plain("the energy changes between control points");
    }
    for device in &beam.devices {
        limiting_device(lines, device, "");
    }
    for device in &beam.unused_devices {
        limiting_device(lines, device, " (declared, never positioned)");
    }
    modifiers::modifiers(lines, beam);
    control_point::control_points(lines, beam, detail);
}

fn limiting_device(lines: &mut Lines, device: &LimitingDevice, remark: &str) {
    lines.plain(&format!("limiting device {}{remark}:", device.kind.term()));
    lines.optional("leaf or jaw pairs", &device.pairs, as_is);
    lines.optional(
        "distance from the source",
        &device.source_distance_cm,
        in_unit("cm"),
    );
    if device.kind.leaf_axis().is_some() {
        lines.given(
            "leaf boundaries",
            &device.boundaries_cm,
            |boundaries| match (boundaries.first(), boundaries.last()) {
                (Some(first), Some(last)) => format!(
                    "{} from {} to {} cm",
                    boundaries.len(),
                    trimmed(*first, 6),
                    trimmed(*last, 6)
                ),
                _ => "none".to_owned(),
            },
        );
    }
    lines.absent_names();
}
