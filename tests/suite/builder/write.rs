//! From the specification of a plan to a DICOM object that conforms to the RT
//! Plan IOD wherever the specification does.

use dicom_core::Tag;
use dicom_dictionary_std::{tags, uids};
use dicom_object::InMemDicomObject;

use super::element::Item;
use super::encode::{Encoding, encode};
use super::spec::{
    BeamSpec, BlockSpec, CompensatorSpec, DepthSpec, DeviceSpec, DoseReferenceSpec, GroupSpec,
    PlanSpec, PointSpec, ReferenceSpec, SetupSpec, WedgeSpec,
};

/// Attributes that the standard has retired and that plans still carry.
const BEAM_DOSE_SPECIFICATION_POINT: Tag = Tag(0x300A, 0x0082);
const AVERAGE_BEAM_DOSE_POINT_DEPTH: Tag = Tag(0x300A, 0x008D);
const AVERAGE_BEAM_DOSE_POINT_EQUIVALENT_DEPTH: Tag = Tag(0x300A, 0x008E);
const AVERAGE_BEAM_DOSE_POINT_SSD: Tag = Tag(0x300A, 0x008F);

impl PlanSpec {
    /// The bytes of the plan as an explicit little endian file.
    pub(crate) fn bytes(&self) -> Vec<u8> {
        self.encoded(Encoding::ExplicitLittle)
    }

    /// The bytes of the plan, written this way.
    pub(crate) fn encoded(&self, encoding: Encoding) -> Vec<u8> {
        encode(&self.object(), encoding)
    }

    /// SOP Instance UID.
    pub(crate) fn sop_instance_uid(&self) -> String {
        self.uid("1")
    }

    fn uid(&self, end: &str) -> String {
        format!("{}.{end}", self.uid_root)
    }

    /// The DICOM object.
    pub(crate) fn object(&self) -> InMemDicomObject {
        let mut plan = Item::new();
        self.put_identity(&mut plan);
        plan.sequence(
            tags::DOSE_REFERENCE_SEQUENCE,
            self.dose_references
                .iter()
                .map(|dose| self.dose_reference(dose)),
        )
        .sequence(
            tags::FRACTION_GROUP_SEQUENCE,
            self.groups.iter().map(|group| self.group(group)),
        )
        .sequence(tags::BEAM_SEQUENCE, self.beams.iter().map(beam))
        .sequence(tags::PATIENT_SETUP_SEQUENCE, self.setups.iter().map(setup));
        plan.finish()
    }

