"""RT Plans written by pydicom, for the comparison of the reader with pydicom:
one plan in every way of writing, and plans with every attribute that the
reader has a place for. All of them are invented, and nobody's.

`variants(folder, base)` writes them and tells for each which notes that stop
a calculation are meant. What the files say is read back with pydicom, so no
value is repeated here as an expectation.
"""

import copy
from dataclasses import dataclass, field
from pathlib import Path

import pydicom
from pydicom import config
from pydicom.dataset import Dataset, FileMetaDataset
from pydicom.dataelem import DataElement, RawDataElement
from pydicom.filewriter import write_dataset
from pydicom.filebase import DicomBytesIO
from pydicom.sequence import Sequence
from pydicom.tag import Tag
from pydicom.datadict import dictionary_VR, tag_for_keyword
from pydicom.uid import (
    DeflatedExplicitVRLittleEndian,
    ExplicitVRBigEndian,
    ExplicitVRLittleEndian,
    ImplicitVRLittleEndian,
)

config.settings.reading_validation_mode = config.IGNORE
config.settings.writing_validation_mode = config.IGNORE

RT_PLAN = "1.2.840.10008.5.1.4.1.1.481.5"
# An arc of invented UIDs under 2.25, the arc of UUIDs (ITU-T X.667), which needs no registration.
ROOT_UID = "2.25.1840001"


@dataclass
class Variant:
    """A written plan, and the notes that stop a calculation and are meant in it, as (kind, attribute path)."""

    name: str
    path: Path
    blocking: frozenset = field(default_factory=frozenset)


def item(**attributes):
    """A data set from keywords; lists of data sets become sequences."""
    ds = Dataset()
    for keyword, value in attributes.items():
        if isinstance(value, list) and all(isinstance(one, Dataset) for one in value):
            value = Sequence(value)
        setattr(ds, keyword, value)
    return ds


def jaws(x, y, kinds=("ASYMX", "ASYMY")):
    return [
        item(RTBeamLimitingDeviceType=kind, LeafJawPositions=list(position))
        for kind, position in zip(kinds, (x, y))
    ]


def simple_beam(number, **changes):
    """A static photon beam of 10 cm x 8 cm with everything that a beam needs."""
    first = item(
        ControlPointIndex=0,
        NominalBeamEnergy="6",
        DoseRateSet="600",
        BeamLimitingDevicePositionSequence=jaws((-50, 50), (-40, 40)),
        GantryAngle="90",
        GantryRotationDirection="NONE",
        BeamLimitingDeviceAngle="350.5",
        BeamLimitingDeviceRotationDirection="NONE",
        PatientSupportAngle="355",
        PatientSupportRotationDirection="NONE",
        IsocenterPosition=[12.5, -30.25, 401],
        SourceToSurfaceDistance="905.5",
        CumulativeMetersetWeight="0",
    )
    last = item(ControlPointIndex=1, CumulativeMetersetWeight="1")
    beam = item(
        BeamNumber=number,
        BeamName=f"field {number}",
        BeamType="STATIC",
        RadiationType="PHOTON",
        TreatmentMachineName="TEST-1",
        PrimaryDosimeterUnit="MU",
        SourceAxisDistance="1000",
        BeamLimitingDeviceSequence=[
            item(RTBeamLimitingDeviceType="ASYMX", NumberOfLeafJawPairs=1, SourceToBeamLimitingDeviceDistance="367"),
            item(RTBeamLimitingDeviceType="ASYMY", NumberOfLeafJawPairs=1, SourceToBeamLimitingDeviceDistance="279"),
        ],
        PrimaryFluenceModeSequence=[item(FluenceMode="STANDARD")],
        TreatmentDeliveryType="TREATMENT",
        NumberOfWedges=0,
        NumberOfCompensators=0,
        NumberOfBoli=0,
        NumberOfBlocks=0,
        FinalCumulativeMetersetWeight="1",
        NumberOfControlPoints=2,
        ControlPointSequence=[first, last],
        ReferencedPatientSetupNumber=1,
    )
    for keyword, value in changes.items():
        if isinstance(value, list) and all(isinstance(one, Dataset) for one in value):
            value = Sequence(value)
        setattr(beam, keyword, value)
    return beam


def reference(number, meterset="100", **attributes):
    return item(ReferencedBeamNumber=number, BeamMeterset=meterset, BeamDose="1.25", **attributes)


def plan_of(name, beams, groups=None):
    """A plan with these beams, and one fraction group over them unless groups are given."""
    if groups is None:
        references = [reference(int(beam.BeamNumber)) for beam in beams]
        groups = [
            item(
                FractionGroupNumber=1,
                NumberOfFractionsPlanned=25,
                NumberOfBeams=len(references),
                NumberOfBrachyApplicationSetups=0,
                ReferencedBeamSequence=references,
            )
        ]
    serial = sum(ord(c) * 31**index for index, c in enumerate(name)) % 10**9
    return item(
        SOPClassUID=RT_PLAN,
        SOPInstanceUID=f"{ROOT_UID}.{serial}",
        StudyInstanceUID=f"{ROOT_UID}.1",
        SeriesInstanceUID=f"{ROOT_UID}.2",
        Modality="RTPLAN",
        Manufacturer="invented planning system",
        PatientName="Nobody^Test",
        PatientID="T-0001",
        RTPlanLabel=name[:16],
        RTPlanDate="20260301",
        RTPlanTime="101112.5",
        RTPlanGeometry="PATIENT",
        FractionGroupSequence=groups,
        BeamSequence=beams,
        PatientSetupSequence=[item(PatientSetupNumber=1, PatientPosition="HFS", SetupTechnique="ISOCENTRIC")],
        ApprovalStatus="APPROVED",
    )


