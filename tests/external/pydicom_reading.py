"""An independent reading of an RT Plan: pydicom's data set to the structure
that `counterfoil read --json` prints. pydicom does the parsing; this file
knows only the attributes (DICOM PS3.3, C.8.8.9 to C.8.8.16) and the rules
that the program states for its reading: mm become cm, empty is absent, what
cannot be used is absent and never bridged by an earlier control point.

What the reader remarked (`notes`) has no counterpart in pydicom and is judged
by `check_reader.py` itself.
"""

import math

from pydicom.multival import MultiValue

ABSENT = {"standing": "absent"}

# What the program holds for credible, in the file's units; values outside are
# not used. Restated here on purpose: a changed range must show.
RANGES = {
    "SourceAxisDistance": (600, 1500),
    "SourceToSurfaceDistance": (300, 5000),
    "SourceToExternalContourDistance": (300, 5000),
    "BeamDosePointSSD": (300, 5000),
    "AverageBeamDosePointSSD": (300, 5000),
    "BeamDosePointSourceToExternalContourDistance": (300, 5000),
    "AverageBeamDosePointSourceToExternalContourDistance": (300, 5000),
    "BeamDosePointDepth": (0, 600),
    "BeamDosePointEquivalentDepth": (0, 600),
    "AverageBeamDosePointDepth": (0, 600),
    "AverageBeamDosePointEquivalentDepth": (0, 600),
    "LeafJawPositions": (-300, 300),
    "LeafPositionBoundaries": (-300, 300),
    "BlockData": (-300, 300),
    "BlockThickness": (-300, 300),
    "BeamMeterset": (0, 20000),
    "BeamDose": (0, 50),
    "TargetPrescriptionDose": (0, 200),
    "NumberOfFractionsPlanned": (1, 100),
    "BlockTransmission": (0, 1),
}
ANGLES = (
    "GantryAngle GantryPitchAngle BeamLimitingDeviceAngle PatientSupportAngle TableTopEccentricAngle "
    "TableTopPitchAngle TableTopRollAngle WedgeAngle WedgeOrientation"
).split()
DISTANCES = (
    "SourceToBeamLimitingDeviceDistance SourceToWedgeTrayDistance SourceToBlockTrayDistance "
    "SourceToApplicatorMountingPositionDistance"
).split()
COORDINATES = (
    "DoseReferencePointCoordinates BeamDoseSpecificationPoint IsocenterPosition SurfaceEntryPoint "
    "TableTopVerticalPosition TableTopLongitudinalPosition TableTopLateralPosition TableTopEccentricAxisDistance"
).split()
RANGES |= dict.fromkeys(ANGLES, (-720, 720))
RANGES |= dict.fromkeys(DISTANCES, (50, 1200))
RANGES |= dict.fromkeys(COORDINATES, (-5000, 5000))

UNUSABLE = object()


def stated(value):
    return {"standing": "stated", "value": value}


def given(value):
    return ABSENT if value is None or value is UNUSABLE else stated(value)


def value_of(item):
    return item.get("value")


def text(ds, keyword):
    """Text as shown: multiple values joined, control characters out, trimmed; None when empty."""
    if keyword not in ds:
        return None
    value = ds[keyword].value
    if value is None:
        return None
    values = list(value) if isinstance(value, MultiValue) else [value]
    joined = "\\".join("" if one is None else str(one) for one in values)
    joined = joined.replace("\t", " ").replace("\n", " ")
    shown = "".join(c for c in joined if not (ord(c) < 32 or 127 <= ord(c) < 160)).strip()
    return shown or None