    fn put_identity(&self, plan: &mut Item) {
        plan.text(tags::SPECIFIC_CHARACTER_SET, &self.character_set)
            .text(tags::INSTANCE_CREATION_DATE, &self.date)
            .text(tags::INSTANCE_CREATION_TIME, &self.time)
            .text(tags::SOP_CLASS_UID, uids::RT_PLAN_STORAGE)
            .text(tags::SOP_INSTANCE_UID, &self.sop_instance_uid())
            .text(tags::STUDY_DATE, &self.date)
            .text(tags::STUDY_TIME, &self.time)
            .text(tags::ACCESSION_NUMBER, "")
            .text(tags::MODALITY, "RTPLAN")
            .text(tags::MANUFACTURER, &self.manufacturer)
            .text(tags::REFERRING_PHYSICIAN_NAME, "")
            .text(tags::MANUFACTURER_MODEL_NAME, &self.model_name)
            .text(tags::OPERATORS_NAME, "")
            .text(tags::PATIENT_NAME, &self.patient_name)
            .text(tags::PATIENT_ID, &self.patient_id)
            .text(tags::PATIENT_BIRTH_DATE, "")
            .text(tags::PATIENT_SEX, "")
            .text(tags::SOFTWARE_VERSIONS, "1.0")
            .text(tags::STUDY_INSTANCE_UID, &self.uid("2"))
            .text(tags::SERIES_INSTANCE_UID, &self.uid("3"))
            .text(tags::STUDY_ID, "")
            .text(tags::SERIES_NUMBER, "")
            .text(tags::FRAME_OF_REFERENCE_UID, &self.uid("4"))
            .text(tags::POSITION_REFERENCE_INDICATOR, "")
            .text(tags::RT_PLAN_LABEL, &self.label)
            .text_if(tags::RT_PLAN_NAME, self.name.as_deref())
            .text(tags::RT_PLAN_DATE, &self.date)
            .text(tags::RT_PLAN_TIME, &self.time)
            .text_if(tags::PLAN_INTENT, self.intent.as_deref())
            .text_if(tags::APPROVAL_STATUS, self.approval.as_deref());
        if self.approval.as_deref() == Some("APPROVED") {
            plan.text(tags::REVIEW_DATE, &self.date)
                .text(tags::REVIEW_TIME, &self.time)
                .text(tags::REVIEWER_NAME, &self.reviewer);
        }
        let geometry = if self.structure_set {
            let mut reference = Item::new();
            reference
                .text(
                    tags::REFERENCED_SOP_CLASS_UID,
                    uids::RT_STRUCTURE_SET_STORAGE,
                )
                .text(tags::REFERENCED_SOP_INSTANCE_UID, &self.uid("5"));
            plan.sequence(tags::REFERENCED_STRUCTURE_SET_SEQUENCE, [reference]);
            "PATIENT"
        } else {
            "TREATMENT_DEVICE"
        };
        plan.text(tags::RT_PLAN_GEOMETRY, geometry);
    }

    fn dose_reference_uid(&self, number: i32) -> String {
        self.uid(&format!("6.{number}"))
    }

    fn dose_reference(&self, dose: &DoseReferenceSpec) -> Item {
        let mut item = Item::new();
        item.whole(tags::DOSE_REFERENCE_NUMBER, dose.number)
            .text(
                tags::DOSE_REFERENCE_UID,
                &self.dose_reference_uid(dose.number),
            )
            .text(tags::DOSE_REFERENCE_STRUCTURE_TYPE, &dose.structure_type)
            .text(tags::DOSE_REFERENCE_DESCRIPTION, &dose.description)
            .text(tags::DOSE_REFERENCE_TYPE, &dose.reference_type)
            .number_if(tags::TARGET_PRESCRIPTION_DOSE, dose.prescription_gy);
        if let Some(point_cm) = dose.point_cm {
            item.cm(tags::DOSE_REFERENCE_POINT_COORDINATES, &point_cm);
        }
        item
    }

    fn group(&self, group: &GroupSpec) -> Item {
        let mut item = Item::new();
        item.whole(tags::FRACTION_GROUP_NUMBER, group.number)
            .text_or_empty(
                tags::NUMBER_OF_FRACTIONS_PLANNED,
                group.fractions.map(|number| number.to_string()).as_deref(),
            )
            .text(tags::NUMBER_OF_BEAMS, &group.beams.len().to_string())
            .whole(tags::NUMBER_OF_BRACHY_APPLICATION_SETUPS, 0)
            .sequence(
                tags::REFERENCED_BEAM_SEQUENCE,
                group.beams.iter().map(|beam| self.reference(beam)),
            )
            .sequence(
                tags::REFERENCED_DOSE_REFERENCE_SEQUENCE,
                group.dose_references.iter().map(|&number| {
                    let mut item = Item::new();
                    item.whole(tags::REFERENCED_DOSE_REFERENCE_NUMBER, number);
                    item
                }),
            );
        item
    }