# --------------------------------------------------------------------------- ways of writing


def meta(ds, syntax):
    ds.file_meta = FileMetaDataset()
    ds.file_meta.MediaStorageSOPClassUID = ds.SOPClassUID
    ds.file_meta.MediaStorageSOPInstanceUID = ds.SOPInstanceUID
    ds.file_meta.TransferSyntaxUID = syntax
    ds.file_meta.ImplementationClassUID = f"{ROOT_UID}.99"


def write(path, ds, syntax=ExplicitVRLittleEndian):
    ds = copy.deepcopy(ds)
    meta(ds, syntax)
    big = syntax == ExplicitVRBigEndian
    implicit = syntax == ImplicitVRLittleEndian
    pydicom.dcmwrite(path, ds, implicit_vr=implicit, little_endian=not big, enforce_file_format=True)


def write_bare(path, ds, implicit, little=True):
    """The data set alone: no preamble, no DICM, no file meta group."""
    path.write_bytes(encoded(ds, implicit, little))


def encoded(ds, implicit, little=True):
    ds = copy.deepcopy(ds)
    ds.pop("file_meta", None)
    buffer = DicomBytesIO()
    buffer.is_implicit_VR = implicit
    buffer.is_little_endian = little
    write_dataset(buffer, ds)
    return buffer.getvalue()


def undefined_lengths(ds, sequences=True, items_too=True):
    """The same data set with sequences and items of undefined length."""
    ds = copy.deepcopy(ds)
    mark(ds, sequences, items_too)
    return ds


def mark(ds, sequences, items_too):
    for element in ds:
        if element.VR == "SQ":
            element.is_undefined_length = sequences
            for one in element.value:
                one.is_undefined_length_sequence_item = items_too
                mark(one, sequences, items_too)


def with_private_groups(ds):
    """Private elements before, between and after, at several levels: text, sequences, UN of defined and undefined length."""
    ds = copy.deepcopy(ds)
    inner = item(PatientID="not the patient's", BeamSequence=[item(BeamNumber=77)])
    for level in [ds, ds.BeamSequence[0], ds.BeamSequence[0].ControlPointSequence[0]]:
        for group in (0x0009, 0x3005, 0x300B, 0x7FE1):
            block = level.private_block(group, "INVENTED PRIVATE", create=True)
            block.add_new(0x01, "LO", "private text")
            block.add_new(0x02, "SQ", Sequence([copy.deepcopy(inner)]))
            block.add_new(0x03, "UN", b"\x00\x01\x02\x03\x04\x05")
            block.add_new(0x05, "FD", [1.5, -2.5])
            # A sequence whose VR the writer did not know: undefined length, implicit little endian inside.
            unknown = DataElement(block.get_tag(0x04), "UN", items_as_implicit([inner]))
            unknown.is_undefined_length = True
            level.add(unknown)
    return ds


def items_as_implicit(datasets):
    """Items of undefined length with their elements in implicit little endian."""
    out = b""
    for ds in datasets:
        out += b"\xfe\xff\x00\xe0\xff\xff\xff\xff" + encoded(ds, True) + b"\xfe\xff\x0d\xe0\x00\x00\x00\x00"
    return out


def with_known_sequence_as_unknown(ds):
    """A standard sequence written as UN of undefined length, as gateways do that do not know it."""
    ds = copy.deepcopy(ds)
    for beam in ds.BeamSequence:
        if "WedgeSequence" in beam:
            tag = Tag(tag_for_keyword("WedgeSequence"))
            # As raw bytes: a data element of pydicom would make it a sequence again.
            value = items_as_implicit(beam.WedgeSequence)
            beam[tag] = RawDataElement(tag, "UN", 0xFFFFFFFF, value, 0, False, True)
    return ds


def raw(ds, keyword, value):
    """Sets the very bytes of an attribute's value."""
    tag = Tag(tag_for_keyword(keyword))
    ds[tag] = RawDataElement(tag, dictionary_VR(tag), len(value), value, 0, False, True)


# --------------------------------------------------------------------------- plans