def numbers(ds, keyword, divisor=1.0, credible=None):
    """All numbers of an attribute: None when absent or empty, UNUSABLE when one is no finite number or not credible."""
    try:
        if keyword not in ds:
            return None
        value = ds[keyword].value
    except (ValueError, TypeError, OverflowError):
        return UNUSABLE
    if value is None or value == "":
        return None
    values = list(value) if hasattr(value, "__iter__") and not isinstance(value, str) else [value]
    if not values:
        return None
    if any(one is None or one == "" for one in values):
        return None if all(one is None or one == "" for one in values) else UNUSABLE
    try:
        values = [float(one) for one in values]
    except ValueError:
        return UNUSABLE
    low, high = credible or RANGES.get(keyword, (-math.inf, math.inf))
    if not all(math.isfinite(one) and low <= one <= high for one in values):
        return UNUSABLE
    return [one / divisor for one in values]


def exactly(count, values):
    if values is None or values is UNUSABLE:
        return values
    return values if len(values) == count else UNUSABLE


def number(ds, keyword, divisor=1.0, credible=None):
    values = exactly(1, numbers(ds, keyword, divisor, credible))
    return values[0] if isinstance(values, list) else values


def integer(ds, keyword):
    value = number(ds, keyword)
    if isinstance(value, float):
        return int(value) if value == int(value) else UNUSABLE
    return value


def point(ds, keyword):
    values = exactly(3, numbers(ds, keyword, 10.0))
    if not isinstance(values, list):
        return values
    return {"frame": "patient", "x_cm": values[0], "y_cm": values[1], "z_cm": values[2]}


def items(ds, keyword):
    return list(ds[keyword].value) if keyword in ds and ds[keyword].value else []


def texts(ds, **fields):
    return {field: given(text(ds, keyword)) for field, keyword in fields.items()}


def uids(ds, keyword):
    found = (text(item, "ReferencedSOPInstanceUID") for item in items(ds, keyword))
    return [uid for uid in found if uid is not None]


def plan(ds):
    beams = [read_beam(item) for item in items(ds, "BeamSequence")]
    return {
        "identity": identity(ds),
        "patient_setups": [setup(item) for item in items(ds, "PatientSetupSequence")],
        "tolerance_tables": [
            {
                "number": given(integer(item, "ToleranceTableNumber")),
                "label": given(text(item, "ToleranceTableLabel")),
            }
            for item in items(ds, "ToleranceTableSequence")
        ],
        "dose_references": [dose_reference(item) for item in items(ds, "DoseReferenceSequence")],
        "fraction_groups": [fraction_group(item) for item in items(ds, "FractionGroupSequence")],
        "beams": beams,
    }


def identity(ds):
    return texts(
        ds,
        sop_class_uid="SOPClassUID",
        sop_instance_uid="SOPInstanceUID",
        study_instance_uid="StudyInstanceUID",
        series_instance_uid="SeriesInstanceUID",
        frame_of_reference_uid="FrameOfReferenceUID",
        patient_name="PatientName",
        patient_id="PatientID",
        plan_label="RTPlanLabel",
        plan_name="RTPlanName",
        plan_date="RTPlanDate",
        plan_time="RTPlanTime",
        plan_intent="PlanIntent",
        treatment_sites="TreatmentSites",
        plan_geometry="RTPlanGeometry",
        manufacturer="Manufacturer",
        model_name="ManufacturerModelName",
        software_versions="SoftwareVersions",
    ) | {
        "structure_set_uids": uids(ds, "ReferencedStructureSetSequence"),
        "referenced_plan_uids": uids(ds, "ReferencedRTPlanSequence"),
        "referenced_dose_uids": uids(ds, "ReferencedDoseSequence"),
        "approval": texts(
            ds,
            status="ApprovalStatus",
            review_date="ReviewDate",
            review_time="ReviewTime",
            reviewer="ReviewerName",
        ),
    }


def known_term(ds, keyword, terms):
    term = text(ds, keyword)
    return given(terms.get(term))


def setup(item):
    positions = "HFS HFP HFDL HFDR FFS FFP FFDL FFDR".split()
    return {
        "number": given(integer(item, "PatientSetupNumber")),
        "position": known_term(item, "PatientPosition", {code: code for code in positions}),
        "additional_position": given(text(item, "PatientAdditionalPosition")),
        "technique": given(text(item, "SetupTechnique")),
    }


