//! What stands in the beam: wedges, blocks, compensators, applicators,
//! accessories, bolus.

use super::lines::{Lines, as_is, in_unit, yes_no};
use crate::plan::{Beam, Block, BlockType, Wedge, WedgeKind};
use crate::report::plain_text::trimmed;

pub(super) fn modifiers(lines: &mut Lines, beam: &Beam) {
    for wedge in &beam.wedges {
        lines.subheading("Wedge");
        wedge_lines(lines, wedge);
    }
    for block in &beam.blocks {
        lines.subheading("Block");
        block_lines(lines, block);
    }
    if !beam.total_block_tray_factor.is_absent() {
        lines.given(
            "total block tray factor",
            &beam.total_block_tray_factor,
            in_unit(""),
        );
    }
    for compensator in &beam.compensators {
        lines.subheading("Compensator");
        lines.given("number", &compensator.number, as_is);
        lines.given("ID", &compensator.id, as_is);
        lines.optional("type", &compensator.kind, as_is);
        lines.optional("material", &compensator.material, as_is);
        lines.optional("tray ID", &compensator.tray_id, as_is);
        lines.plain(&format!(
            "transmission data: {}; thickness data: {}",
            yes_no(&compensator.has_transmission),
            yes_no(&compensator.has_thickness)
        ));
    }
    for applicator in &beam.applicators {
        lines.subheading("Applicator");
        lines.given("ID", &applicator.id, as_is);
        lines.given("type", &applicator.kind, as_is);
        lines.optional("description", &applicator.description, as_is);
        lines.optional("accessory code", &applicator.accessory_code, as_is);
        lines.optional(
            "distance from the source",
            &applicator.source_to_mounting_cm,
            in_unit("cm"),
        );
    }
    for accessory in &beam.accessories {
        lines.subheading("Accessory");
        lines.given("number", &accessory.number, as_is);
        lines.given("ID", &accessory.id, as_is);
        lines.optional("type", &accessory.kind, as_is);
        lines.optional("description", &accessory.description, as_is);
        lines.optional("accessory code", &accessory.accessory_code, as_is);
    }
    for bolus in &beam.boluses {
        lines.subheading("Bolus");
        lines.given("ROI number", &bolus.roi_number, as_is);
        lines.given("ID", &bolus.id, as_is);
        lines.optional("description", &bolus.description, as_is);
        lines.optional("accessory code", &bolus.accessory_code, as_is);
    }
    lines.absent_names();
}

fn wedge_lines(lines: &mut Lines, wedge: &Wedge) {
    lines.given("number", &wedge.number, as_is);
    lines.given("type", &wedge.kind, |kind| {
        match kind {
            WedgeKind::Standard => "STANDARD",
            WedgeKind::Dynamic => "DYNAMIC",
            WedgeKind::Motorized => "MOTORIZED",
            WedgeKind::PartialStandard => "PARTIAL_STANDARD",
            WedgeKind::PartialMotorized => "PARTIAL_MOTORIZED",
            WedgeKind::Other(text) => text,
        }
        .to_owned()
    });
    lines.given("ID", &wedge.id, as_is);
    lines.given("angle", &wedge.angle_deg, in_unit("deg"));
    lines.given("orientation", &wedge.orientation_deg, in_unit("deg"));
    lines.optional("factor (planning system)", &wedge.factor, in_unit(""));
    lines.optional(
        "distance from the source",
        &wedge.source_to_tray_cm,
        in_unit("cm"),
    );
    lines.optional("accessory code", &wedge.accessory_code, as_is);
}

fn block_lines(lines: &mut Lines, block: &Block) {
    lines.given("number", &block.number, as_is);
    lines.optional("name", &block.name, as_is);
    lines.given("type", &block.block_type, |kind| {
        match kind {
            BlockType::Shielding => "SHIELDING",
            BlockType::Aperture => "APERTURE",
            BlockType::Other(text) => text,
        }
        .to_owned()
    });
    lines.given("transmission", &block.transmission, in_unit(""));
    lines.given("thickness", &block.thickness_cm, in_unit("cm"));
    lines.optional("material", &block.material, as_is);
    lines.optional("divergent", &block.divergent, yes_no);
    lines.optional("mounting", &block.mounting, as_is);
    lines.given("tray ID", &block.tray_id, as_is);
    lines.optional("accessory code", &block.accessory_code, as_is);
    lines.given(
        "tray distance from the source",
        &block.source_to_tray_cm,
        in_unit("cm"),
    );
    lines.given("outline", &block.outline_cm, |outline| {
        format!("{} points, cm at the isocentre plane:", outline.len())
    });
    let points = block.outline_cm.value().map(AsRef::as_ref);
    for row in points.unwrap_or(&[]).chunks(6) {
        let row: Vec<String> = row
            .iter()
            .map(|[x, y]| format!("({}, {})", trimmed(*x, 4), trimmed(*y, 4)))
            .collect();
        lines.plain(&format!("    {}", row.join(" ")));
    }
}