def everything():
    """A plan in which every attribute that the reader has a place for is stated at least once."""
    beam = simple_beam(
        3,
        BeamDescription="a beam with one of everything",
        HighDoseTechniqueType="NORMAL",
        Manufacturer="invented maker",
        ManufacturerModelName="invented linac",
        PrimaryFluenceModeSequence=[item(FluenceMode="NON_STANDARD", FluenceModeID="FFF")],
        ReferencedToleranceTableNumber=4,
        NumberOfWedges=1,
        WedgeSequence=[wedge(1, "STANDARD", "W-15", "15", "90")],
        NumberOfBlocks=1,
        BlockSequence=[block(1, "SHIELDING", [-50, -40, -20, -40, -20, 0, -50, 0])],
        TotalBlockTrayFactor="0.97",
        NumberOfCompensators=1,
        CompensatorSequence=[
            item(
                CompensatorNumber=1,
                CompensatorID="C-1",
                CompensatorType="STANDARD",
                MaterialID="BRASS",
                CompensatorTrayID="CT-1",
                CompensatorRows=1,
                CompensatorColumns=2,
                CompensatorTransmissionData=[0.5, 0.75],
                CompensatorThicknessData=[1, 2],
            )
        ],
        ApplicatorSequence=[
            item(
                ApplicatorID="A-1",
                ApplicatorType="STEREOTACTIC",
                ApplicatorDescription="a cone",
                AccessoryCode="77-1",
                SourceToApplicatorMountingPositionDistance=577.5,
            )
        ],
        GeneralAccessorySequence=[
            item(
                GeneralAccessoryNumber=2,
                GeneralAccessoryID="G-1",
                GeneralAccessoryType="GRATICULE",
                GeneralAccessoryDescription="crosses",
                AccessoryCode="77-2",
            )
        ],
        NumberOfBoli=1,
        ReferencedBolusSequence=[
            item(ReferencedROINumber=8, BolusID="B-1", BolusDescription="10 mm", AccessoryCode="77-3")
        ],
    )
    beam.BeamLimitingDeviceSequence.append(
        item(
            RTBeamLimitingDeviceType="MLCX",
            NumberOfLeafJawPairs=2,
            SourceToBeamLimitingDeviceDistance="509.5",
            LeafPositionBoundaries=[-100, 0, 100],
        )
    )
    beam.BeamLimitingDeviceSequence.append(
        item(
            RTBeamLimitingDeviceType="MLCY",
            NumberOfLeafJawPairs=2,
            SourceToBeamLimitingDeviceDistance="459.5",
            LeafPositionBoundaries=[-100, 5, 100],
        )
    )
    first = beam.ControlPointSequence[0]
    for keyword, value in dict(
        GantryAngle="-10",
        GantryPitchAngle=1.5,
        TableTopEccentricAngle="2.5",
        TableTopEccentricAxisDistance="30",
        TableTopPitchAngle=-1.25,
        TableTopRollAngle=0.75,
        TableTopVerticalPosition="-120.5",
        TableTopLongitudinalPosition="1300.1",
        TableTopLateralPosition="15",
        SurfaceEntryPoint=[1, 2, 3.5],
        SourceToExternalContourDistance=899.5,
    ).items():
        setattr(first, keyword, value)
    first.BeamLimitingDevicePositionSequence.append(
        item(RTBeamLimitingDeviceType="MLCX", LeafJawPositions=[-40, -45.5, 40.5, 45])
    )
    first.WedgePositionSequence = Sequence([item(ReferencedWedgeNumber=1, WedgePosition="IN")])
    first.ReferencedDoseReferenceSequence = Sequence(
        [
            item(
                ReferencedDoseReferenceNumber=1,
                CumulativeDoseReferenceCoefficient="0",
                BeamDosePointDepth=101.5,
                BeamDosePointEquivalentDepth=99.25,
                BeamDosePointSSD=898.5,
                BeamDosePointSourceToExternalContourDistance="897.5",
                DepthValueAveragingFlag="NO",
            )
        ]
    )
    group = item(
        FractionGroupNumber=2,
        FractionGroupDescription="the first days",
        NumberOfFractionsPlanned=20,
        NumberOfBeams=1,
        NumberOfBrachyApplicationSetups=0,
        ReferencedDoseReferenceSequence=[item(ReferencedDoseReferenceNumber=1, TargetPrescriptionDose="40")],
        ReferencedBeamSequence=[
            reference(
                3,
                "123.456789012345",
                BeamDoseMeaning="BEAM_LEVEL",
                BeamDoseType="PHYSICAL",
                BeamDoseSpecificationPoint=[11.5, -30.5, 402],
                ReferencedDoseReferenceUID=f"{ROOT_UID}.7",
                BeamDosePointDepth=100.5,
                BeamDosePointEquivalentDepth=98.25,
                BeamDosePointSSD=899.5,
                BeamDosePointSourceToExternalContourDistance="898",
                DepthValueAveragingFlag="YES",
                AverageBeamDosePointDepth=102.5,
                AverageBeamDosePointEquivalentDepth=97.25,
                AverageBeamDosePointSSD=896.5,
                AverageBeamDosePointSourceToExternalContourDistance=895.5,
                BeamDoseVerificationControlPointSequence=[
                    item(
                        CumulativeMetersetWeight=weight,
                        BeamDosePointDepth=depth,
                        BeamDosePointEquivalentDepth=depth - 2,
                        BeamDosePointSSD=1000 - depth,
                        BeamDosePointSourceToExternalContourDistance="890",
                        DepthValueAveragingFlag="NO",
                    )
                    for weight, depth in (("0", 103.5), ("1", 104.5))
                ],
            )
        ],
    )
    ds = plan_of("everything", [beam], [group])
    for keyword, value in dict(
        FrameOfReferenceUID=f"{ROOT_UID}.3",
        ManufacturerModelName="invented model",
        SoftwareVersions=["1.2", "patch 3"],
        RTPlanName="all attributes",
        PlanIntent="CURATIVE",
        TreatmentSites="chest",
        ReviewDate="20260302",
        ReviewTime="080000",
        ReviewerName="Nobody^Else",
    ).items():
        setattr(ds, keyword, value)
    for keyword, uid in dict(
        ReferencedStructureSetSequence=4, ReferencedRTPlanSequence=5, ReferencedDoseSequence=6
    ).items():
        setattr(ds, keyword, Sequence([item(ReferencedSOPClassUID="1.2.3", ReferencedSOPInstanceUID=f"{ROOT_UID}.{uid}")]))
    ds.ToleranceTableSequence = Sequence([item(ToleranceTableNumber=4, ToleranceTableLabel="wide")])
    ds.PatientSetupSequence[0].PatientAdditionalPosition = "arms up"
    ds.DoseReferenceSequence = Sequence(
        [
            item(
                DoseReferenceNumber=1,
                DoseReferenceUID=f"{ROOT_UID}.7",
                DoseReferenceStructureType="COORDINATES",
                DoseReferenceDescription="prescription",
                DoseReferencePointCoordinates=[11.5, -30.5, 402],
                DoseReferenceType="TARGET",
                ReferencedROINumber=9,
                TargetPrescriptionDose="50.4",
            )
        ]
    )
    return ds