def dose_reference(item):
    return texts(
        item,
        uid="DoseReferenceUID",
        structure_type="DoseReferenceStructureType",
        description="DoseReferenceDescription",
        reference_type="DoseReferenceType",
    ) | {
        "number": given(integer(item, "DoseReferenceNumber")),
        "point": given(point(item, "DoseReferencePointCoordinates")),
        "roi_number": given(integer(item, "ReferencedROINumber")),
        "target_prescription_dose_gy": given(number(item, "TargetPrescriptionDose")),
    }


def fraction_group(item):
    fractions = integer(item, "NumberOfFractionsPlanned")
    return {
        "number": given(integer(item, "FractionGroupNumber")),
        "description": given(text(item, "FractionGroupDescription")),
        "fractions_planned": given(fractions),
        "beams": [referenced_beam(one) for one in items(item, "ReferencedBeamSequence")],
        "brachy_setups": given(integer(item, "NumberOfBrachyApplicationSetups")),
        "dose_references": [
            {
                "number": given(integer(one, "ReferencedDoseReferenceNumber")),
                "target_prescription_dose_gy": given(number(one, "TargetPrescriptionDose")),
            }
            for one in items(item, "ReferencedDoseReferenceSequence")
        ],
    }


def referenced_beam(item):
    depths = [depth_set(item, "referenced_beam"), average_set(item)]
    for index, one in enumerate(items(item, "BeamDoseVerificationControlPointSequence")):
        found = depth_set(one, {"verification_control_point": index})
        if found is not None:
            found["cumulative_weight"] = given(number(one, "CumulativeMetersetWeight"))
        depths.append(found)
    return {
        "beam_number": given(integer(item, "ReferencedBeamNumber")),
        "meterset_mu": given(number(item, "BeamMeterset")),
        "beam_dose_gy": given(number(item, "BeamDose")),
        "dose_meaning": known_term(
            item, "BeamDoseMeaning", {"BEAM_LEVEL": "BEAM_LEVEL", "FRACTION_LEVEL": "FRACTION_LEVEL"}
        ),
        "dose_type": known_term(
            item, "BeamDoseType", {"PHYSICAL": "PHYSICAL", "EFFECTIVE": "EFFECTIVE"}
        ),
        "specification_point": given(point(item, "BeamDoseSpecificationPoint")),
        "dose_reference_uid": given(text(item, "ReferencedDoseReferenceUID")),
        "point_depths": [found for found in depths if found is not None],
    }


def depth_set(item, place):
    found = {
        "place": place,
        "cumulative_weight": ABSENT,
        "depth_cm": given(number(item, "BeamDosePointDepth", 10.0)),
        "equivalent_depth_cm": given(number(item, "BeamDosePointEquivalentDepth", 10.0)),
        "ssd_cm": given(number(item, "BeamDosePointSSD", 10.0)),
        "source_to_external_contour_cm": given(
            number(item, "BeamDosePointSourceToExternalContourDistance", 10.0)
        ),
        "averaged": known_term(item, "DepthValueAveragingFlag", {"YES": True, "NO": False}),
    }
    return found if any_value(found) else None


def average_set(item):
    """The averages over the beam (300A,008D to 008F and 300A,0131): averages by definition."""
    found = {
        "place": "retired_average",
        "cumulative_weight": ABSENT,
        "depth_cm": given(number(item, "AverageBeamDosePointDepth", 10.0)),
        "equivalent_depth_cm": given(number(item, "AverageBeamDosePointEquivalentDepth", 10.0)),
        "ssd_cm": given(number(item, "AverageBeamDosePointSSD", 10.0)),
        "source_to_external_contour_cm": given(
            number(item, "AverageBeamDosePointSourceToExternalContourDistance", 10.0)
        ),
        "averaged": {"standing": "derived", "value": True, "how": ...},
    }
    return found if any_value(found) else None


def any_value(found):
    fields = "depth_cm equivalent_depth_cm ssd_cm source_to_external_contour_cm".split()
    return any(found[field] is not ABSENT for field in fields)