    fn reference(&self, reference: &ReferenceSpec) -> Item {
        let mut item = Item::new();
        item.whole(tags::REFERENCED_BEAM_NUMBER, reference.beam_number)
            .number_if(tags::BEAM_DOSE, reference.dose_gy)
            .number_if(tags::BEAM_METERSET, reference.meterset_mu)
            .text_if(tags::BEAM_DOSE_MEANING, reference.dose_meaning.as_deref())
            .text_if(tags::BEAM_DOSE_TYPE, reference.dose_type.as_deref())
            .sequence(
                tags::BEAM_DOSE_VERIFICATION_CONTROL_POINT_SEQUENCE,
                reference.verification.iter().map(depth_item),
            );
        if let Some(point_cm) = reference.point_cm {
            item.cm(BEAM_DOSE_SPECIFICATION_POINT, &point_cm);
        }
        if let Some(number) = reference.dose_reference {
            item.text(
                tags::REFERENCED_DOSE_REFERENCE_UID,
                &self.dose_reference_uid(number),
            );
        }
        if let Some(depths) = &reference.depths {
            put_depths(&mut item, depths);
        }
        if let Some(averages) = &reference.averages {
            item.cm_if(AVERAGE_BEAM_DOSE_POINT_DEPTH, averages.depth_cm)
                .cm_if(
                    AVERAGE_BEAM_DOSE_POINT_EQUIVALENT_DEPTH,
                    averages.equivalent_depth_cm,
                )
                .cm_if(AVERAGE_BEAM_DOSE_POINT_SSD, averages.ssd_cm)
                .cm_if(
                    tags::AVERAGE_BEAM_DOSE_POINT_SOURCE_TO_EXTERNAL_CONTOUR_DISTANCE,
                    averages.source_to_external_contour_cm,
                );
        }
        item
    }
}

fn depth_item(depths: &DepthSpec) -> Item {
    let mut item = Item::new();
    item.number_if(tags::CUMULATIVE_METERSET_WEIGHT, depths.weight);
    put_depths(&mut item, depths);
    item
}

fn put_depths(item: &mut Item, depths: &DepthSpec) {
    item.cm_if(tags::BEAM_DOSE_POINT_DEPTH, depths.depth_cm)
        .cm_if(
            tags::BEAM_DOSE_POINT_EQUIVALENT_DEPTH,
            depths.equivalent_depth_cm,
        )
        .cm_if(tags::BEAM_DOSE_POINT_SSD, depths.ssd_cm)
        .cm_if(
            tags::BEAM_DOSE_POINT_SOURCE_TO_EXTERNAL_CONTOUR_DISTANCE,
            depths.source_to_external_contour_cm,
        )
        .text_if(
            tags::DEPTH_VALUE_AVERAGING_FLAG,
            depths.averaged.map(|yes| if yes { "YES" } else { "NO" }),
        );
}

fn setup(setup: &SetupSpec) -> Item {
    let mut item = Item::new();
    item.whole(tags::PATIENT_SETUP_NUMBER, setup.number)
        .text(tags::PATIENT_POSITION, &setup.position)
        .text_if(tags::SETUP_TECHNIQUE, setup.technique.as_deref());
    item
}