def wedge(number, kind, name, angle, orientation, factor="0.75"):
    return item(
        WedgeNumber=number,
        WedgeType=kind,
        WedgeID=name,
        AccessoryCode="77-4",
        WedgeAngle=angle,
        WedgeFactor=factor,
        WedgeOrientation=orientation,
        SourceToWedgeTrayDistance="580",
    )


def block(number, kind, outline):
    return item(
        BlockNumber=number,
        BlockName=f"block {number}",
        BlockType=kind,
        BlockDivergence="PRESENT" if number % 2 else "ABSENT",
        BlockMountingPosition="SOURCE_SIDE",
        BlockTrayID="TRAY-1",
        AccessoryCode="77-5",
        MaterialID="CERROBEND",
        BlockThickness="75",
        BlockTransmission="0.05",
        SourceToBlockTrayDistance="654.5",
        BlockNumberOfPoints=len(outline) // 2,
        BlockData=outline,
    )


def wedged():
    """Every type of wedge; IN and OUT by control point, per wedge, with inheritance."""
    motorised = simple_beam(
        2,
        NumberOfWedges=2,
        WedgeSequence=[wedge(1, "MOTORIZED", "M-60", "60", "0"), wedge(7, "STANDARD", "S-30", "30", "270")],
        NumberOfControlPoints=4,
    )
    motorised.ControlPointSequence[0].WedgePositionSequence = Sequence(
        [item(ReferencedWedgeNumber=7, WedgePosition="OUT"), item(ReferencedWedgeNumber=1, WedgePosition="IN")]
    )
    middle = [
        item(
            ControlPointIndex=1,
            CumulativeMetersetWeight="0.4",
            WedgePositionSequence=[item(ReferencedWedgeNumber=1, WedgePosition="OUT")],
        ),
        item(ControlPointIndex=2, CumulativeMetersetWeight="0.4"),
    ]
    motorised.ControlPointSequence[1].ControlPointIndex = 3
    motorised.ControlPointSequence[1].WedgePositionSequence = Sequence(
        [item(ReferencedWedgeNumber=7, WedgePosition="IN")]
    )
    motorised.ControlPointSequence[1:1] = middle
    dynamic = simple_beam(5, NumberOfWedges=1, WedgeSequence=[wedge(3, "DYNAMIC", "D-45", "45", "180", "")])
    dynamic.ControlPointSequence[0].WedgePositionSequence = Sequence(
        [item(ReferencedWedgeNumber=3, WedgePosition="IN")]
    )
    partial = simple_beam(
        1,
        NumberOfWedges=3,
        WedgeSequence=[
            wedge(1, "PARTIAL_STANDARD", "P-1", "15", "0"),
            wedge(2, "PARTIAL_MOTORIZ", "P-2", "15", "0"),
            wedge(3, "SOMETHING_NEW", "P-3", "15", "0"),
        ],
    )
    return plan_of("wedged", [motorised, dynamic, partial])


def blocked():
    triangle = [-10.5, -10, 10, -10, 0, 15.25]
    many = [round(0.37 * i - 30, 2) for i in range(200)]
    return plan_of(
        "blocked",
        [
            simple_beam(
                1,
                NumberOfBlocks=3,
                BlockSequence=[block(1, "SHIELDING", triangle), block(2, "APERTURE", many), block(3, "OTHER", triangle)],
                TotalBlockTrayFactor="0.965",
            )
        ],
    )


def bank(kind, boundaries):
    return item(
        RTBeamLimitingDeviceType=kind,
        NumberOfLeafJawPairs=len(boundaries) - 1,
        SourceToBeamLimitingDeviceDistance="500",
        LeafPositionBoundaries=boundaries,
    )