JAWS = {"X": "x", "ASYMX": "x", "Y": "y", "ASYMY": "y"}
LEAVES = ("MLCX", "MLCX1", "MLCX2", "MLCY", "MLCY1", "MLCY2")


def positions_here(control_point):
    """(kind, item) of the devices that a control point really positions."""
    return [
        (text(item, "RTBeamLimitingDeviceType"), item)
        for item in items(control_point, "BeamLimitingDevicePositionSequence")
        if numbers(item, "LeafJawPositions") is not None
    ]


def devices(item):
    positioned = []
    for control_point in items(item, "ControlPointSequence"):
        positioned += [kind for kind, _ in positions_here(control_point) if kind not in positioned]
    declared = [
        {
            "kind": text(device, "RTBeamLimitingDeviceType") or "",
            "pairs": given(integer(device, "NumberOfLeafJawPairs")),
            "source_distance_cm": given(number(device, "SourceToBeamLimitingDeviceDistance", 10.0)),
            "boundaries_cm": given(numbers(device, "LeafPositionBoundaries", 10.0)),
        }
        for device in items(item, "BeamLimitingDeviceSequence")
    ]
    kinds = [device["kind"] for device in declared]

    def counts(kind):
        # X and ASYMX name one pair of jaws, and so do Y and ASYMY.
        other_name = [one for one in positioned if one not in kinds and JAWS.get(one, one) == JAWS.get(kind)]
        return kind in positioned or bool(other_name)

    used = [device for device in declared if counts(device["kind"])]
    unused = [device for device in declared if not counts(device["kind"])]
    for kind in positioned:
        same = any(kind == device["kind"] or JAWS.get(kind, kind) == JAWS.get(device["kind"]) for device in used)
        if not same:
            used.append({"kind": kind, "pairs": ABSENT, "source_distance_cm": ABSENT, "boundaries_cm": ABSENT})
    return used, unused


def read_beam(item):
    used, unused = devices(item)
    wedges = [wedge(one) for one in items(item, "WedgeSequence")]
    radiation = text(item, "RadiationType")
    points = control_points(item, radiation, used, wedges)
    modes = items(item, "PrimaryFluenceModeSequence")[:1]
    nominal = points[0]["energy"] if points else ABSENT
    energies = [value_of(one["energy"]) for one in points]
    return texts(
        item,
        name="BeamName",
        description="BeamDescription",
        beam_type="BeamType",
        radiation="RadiationType",
        high_dose_technique="HighDoseTechniqueType",
        machine="TreatmentMachineName",
        machine_manufacturer="Manufacturer",
        machine_model="ManufacturerModelName",
        dosimeter_unit="PrimaryDosimeterUnit",
        delivery="TreatmentDeliveryType",
    ) | {
        "number": given(integer(item, "BeamNumber")),
        "sad_cm": given(number(item, "SourceAxisDistance", 10.0)),
        "energy": {
            "nominal": nominal,
            "fluence_mode": given(text(modes[0], "FluenceMode")) if modes else ABSENT,
            "fluence_mode_id": given(text(modes[0], "FluenceModeID")) if modes else ABSENT,
            "changes": any(one != energies[0] for one in energies),
        },
        "devices": used,
        "unused_devices": unused,
        "wedges": wedges,
        "blocks": [block(one) for one in items(item, "BlockSequence")],
        "total_block_tray_factor": given(number(item, "TotalBlockTrayFactor")),
        "compensators": [compensator(one) for one in items(item, "CompensatorSequence")],
        "applicators": [
            texts(
                one,
                id="ApplicatorID",
                kind="ApplicatorType",
                description="ApplicatorDescription",
                accessory_code="AccessoryCode",
            )
            | {"source_to_mounting_cm": given(number(one, "SourceToApplicatorMountingPositionDistance", 10.0))}
            for one in items(item, "ApplicatorSequence")
        ],
        "accessories": [
            texts(
                one,
                id="GeneralAccessoryID",
                kind="GeneralAccessoryType",
                description="GeneralAccessoryDescription",
                accessory_code="AccessoryCode",
            )
            | {"number": given(integer(one, "GeneralAccessoryNumber"))}
            for one in items(item, "GeneralAccessorySequence")
        ],
        "boluses": [
            texts(one, id="BolusID", description="BolusDescription", accessory_code="AccessoryCode")
            | {"roi_number": given(integer(one, "ReferencedROINumber"))}
            for one in items(item, "ReferencedBolusSequence")
        ],
        "final_cumulative_weight": given(number(item, "FinalCumulativeMetersetWeight")),
        "patient_setup_number": given(integer(item, "ReferencedPatientSetupNumber")),
        "tolerance_table_number": given(integer(item, "ReferencedToleranceTableNumber")),
        "control_points": points,
    }