fn beam(beam: &BeamSpec) -> Item {
    let count = |items: usize| i32::try_from(items).unwrap_or(i32::MAX);
    let mut item = Item::new();
    item.text_or_empty(tags::TREATMENT_MACHINE_NAME, beam.machine.as_deref())
        .text_if(tags::PRIMARY_DOSIMETER_UNIT, beam.dosimeter_unit.as_deref())
        .cm_if(tags::SOURCE_AXIS_DISTANCE, beam.sad_cm)
        .sequence(
            tags::BEAM_LIMITING_DEVICE_SEQUENCE,
            beam.devices.iter().map(device),
        )
        .whole(tags::BEAM_NUMBER, beam.number)
        .text(tags::BEAM_NAME, &beam.name)
        .text_if(tags::BEAM_DESCRIPTION, beam.description.as_deref())
        .text(tags::BEAM_TYPE, &beam.beam_type)
        .text(tags::RADIATION_TYPE, &beam.radiation)
        .text_if(tags::TREATMENT_DELIVERY_TYPE, beam.delivery.as_deref())
        .whole(tags::NUMBER_OF_WEDGES, count(beam.wedges.len()))
        .sequence(tags::WEDGE_SEQUENCE, beam.wedges.iter().map(wedge))
        .whole(tags::NUMBER_OF_COMPENSATORS, count(beam.compensators.len()))
        .sequence(
            tags::COMPENSATOR_SEQUENCE,
            beam.compensators.iter().map(compensator),
        )
        .whole(tags::NUMBER_OF_BOLI, count(beam.boluses.len()))
        .sequence(
            tags::REFERENCED_BOLUS_SEQUENCE,
            beam.boluses.iter().map(|bolus| {
                let mut item = Item::new();
                item.whole(tags::REFERENCED_ROI_NUMBER, bolus.roi_number)
                    .text_if(tags::BOLUS_ID, bolus.id.as_deref());
                item
            }),
        )
        .whole(tags::NUMBER_OF_BLOCKS, count(beam.blocks.len()))
        .sequence(tags::BLOCK_SEQUENCE, beam.blocks.iter().map(block))
        .number_if(tags::TOTAL_BLOCK_TRAY_FACTOR, beam.total_tray_factor)
        .sequence(
            tags::APPLICATOR_SEQUENCE,
            beam.applicators.iter().map(|applicator| {
                let mut item = Item::new();
                item.text(tags::APPLICATOR_ID, &applicator.id)
                    .text(tags::APPLICATOR_TYPE, &applicator.kind);
                item
            }),
        )
        .sequence(
            tags::GENERAL_ACCESSORY_SEQUENCE,
            beam.accessories.iter().map(|accessory| {
                let mut item = Item::new();
                item.whole(tags::GENERAL_ACCESSORY_NUMBER, accessory.number)
                    .text(tags::GENERAL_ACCESSORY_ID, &accessory.id)
                    .text_if(tags::GENERAL_ACCESSORY_TYPE, accessory.kind.as_deref());
                item
            }),
        )
        .number_or_empty(tags::FINAL_CUMULATIVE_METERSET_WEIGHT, beam.final_weight)
        .whole(
            tags::NUMBER_OF_CONTROL_POINTS,
            beam.stated_control_points
                .unwrap_or(count(beam.control_points.len())),
        )
        .sequence(
            tags::CONTROL_POINT_SEQUENCE,
            beam.control_points
                .iter()
                .enumerate()
                .map(|(index, point)| control_point(index, point)),
        );
    if let Some(number) = beam.setup_number {
        item.whole(tags::REFERENCED_PATIENT_SETUP_NUMBER, number);
    }
    if let Some((mode, id)) = &beam.fluence {
        let mut fluence = Item::new();
        fluence
            .text(tags::FLUENCE_MODE, mode)
            .text_if(tags::FLUENCE_MODE_ID, id.as_deref());
        item.sequence(tags::PRIMARY_FLUENCE_MODE_SEQUENCE, [fluence]);
    }
    item
}

fn device(device: &DeviceSpec) -> Item {
    let mut item = Item::new();
    item.text(tags::RT_BEAM_LIMITING_DEVICE_TYPE, &device.kind)
        .cm_if(
            tags::SOURCE_TO_BEAM_LIMITING_DEVICE_DISTANCE,
            device.source_distance_cm,
        )
        .whole(tags::NUMBER_OF_LEAF_JAW_PAIRS, device.pairs);
    if !device.boundaries_cm.is_empty() {
        item.cm(tags::LEAF_POSITION_BOUNDARIES, &device.boundaries_cm);
    }
    item
}

fn wedge(wedge: &WedgeSpec) -> Item {
    let mut item = Item::new();
    item.whole(tags::WEDGE_NUMBER, wedge.number)
        .text(tags::WEDGE_TYPE, &wedge.kind)
        .text(tags::WEDGE_ID, &wedge.id)
        .whole(tags::WEDGE_ANGLE, wedge.angle_deg)
        .number_or_empty(tags::WEDGE_FACTOR, wedge.factor)
        .numbers(tags::WEDGE_ORIENTATION, &[wedge.orientation_deg])
        .cm(
            tags::SOURCE_TO_WEDGE_TRAY_DISTANCE,
            wedge.source_to_tray_cm.as_slice(),
        );
    item
}