def leaves(name, kinds, jaw_kinds=("ASYMX", "ASYMY")):
    """Leaf banks of the given kinds, moving from control point to control point one bank at a time."""
    boundaries = {kind: [10 * step - 200 + 3 * index for step in range(41)] for index, kind in enumerate(kinds)}
    beam = simple_beam(1, NumberOfControlPoints=5, BeamType="DYNAMIC")
    declared = [
        item(RTBeamLimitingDeviceType=kind, NumberOfLeafJawPairs=1, SourceToBeamLimitingDeviceDistance="300")
        for kind in jaw_kinds
    ]
    beam.BeamLimitingDeviceSequence = Sequence(declared + [bank(kind, boundaries[kind]) for kind in kinds])

    def moved(kind, shift):
        low = [-30 - 0.5 * (leaf % 7) + shift for leaf in range(40)]
        return item(RTBeamLimitingDeviceType=kind, LeafJawPositions=low + [60 + one for one in low])

    points = beam.ControlPointSequence
    points[0].BeamLimitingDevicePositionSequence = Sequence(
        [
            item(RTBeamLimitingDeviceType=kind, LeafJawPositions=[-60, 60])
            for kind in jaw_kinds
        ]
        + [moved(kind, 0) for kind in kinds]
    )
    middle = []
    for index in (1, 2, 3):
        positions = [moved(kinds[index % len(kinds)], 1.25 * index)]
        middle.append(
            item(
                ControlPointIndex=index,
                CumulativeMetersetWeight=str(index / 4),
                BeamLimitingDevicePositionSequence=positions,
            )
        )
    points[1].ControlPointIndex = 4
    points[1:1] = middle
    return plan_of(name, [beam])


def arc():
    """A volumetric arc of 178 control points with two leaf banks of 60 pairs, and a second one back."""
    beams = []
    for number, direction in ((1, "CW"), (2, "CC")):
        count = 178
        beam = simple_beam(number, BeamType="DYNAMIC", NumberOfControlPoints=count)
        boundaries = [5 * step - 150 for step in range(61)]
        beam.BeamLimitingDeviceSequence.append(bank("MLCX", boundaries))
        first = beam.ControlPointSequence[0]
        first.GantryRotationDirection = direction
        points = []
        for index in range(count):
            low = [-20 - ((index * 7 + leaf * 3) % 90) / 4 for leaf in range(60)]
            high = [low[leaf] + 5 + ((index + leaf) % 40) / 2 for leaf in range(60)]
            positions = item(RTBeamLimitingDeviceType="MLCX", LeafJawPositions=low + high)
            angle = 181 + 2 * index if direction == "CW" else 179 - 2 * index
            point = first if index == 0 else item(ControlPointIndex=index)
            point.GantryAngle = f"{angle % 360:.2f}"
            point.CumulativeMetersetWeight = f"{index / (count - 1):.10f}"
            if index == 0:
                point.BeamLimitingDevicePositionSequence.append(positions)
            else:
                point.BeamLimitingDevicePositionSequence = Sequence([positions])
            if index == count - 1:
                point.CumulativeMetersetWeight = "1"
                point.GantryRotationDirection = "NONE"
            points.append(point)
        beam.ControlPointSequence = Sequence(points)
        beams.append(beam)
    return plan_of("arc", beams)


def electrons():
    beam = simple_beam(
        1,
        RadiationType="ELECTRON",
        NumberOfBlocks=1,
        BlockSequence=[block(1, "APERTURE", [-40, -40, 40, -40, 40, 40, -40, 40])],
        ApplicatorSequence=[
            item(
                ApplicatorID="E-10",
                ApplicatorType="ELECTRON_SQUARE",
                ApplicatorDescription="10 x 10",
                SourceToApplicatorMountingPositionDistance=950.0,
            )
        ],
        GeneralAccessorySequence=[
            item(GeneralAccessoryNumber=1, GeneralAccessoryID="INSERT-7", GeneralAccessoryType="TRAY")
        ],
    )
    beam.ControlPointSequence[0].NominalBeamEnergy = "9"
    beam.ControlPointSequence[0].SourceToSurfaceDistance = "1000"
    circle = simple_beam(
        2,
        RadiationType="ELECTRON",
        ApplicatorSequence=[item(ApplicatorID="E-C5", ApplicatorType="ELECTRON_CIRC")],
    )
    circle.ControlPointSequence[0].NominalBeamEnergy = "15.00"
    return plan_of("electrons", [beam, circle])