def wedge(item):
    return texts(item, kind="WedgeType", id="WedgeID", accessory_code="AccessoryCode") | {
        "number": given(integer(item, "WedgeNumber")),
        "angle_deg": given(number(item, "WedgeAngle")),
        "factor": given(number(item, "WedgeFactor")),
        "orientation_deg": given(number(item, "WedgeOrientation")),
        "source_to_tray_cm": given(number(item, "SourceToWedgeTrayDistance", 10.0)),
    }


def block(item):
    outline = numbers(item, "BlockData", 10.0)
    if isinstance(outline, list):
        outline = [list(pair) for pair in zip(outline[::2], outline[1::2])] if len(outline) % 2 == 0 else UNUSABLE
    return texts(
        item,
        name="BlockName",
        block_type="BlockType",
        mounting="BlockMountingPosition",
        tray_id="BlockTrayID",
        accessory_code="AccessoryCode",
        material="MaterialID",
    ) | {
        "number": given(integer(item, "BlockNumber")),
        "divergent": known_term(item, "BlockDivergence", {"PRESENT": True, "ABSENT": False}),
        "thickness_cm": given(number(item, "BlockThickness", 10.0)),
        "transmission": given(number(item, "BlockTransmission")),
        "source_to_tray_cm": given(number(item, "SourceToBlockTrayDistance", 10.0)),
        "outline_cm": given(outline),
    }


def compensator(item):
    return texts(
        item,
        id="CompensatorID",
        kind="CompensatorType",
        material="MaterialID",
        tray_id="CompensatorTrayID",
    ) | {
        "number": given(integer(item, "CompensatorNumber")),
        "has_transmission": "CompensatorTransmissionData" in item,
        "has_thickness": "CompensatorThicknessData" in item,
    }


class Held:
    """What each attribute has been so far, for inheritance."""

    def __init__(self):
        self.values = {}

    def carry(self, key, here, index):
        """Stated here; else what an earlier control point stated, with the index of that one."""
        if here is UNUSABLE:
            self.values.pop(key, None)
            return ABSENT
        if here is not None:
            self.values[key] = (here, index)
            return stated(here)
        if key not in self.values:
            return ABSENT
        value, origin = self.values[key]
        return {"standing": "inherited", "value": value, "from_control_point": origin}


NUMBERS = {
    "energy": ("NominalBeamEnergy", 1.0),
    "dose_rate_mu_per_min": ("DoseRateSet", 1.0),
    "gantry_pitch_deg": ("GantryPitchAngle", 1.0),
    "couch_deg": ("PatientSupportAngle", 1.0),
    "eccentric_deg": ("TableTopEccentricAngle", 1.0),
    "eccentric_axis_distance_cm": ("TableTopEccentricAxisDistance", 10.0),
    "couch_pitch_deg": ("TableTopPitchAngle", 1.0),
    "couch_roll_deg": ("TableTopRollAngle", 1.0),
    "couch_vertical_cm": ("TableTopVerticalPosition", 10.0),
    "couch_longitudinal_cm": ("TableTopLongitudinalPosition", 10.0),
    "couch_lateral_cm": ("TableTopLateralPosition", 10.0),
    "ssd_cm": ("SourceToSurfaceDistance", 10.0),
    "source_to_external_contour_cm": ("SourceToExternalContourDistance", 10.0),
}
TURNED = {"gantry_deg": "GantryAngle", "collimator_deg": "BeamLimitingDeviceAngle"}
POINTS = {"isocentre": "IsocenterPosition", "surface_entry": "SurfaceEntryPoint"}
TERMS = {
    "gantry_direction": "GantryRotationDirection",
    "collimator_direction": "BeamLimitingDeviceRotationDirection",
    "couch_direction": "PatientSupportRotationDirection",
}