fn compensator(compensator: &CompensatorSpec) -> Item {
    let mut item = Item::new();
    item.whole(tags::COMPENSATOR_NUMBER, compensator.number)
        .text(tags::COMPENSATOR_ID, &compensator.id)
        .text(tags::MATERIAL_ID, &compensator.material)
        .text(tags::SOURCE_TO_COMPENSATOR_TRAY_DISTANCE, "")
        .whole(tags::COMPENSATOR_ROWS, 2)
        .whole(tags::COMPENSATOR_COLUMNS, 2)
        .cm(tags::COMPENSATOR_PIXEL_SPACING, &[1.0, 1.0])
        .cm(tags::COMPENSATOR_POSITION, &[-0.5, 0.5]);
    if let Some(transmission) = compensator.transmission {
        item.numbers(tags::COMPENSATOR_TRANSMISSION_DATA, &transmission);
    }
    if let Some(thickness_cm) = compensator.thickness_cm {
        item.cm(tags::COMPENSATOR_THICKNESS_DATA, &thickness_cm);
    }
    item
}

fn block(block: &BlockSpec) -> Item {
    let mut item = Item::new();
    let points = block.outline_cm.len();
    item.text_if(tags::BLOCK_TRAY_ID, block.tray_id.as_deref())
        .cm(
            tags::SOURCE_TO_BLOCK_TRAY_DISTANCE,
            block.source_to_tray_cm.as_slice(),
        )
        .text(tags::MATERIAL_ID, &block.material)
        .text(tags::BLOCK_TYPE, &block.kind)
        .text(
            tags::BLOCK_DIVERGENCE,
            if block.divergent { "PRESENT" } else { "ABSENT" },
        )
        .text(tags::BLOCK_MOUNTING_POSITION, "PATIENT_SIDE")
        .whole(tags::BLOCK_NUMBER, block.number)
        .text(tags::BLOCK_NAME, &block.name)
        .cm(tags::BLOCK_THICKNESS, block.thickness_cm.as_slice())
        .number_or_empty(tags::BLOCK_TRANSMISSION, block.transmission)
        .text(tags::BLOCK_NUMBER_OF_POINTS, &points.to_string())
        .cm(tags::BLOCK_DATA, block.outline_cm.as_flattened());
    item
}

fn control_point(index: usize, point: &PointSpec) -> Item {
    let mut item = Item::new();
    let first = index == 0;
    item.text(tags::CONTROL_POINT_INDEX, &index.to_string())
        .number_if(tags::NOMINAL_BEAM_ENERGY, point.energy)
        .number_if(tags::DOSE_RATE_SET, point.dose_rate_mu_per_min)
        .sequence(
            tags::WEDGE_POSITION_SEQUENCE,
            point.wedges.iter().map(|&(number, inside)| {
                let mut item = Item::new();
                item.text(tags::WEDGE_POSITION, if inside { "IN" } else { "OUT" })
                    .whole(tags::REFERENCED_WEDGE_NUMBER, number);
                item
            }),
        )
        .sequence(
            tags::BEAM_LIMITING_DEVICE_POSITION_SEQUENCE,
            point.positions_cm.iter().map(|(kind, positions_cm)| {
                let mut item = Item::new();
                item.text(tags::RT_BEAM_LIMITING_DEVICE_TYPE, kind)
                    .cm(tags::LEAF_JAW_POSITIONS, positions_cm);
                item
            }),
        )
        .number_if(tags::GANTRY_PITCH_ANGLE, point.gantry_pitch_deg)
        .number_if(tags::TABLE_TOP_PITCH_ANGLE, point.couch_pitch_deg)
        .number_if(tags::TABLE_TOP_ROLL_ANGLE, point.couch_roll_deg)
        .cm_if(tags::SOURCE_TO_SURFACE_DISTANCE, point.ssd_cm)
        .cm_if(
            tags::SOURCE_TO_EXTERNAL_CONTOUR_DISTANCE,
            point.source_to_external_contour_cm,
        )
        .number_or_empty(tags::CUMULATIVE_METERSET_WEIGHT, point.weight)
        .sequence(
            tags::REFERENCED_DOSE_REFERENCE_SEQUENCE,
            point.doses.iter().map(|(number, coefficient, depths)| {
                let mut item = Item::new();
                item.whole(tags::REFERENCED_DOSE_REFERENCE_NUMBER, *number)
                    .numbers(tags::CUMULATIVE_DOSE_REFERENCE_COEFFICIENT, &[*coefficient]);
                if let Some(depths) = depths {
                    put_depths(&mut item, depths);
                }
                item
            }),
        );
    put_motion(&mut item, point, first);
    item
}