def fraction_groups():
    """A beam in two groups with different metersets, setup and imaging fields, numbers out of order."""
    beams = [
        simple_beam(4, BeamName="same name"),
        simple_beam(2, BeamName="same name"),
        simple_beam(9, TreatmentDeliveryType="SETUP"),
        simple_beam(8, TreatmentDeliveryType="OPEN_PORTFILM"),
        simple_beam(7, TreatmentDeliveryType="TRMT_PORTFILM"),
        simple_beam(6, TreatmentDeliveryType="VERIFICATION"),
        simple_beam(5, TreatmentDeliveryType="CONTINUATION"),
        simple_beam(3, TreatmentDeliveryType="SOMETHING_NEW"),
    ]
    del beams[2].FinalCumulativeMetersetWeight
    groups = [
        item(
            FractionGroupNumber=2,
            NumberOfFractionsPlanned=5,
            NumberOfBeams=3,
            NumberOfBrachyApplicationSetups=0,
            ReferencedBeamSequence=[reference(4, "80.5"), reference(2, "20.000000000001"), reference(3, "1")],
        ),
        item(
            FractionGroupNumber=1,
            FractionGroupDescription="boost",
            NumberOfFractionsPlanned=20,
            NumberOfBeams=3,
            NumberOfBrachyApplicationSetups=0,
            ReferencedBeamSequence=[
                reference(2, "120", BeamDoseMeaning="FRACTION_LEVEL"),
                item(ReferencedBeamNumber=9),
                reference(5, "33", BeamDoseType="EFFECTIVE"),
            ],
        ),
    ]
    return plan_of("fraction groups", beams, groups)


def depths_in(*places):
    """A point's depth at some of the three places."""
    ds = plan_of("depths " + " ".join(places), [simple_beam(1)])
    attributes = dict(BeamDosePointDepth=100.25, BeamDosePointEquivalentDepth=95.5, BeamDosePointSSD=903.0)
    referenced = ds.FractionGroupSequence[0].ReferencedBeamSequence[0]
    if "beam" in places:
        for keyword, value in attributes.items():
            setattr(referenced, keyword, value)
    if "average" in places:
        referenced.AverageBeamDosePointDepth = 100.25
    if "verification" in places:
        referenced.BeamDoseVerificationControlPointSequence = Sequence(
            [item(CumulativeMetersetWeight=weight, **attributes) for weight in ("0", "0.5", "1")]
        )
    if "point" in places:
        for index, point in enumerate(ds.BeamSequence[0].ControlPointSequence):
            only = dict(list(attributes.items())[: 3 - index])
            point.ReferencedDoseReferenceSequence = Sequence(
                [
                    item(ReferencedDoseReferenceNumber=1, CumulativeDoseReferenceCoefficient="0", **only),
                    item(ReferencedDoseReferenceNumber=2, DepthValueAveragingFlag="YES"),
                ]
            )
    return ds


def empties():
    """Empty values everywhere: empty is absent, and inheritance goes on through it."""
    ds = plan_of("empties", [simple_beam(1)])
    for keyword in ("StudyInstanceUID", "PatientName", "PatientID", "RTPlanDate", "RTPlanTime", "Manufacturer"):
        setattr(ds, keyword, "")
    beam = ds.BeamSequence[0]
    beam.BeamDescription = ""
    beam.HighDoseTechniqueType = ""
    beam.WedgeSequence = Sequence([])
    beam.BlockSequence = Sequence([])
    beam.PrimaryFluenceModeSequence = Sequence([])
    beam.BeamLimitingDeviceSequence[0].SourceToBeamLimitingDeviceDistance = None
    first, last = beam.ControlPointSequence
    for keyword in "TableTopVerticalPosition TableTopLongitudinalPosition TableTopLateralPosition".split():
        setattr(first, keyword, None)
    for keyword in "GantryAngle IsocenterPosition SourceToSurfaceDistance NominalBeamEnergy".split():
        setattr(last, keyword, None)
    last.GantryRotationDirection = ""
    last.BeamLimitingDevicePositionSequence = Sequence(
        [item(RTBeamLimitingDeviceType="ASYMX", LeafJawPositions=None)]
    )
    referenced = ds.FractionGroupSequence[0].ReferencedBeamSequence[0]
    referenced.BeamDose = None
    return ds


def odd_numbers():
    """Decimal strings as they are really sent: blanks, signs, exponents, NUL, more than 16 characters."""
    ds = plan_of("odd numbers", [simple_beam(1), simple_beam(2)])
    beam = ds.BeamSequence[0]
    raw(beam, "SourceAxisDistance", b" 1.0E+3 ")
    raw(beam, "FinalCumulativeMetersetWeight", b"1.00000000000000000000")
    raw(beam, "BeamNumber", b" 1")
    first, last = beam.ControlPointSequence
    raw(first, "NominalBeamEnergy", b"+6.0")
    raw(first, "DoseRateSet", b"600\0")
    raw(first, "GantryAngle", b"-0.10 ")
    raw(first, "BeamLimitingDeviceAngle", b"360.0 ")
    raw(first, "PatientSupportAngle", b"-90.5 ")
    raw(first, "IsocenterPosition", b" 1.5 \\-.5\\1e2")
    raw(first, "SourceToSurfaceDistance", b"898.429664831309123456")
    raw(first, "CumulativeMetersetWeight", b"0.0E-10 ")
    raw(last, "CumulativeMetersetWeight", b"10e-1 ")
    referenced = ds.FractionGroupSequence[0].ReferencedBeamSequence[0]
    raw(referenced, "BeamMeterset", b"116.003669700000012345")
    raw(referenced, "BeamDose", b"1027.54010000000e-3")
    return ds