def control_points(item, radiation, used, wedges):
    held = Held()
    energies = {"PHOTON": (1, 50), "ELECTRON": (2, 50)}.get(radiation)
    points = []
    for index, control_point in enumerate(items(item, "ControlPointSequence")):
        found = {
            "index": given(integer(control_point, "ControlPointIndex")),
            "cumulative_weight": given(number(control_point, "CumulativeMetersetWeight")),
            "referenced_doses": [
                {
                    "number": given(integer(one, "ReferencedDoseReferenceNumber")),
                    "cumulative_coefficient": given(number(one, "CumulativeDoseReferenceCoefficient")),
                    "point_depth": depth_set(one, "control_point"),
                }
                for one in items(control_point, "ReferencedDoseReferenceSequence")
            ],
        }
        for field, (keyword, divisor) in NUMBERS.items():
            credible = energies if field == "energy" else None
            found[field] = held.carry(field, number(control_point, keyword, divisor, credible), index)
        for field, keyword in TURNED.items():
            angle = number(control_point, keyword)
            found[field] = held.carry(field, angle % 360.0 if isinstance(angle, float) else angle, index)
        for field, keyword in POINTS.items():
            found[field] = held.carry(field, point(control_point, keyword), index)
        for field, keyword in TERMS.items():
            found[field] = held.carry(field, text(control_point, keyword), index)
        found |= openings(control_point, held, index, used)
        found["wedges"] = wedge_positions(control_point, held, index, wedges)
        points.append(found)
    return points


def openings(control_point, held, index, used):
    jaws = {"x": None, "y": None}
    leaves = {}
    boundaries = {device["kind"]: value_of(device["boundaries_cm"]) for device in used}
    pairs = {device["kind"]: value_of(device["pairs"]) for device in used}
    for kind, item in positions_here(control_point):
        values = numbers(item, "LeafJawPositions", 10.0)
        if kind in JAWS:
            values, place, where = exactly(2, values), JAWS[kind], jaws
        else:
            count = len(boundaries[kind]) - 1 if boundaries.get(kind) else pairs.get(kind)
            values, place, where = exactly(2 * count if count is not None else -1, values), kind, leaves
        # One axis at two different places: neither is used.
        before = where.get(place)
        where[place] = values if before is None or before == values else UNUSABLE
    return {
        "jaws_x_cm": held.carry("jaws x", jaws["x"], index),
        "jaws_y_cm": held.carry("jaws y", jaws["y"], index),
        "leaves": [
            {
                "kind": device["kind"],
                "positions_cm": held.carry(("leaves", device["kind"]), leaves.get(device["kind"]), index),
            }
            for device in used
            if device["kind"] in LEAVES
        ],
    }


def wedge_positions(control_point, held, index, wedges):
    here = {}
    for item in items(control_point, "WedgePositionSequence"):
        number_here = integer(item, "ReferencedWedgeNumber")
        term = text(item, "WedgePosition")
        position = None if term is None else {"IN": True, "OUT": False}.get(term, UNUSABLE)
        same = number_here not in here or here[number_here] == position
        here[number_here] = position if same else UNUSABLE
    return [
        {
            "wedge_number": one["number"],
            "in_beam": held.carry(("wedge", position), here.get(value_of(one["number"])), index),
        }
        for position, one in enumerate(wedges)
    ]