/// Angles with their directions of rotation, and positions. The first control
/// point needs a direction with each angle.
fn put_motion(item: &mut Item, point: &PointSpec, first: bool) {
    let none = |given: Option<f64>| (first && given.is_some()).then_some("NONE");
    item.number_if(tags::GANTRY_ANGLE, point.gantry_deg)
        .text_if(
            tags::GANTRY_ROTATION_DIRECTION,
            point
                .gantry_direction
                .as_deref()
                .or_else(|| none(point.gantry_deg)),
        )
        .number_if(tags::BEAM_LIMITING_DEVICE_ANGLE, point.collimator_deg)
        .text_if(
            tags::BEAM_LIMITING_DEVICE_ROTATION_DIRECTION,
            none(point.collimator_deg),
        )
        .number_if(tags::PATIENT_SUPPORT_ANGLE, point.couch_deg)
        .text_if(
            tags::PATIENT_SUPPORT_ROTATION_DIRECTION,
            none(point.couch_deg),
        );
    if first {
        item.numbers(tags::TABLE_TOP_ECCENTRIC_ANGLE, &[0.0])
            .text(tags::TABLE_TOP_ECCENTRIC_ROTATION_DIRECTION, "NONE");
        if point.gantry_pitch_deg.is_some() {
            item.text(tags::GANTRY_PITCH_ROTATION_DIRECTION, "NONE");
        }
        if point.couch_pitch_deg.is_none() {
            item.numbers(tags::TABLE_TOP_PITCH_ANGLE, &[0.0]);
        }
        if point.couch_roll_deg.is_none() {
            item.numbers(tags::TABLE_TOP_ROLL_ANGLE, &[0.0]);
        }
        item.text(tags::TABLE_TOP_PITCH_ROTATION_DIRECTION, "NONE")
            .text(tags::TABLE_TOP_ROLL_ROTATION_DIRECTION, "NONE");
    }
    let couch = [
        tags::TABLE_TOP_VERTICAL_POSITION,
        tags::TABLE_TOP_LONGITUDINAL_POSITION,
        tags::TABLE_TOP_LATERAL_POSITION,
    ];
    for (index, tag) in couch.into_iter().enumerate() {
        match point.couch_cm {
            Some(couch_cm) => {
                item.cm(tag, &couch_cm[index..=index]);
            }
            None if first => {
                item.text(tag, "");
            }
            None => {}
        }
    }
    match point.isocentre_cm {
        Some(isocentre_cm) => {
            item.cm(tags::ISOCENTER_POSITION, &isocentre_cm);
        }
        None if first => {
            item.text(tags::ISOCENTER_POSITION, "");
        }
        None => {}
    }
    if let Some(entry_cm) = point.surface_entry_cm {
        item.cm(tags::SURFACE_ENTRY_POINT, &entry_cm);
    }
}