def bad_numbers():
    """Values that are no numbers, or not credible ones: never used, never bridged."""
    beams = [simple_beam(number) for number in range(1, 7)]
    ds = plan_of("bad numbers", beams)
    raw(beams[0], "SourceAxisDistance", b"1000,0")
    raw(beams[1].ControlPointSequence[0], "GantryAngle", b"NaN ")
    raw(beams[1].ControlPointSequence[0], "SourceToSurfaceDistance", b"inf ")
    # The second control point does not give back what the first had.
    raw(beams[2].ControlPointSequence[1], "GantryAngle", b"-Infinity ")
    raw(beams[2].ControlPointSequence[1], "IsocenterPosition", b"1\\2 ")
    beams[3].SourceAxisDistance = "100"
    beams[3].ControlPointSequence[0].SourceToSurfaceDistance = "89"
    beams[4].ControlPointSequence[0].NominalBeamEnergy = "6000"
    references = ds.FractionGroupSequence[0].ReferencedBeamSequence
    references[5].BeamDose = "200"
    references[5].BeamMeterset = "-5"
    ds.PatientSetupSequence[0].PatientPosition = "SITTING"
    return ds


# What of them stops a beam: the value itself, and that a beam cannot be calculated without it.
BAD_NUMBERS = [
    ("malformed_value", "BeamSequence[0].SourceAxisDistance"),
    ("missing_value", "BeamSequence[0].SourceAxisDistance"),
    ("malformed_value", "BeamSequence[1].ControlPointSequence[0].GantryAngle"),
    ("missing_value", "BeamSequence[1].GantryAngle"),
    ("malformed_value", "BeamSequence[1].ControlPointSequence[0].SourceToSurfaceDistance"),
    ("malformed_value", "BeamSequence[2].ControlPointSequence[1].GantryAngle"),
    ("malformed_value", "BeamSequence[2].ControlPointSequence[1].IsocenterPosition"),
    ("incredible_value", "BeamSequence[3].SourceAxisDistance"),
    ("missing_value", "BeamSequence[3].SourceAxisDistance"),
    ("incredible_value", "BeamSequence[3].ControlPointSequence[0].SourceToSurfaceDistance"),
    ("incredible_value", "BeamSequence[4].ControlPointSequence[0].NominalBeamEnergy"),
    ("missing_value", "BeamSequence[4].NominalBeamEnergy"),
    ("incredible_value", "FractionGroupSequence[0].ReferencedBeamSequence[5].BeamDose"),
    ("incredible_value", "FractionGroupSequence[0].ReferencedBeamSequence[5].BeamMeterset"),
]


def irregular_devices():
    """X beside ASYMX, devices never positioned, positions of devices not declared, no X jaws at all."""
    renamed = simple_beam(1)
    renamed.ControlPointSequence[0].BeamLimitingDevicePositionSequence = Sequence(
        jaws((-30, 31), (-20, 21), ("X", "Y"))
    )
    unused = simple_beam(2)
    unused.BeamLimitingDeviceSequence.append(bank("MLCX", [-10, 0, 10]))
    single = simple_beam(3)
    single.BeamLimitingDeviceSequence = Sequence([unused.BeamLimitingDeviceSequence[1], bank("MLCX", [-10, 0, 10])])
    single.ControlPointSequence[0].BeamLimitingDevicePositionSequence = Sequence(
        [
            item(RTBeamLimitingDeviceType="ASYMY", LeafJawPositions=[-10, 10]),
            item(RTBeamLimitingDeviceType="MLCX", LeafJawPositions=[-20, -21, 20, 21]),
        ]
    )
    return plan_of("irregular devices", [renamed, unused, single])


def machine_quality_plan():
    """No patient set-up technique, no dose, no delivery type, no fluence mode, no Patient ID at all."""
    ds = plan_of("machine QA", [simple_beam(1)])
    beam = ds.BeamSequence[0]
    for keyword in "TreatmentDeliveryType PrimaryFluenceModeSequence BeamName".split():
        del beam[keyword]
    for keyword in "PatientID PatientName RTPlanDate ApprovalStatus".split():
        del ds[keyword]
    del ds.FractionGroupSequence[0].ReferencedBeamSequence[0].BeamDose
    return ds


CHARACTER_SETS = [
    # (Specific Character Set, a name that it can write); DICOM PS3.3 C.12.1.1.2, PS3.5 6.1 and annexes H to K.
    ("ISO_IR 100", "M\u00fcller^J\u00f6rg"),
    ("ISO_IR 192", "\u738b^\u5c0f\u6771=\u0141\u00f3d\u017a"),
    ("ISO_IR 144", "\u041b\u044e\u043ac\u0435\u043c"),
    ("ISO_IR 101", "Dvo\u0159\u00e1k^Ji\u0159\u00ed"),
    ("ISO_IR 126", "\u0394\u03b9\u03bf\u03bd\u03c5\u03c3\u03b9\u03bf\u03c2"),
    ("GB18030", "\u738b^\u5c0f\u4e1c"),
    (["ISO 2022 IR 6", "ISO 2022 IR 100"], "M\u00fcller^J\u00f6rg"),
    (["", "ISO 2022 IR 87"], "Yamada^Tarou=\u5c71\u7530^\u592a\u90ce=\u3084\u307e\u3060^\u305f\u308d\u3046"),
    (["", "ISO 2022 IR 149"], "Hong^Gildong=\u6d2a^\u5409\u6d1e=\ud64d^\uae38\ub3d9"),
    (["ISO 2022 IR 100", "ISO 2022 IR 144"], "M\u00fcller^\u041b\u044e\u043a"),
]


def character_set(terms, name):
    ds = plan_of("text", [simple_beam(1)])
    ds.SpecificCharacterSet = terms
    ds.PatientName = name
    words = name.split("=")[-1].replace("^", " ")
    ds.RTPlanName = words
    ds.BeamSequence[0].BeamDescription = words
    return ds


def undeclared(terms):
    """Bytes beyond ASCII although no character set (or a wrong one) is declared."""
    ds = plan_of("undeclared text", [simple_beam(1)])
    if terms is not None:
        ds.SpecificCharacterSet = terms
    raw(ds, "PatientName", b"M\xfcller^J\xf6rg ")
    raw(ds, "RTPlanName", b"line\r\nbreak\x07 \x1b[31mred")
    return ds


# --------------------------------------------------------------------------- all of them


def variants(folder, base):
    """Writes every variant into `folder`. `base` is pydicom's own RT plan."""
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    out = []

    def put(name, writer, ds, *arguments, blocking=()):
        path = folder / (name.replace(" ", "-") + ".dcm")
        writer(path, ds, *arguments)
        out.append(Variant(name, path, frozenset(blocking)))

    full = everything()
    sources = {"rtplan": pydicom.dcmread(base), "everything": full, "wedged": wedged()}
    for name, ds in sources.items():
        put(f"{name} implicit", write, ds, ImplicitVRLittleEndian)
        put(f"{name} explicit", write, ds, ExplicitVRLittleEndian)
        put(f"{name} big-endian", write, ds, ExplicitVRBigEndian)
        put(f"{name} deflated", write, ds, DeflatedExplicitVRLittleEndian)
        for syntax in (ImplicitVRLittleEndian, ExplicitVRLittleEndian, ExplicitVRBigEndian):
            label = {ImplicitVRLittleEndian: "implicit", ExplicitVRLittleEndian: "explicit"}.get(syntax, "big-endian")
            put(f"{name} undefined lengths {label}", write, undefined_lengths(ds), syntax)
        put(f"{name} undefined sequences only", write, undefined_lengths(ds, items_too=False))
        put(f"{name} undefined items only", write, undefined_lengths(ds, sequences=False))
        put(f"{name} bare implicit", write_bare, ds, True)
        put(f"{name} bare explicit", write_bare, ds, False)
        put(f"{name} bare big-endian", write_bare, ds, False, False)
        private = with_private_groups(ds)
        put(f"{name} private explicit", write, private, ExplicitVRLittleEndian)
        put(f"{name} private implicit", write, private, ImplicitVRLittleEndian)
        put(f"{name} private undefined lengths", write, undefined_lengths(private))
    put("wedge sequence as UN", write, with_known_sequence_as_unknown(sources["wedged"]))
    put("wedges", write, sources["wedged"])
    put("blocks", write, blocked())
    put("leaves MLCX", write, leaves("leaves x", ["MLCX"]))
    put("leaves MLCX with X and Y", write, leaves("leaves xy", ["MLCX"], ("X", "Y")))
    put("leaves MLCX without X jaws", write, leaves("leaves y", ["MLCX"], ("ASYMY",)))
    put("leaves stacked", write, leaves("leaves stacked", ["MLCX1", "MLCX2"]))
    put("leaves stacked without jaws", write, leaves("leaves alone", ["MLCX1", "MLCX2"], ()))
    put("leaves MLCY", write, leaves("leaves MLCY", ["MLCY"]))
    put("leaves MLCX and MLCY", write, leaves("leaves crossed", ["MLCX", "MLCY"]))
    put("leaves MLCY stacked", write, leaves("leaves y stacked", ["MLCY1", "MLCY2"]))
    put("arc", write, arc())
    put("arc deflated", write, arc(), DeflatedExplicitVRLittleEndian)
    put("arc undefined lengths implicit", write, undefined_lengths(arc()), ImplicitVRLittleEndian)
    put("electrons", write, electrons())
    put("fraction groups", write, fraction_groups())
    for places in (["beam"], ["average"], ["verification"], ["point"], ["beam", "average", "verification", "point"]):
        put("depths " + " ".join(places), write, depths_in(*places))
    put("empties", write, empties())
    put("empties implicit", write, empties(), ImplicitVRLittleEndian)
    put("odd numbers", write, odd_numbers())
    put("bad numbers", write, bad_numbers(), blocking=BAD_NUMBERS)
    put("irregular devices", write, irregular_devices())
    put("machine QA", write, machine_quality_plan())
    for index, (terms, name) in enumerate(CHARACTER_SETS):
        label = terms if isinstance(terms, str) else " and ".join(terms)
        put(f"text {index} {label}", write, character_set(terms, name))
    put("text undeclared", write, undeclared(None))
    put("text declared ASCII", write, undeclared("ISO_IR 6"))
    return out
