"""Beam models from arrays and RT Plans of shaped photon fields, for checks of
shaped fields against other calculations: what a beam model holds is given as
arrays, what a field opens as leaves, jaws, blocks and segments, and the dose
of the other calculation is put into the plan as its own, so that the
program's deviation is its error against that calculation.

Everything is invented, static, gantry, collimator and couch at 0, supine head
first, isocentric with SAD 100 cm. Leaves move along x. Lengths are cm in the
collimator system at the isocentre plane, unless a name says otherwise.
"""

import math
import zlib
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from common import rows_of, run_program
from make_variants import ROOT_UID, item, write

SAD_CM = 100.0
ISOCENTRE_MM = (20.0, -30.0, 400.0)

# Leaf bank: 80 pairs of 0.5 cm.
BOUNDARIES_CM = tuple(-20.0 + 0.5 * line for line in range(81))
PAIRS = len(BOUNDARIES_CM) - 1

# Source to device, cm.
JAW_Y_CM, JAW_X_CM, LEAVES_CM, BLOCKS_CM = 28.0, 37.0, 50.0, 65.0

# --------------------------------------------------------------------------- beam models


@dataclass
class BeamData:
    """A photon beam from tables of another calculation. Sc and the off-axis ratio are 1 everywhere."""

    depths_cm: np.ndarray
    sides_cm: np.ndarray
    # By depth, then side; 1 at `d0_cm` for every side.
    relative: np.ndarray
    # Phantom scatter factor of the same sides, 1 at 10 cm.
    sp: np.ndarray
    penumbra_sigma_cm: float
    # A second Gaussian for an edge with a tail: (share, sigma in cm).
    penumbra_tail: tuple | None = None
    extra_focal_distance_cm: float = 10.0
    # "tpr": sides at the point's plane; "pdd": sides at the surface, at `ssd_cm`.
    kind: str = "tpr"
    ssd_cm: float = 100.0
    d0_cm: float = 10.0
    # Source to the point of the reference output; the isocentre unless given.
    reference_distance_cm: float = 100.0
    # Depth of maximum; the deepest over the sides of the table unless given.
    d_max_cm: float | None = None
    interpolation: str = "linear"
    # Sides at d0 that `sp` belongs to, where they are not those of the table.
    sp_sides_cm: np.ndarray | None = None


def write_model(folder, machine, data, label="6", energy_mv=6.0):
    """Writes a beam model folder that serves this machine name with this one beam."""
    folder = Path(folder)
    (folder / label).mkdir(parents=True)
    sides = np.asarray(data.sides_cm, dtype=float)
    lines = ["depth_cm," + ",".join(f"{side:.12g}" for side in sides)]
    for depth, row in zip(data.depths_cm, np.asarray(data.relative)):
        lines.append(f"{depth:.12g}," + ",".join(f"{value:.8f}" for value in row))
    write_text(folder / label / "depth.csv", lines)
    sp_sides = sides if data.sp_sides_cm is None else data.sp_sides_cm
    lines = ["side_cm,sc,sp"]
    lines += [f"{side:.12g},1,{sp:.8f}" for side, sp in zip(sp_sides, data.sp)]
    write_text(folder / label / "output.csv", lines)
    write_text(folder / label / "off-axis.csv", ["radius_cm,ratio", "0,1", "30,1"])
    d_max = data.d_max_cm
    if d_max is None:
        d_max = max(data.depths_cm[int(row)] for row in np.argmax(data.relative, axis=0))
    tail = ""
    if data.penumbra_tail is not None:
        share, sigma = data.penumbra_tail
        tail = f"penumbra_tail_share = {share:.6f}\npenumbra_tail_sigma_cm = {sigma:.6f}\n"
    ssd = f"ssd_cm = {data.ssd_cm:.6f}\n" if data.kind == "pdd" else ""
    boundaries = ", ".join(f"{line:.1f}" for line in BOUNDARIES_CM)
    text = f"""# Written by a check from the data of another calculation; of no machine.
schema = 1
serves = ["{machine}"]
sad_cm = {SAD_CM:.1f}

[provenance]
origin = "invented"
by = "tests/external"
on = 2026-01-01

[approval]
by = "nobody: a check"
on = 2026-01-01
until = 2099-12-31

[[jaws]]
moves_along = "y"
place = "upper"
source_distance_cm = {JAW_Y_CM:.1f}
transmission = 0.0
outward_limit_cm = 20.0
across_limit_cm = 20.0

[[jaws]]
moves_along = "x"
place = "lower"
source_distance_cm = {JAW_X_CM:.1f}
transmission = 0.0
outward_limit_cm = 20.0
across_limit_cm = 20.0

[[leaf_banks]]
moves_along = "x"
source_distance_cm = {LEAVES_CM:.1f}
boundaries_cm = [{boundaries}]
transmission = 0.0
leaf_end_offset_cm = 0.0
outward_limit_cm = 20.0
across_limit_cm = 20.0

[[beams]]
label = "{label}"
radiation = "PHOTON"
energy_mv = {energy_mv:.1f}
fluence_mode_ids = []
exchange_k = 1.0
penumbra_sigma_cm = {data.penumbra_sigma_cm:.6f}
{tail}extra_focal_distance_cm = {data.extra_focal_distance_cm:.6f}

[beams.reference]
dose_per_mu_cgy = 1.0
depth_cm = {data.d0_cm:.6f}
source_distance_cm = {data.reference_distance_cm:.6f}

[beams.depth_table]
file = "{label}/depth.csv"
kind = "{data.kind}"
normalised_at = "d0"
values_in = "share"
interpolation = "{data.interpolation}"
d_max_cm = {d_max:.6f}
{ssd}
[beams.output_factors]
file = "{label}/output.csv"

[beams.off_axis]
file = "{label}/off-axis.csv"
kind = "in-air"

[beams.uncertainty]
output_percent = 0.5
depth_table_percent = 0.5
head_scatter_percent = 0.3
phantom_scatter_percent = 0.3
off_axis_percent = 0.7
transmission_percent = 0.3
"""
    (folder / "machine.toml").write_text(text, encoding="ascii")
    return folder


def write_text(path, lines):
    path.write_text("\n".join(lines) + "\n", encoding="ascii")


# --------------------------------------------------------------------------- fields


@dataclass
class Segment:
    """What is open while a share of the meterset is given. Without leaves, jaws alone."""

    jaw_x: tuple
    jaw_y: tuple
    # One (from, to) for each pair, lowest boundary first; equal when closed.
    leaves: list | None = None
    share: float = 1.0


@dataclass
class Block:
    """A block without transmission; `shields` inside its outline (else it is open there alone)."""

    outline: list
    shields: bool


@dataclass
class Field:
    """A beam whose dose another calculation knows, in units of the reference output (1 cGy/MU)."""

    name: str
    segments: list
    depth_cm: float
    dose: float
    # x, y in cm, and height above the isocentre plane toward the source.
    point: tuple = (0.0, 0.0, 0.0)
    blocks: list = field(default_factory=list)
    meterset: float = 100.0


@dataclass
class Outcome:
    """A row of beams.csv."""

    verdict: str
    reasons: str
    technique: str
    method: str
    # None when the program gives no number.
    deviation_percent: float | None
    independent_dose_gy: float | None


def leaves_of(rectangles, park=0.0):
    """Leaf positions that open these (x1, x2, y1, y2); y on leaf boundaries, one rectangle for a pair at most."""
    leaves = [(park, park)] * PAIRS
    for x1, x2, y1, y2 in rectangles:
        first, last = line_at(y1), line_at(y2)
        for pair in range(first, last):
            assert leaves[pair][0] == leaves[pair][1], f"leaf pair {pair} opens twice"
            leaves[pair] = (x1, x2)
    return leaves


def line_at(y):
    line = round((y - BOUNDARIES_CM[0]) / 0.5)
    assert abs(BOUNDARIES_CM[line] - y) < 1e-9, f"{y} cm is no leaf boundary"
    return line


def shaped(rectangles, share=1.0, jaw_margin=0.5):
    """A segment whose leaves open these rectangles. The jaws stand back by the margin: a rectangle whose every
    edge is a jaw would be a jaw field to the program, and not shaped."""
    x1, x2, y1, y2 = (list(side) for side in zip(*rectangles))
    middle = (min(x1) + max(x2)) / 2
    return Segment(
        jaw_x=(max(min(x1) - jaw_margin, -20.0), min(max(x2) + jaw_margin, 20.0)),
        jaw_y=(max(min(y1) - jaw_margin, -20.0), min(max(y2) + jaw_margin, 20.0)),
        leaves=leaves_of(rectangles, middle),
        share=share,
    )


def opened_by(segment):
    """The rectangles (x1, x2, y1, y2) that leaves and jaws of a segment leave open; blocks are not in it."""
    (left, right), (low, high) = segment.jaw_x, segment.jaw_y
    if segment.leaves is None:
        return [(left, right, low, high)]
    found = []
    for pair, (x1, x2) in enumerate(segment.leaves):
        one = (
            max(x1, left),
            min(x2, right),
            max(BOUNDARIES_CM[pair], low),
            min(BOUNDARIES_CM[pair + 1], high),
        )
        if one[0] < one[1] and one[2] < one[3]:
            found.append(one)
    return found


# --------------------------------------------------------------------------- plans


def mm(cm):
    return round(10 * cm, 6)


def text_of(number):
    """A DICOM decimal string: 16 characters at most."""
    return f"{number:.10g}"


def position(point):
    """Patient coordinates, mm: supine head first with everything at 0, x_b is left, y_b is superior, and
    the source lies anterior, at negative y."""
    x, y, height = point
    return [
        ISOCENTRE_MM[0] + mm(x),
        ISOCENTRE_MM[1] - mm(height),
        ISOCENTRE_MM[2] + mm(y),
    ]


def devices(segment):
    jaws = [
        item(RTBeamLimitingDeviceType=kind, LeafJawPositions=[text_of(mm(side)) for side in sides])
        for kind, sides in (("ASYMX", segment.jaw_x), ("ASYMY", segment.jaw_y))
    ]
    if segment.leaves is None:
        return jaws
    ends = [low for low, _ in segment.leaves] + [high for _, high in segment.leaves]
    return jaws + [item(RTBeamLimitingDeviceType="MLCX", LeafJawPositions=[text_of(mm(end)) for end in ends])]


def beam_of(number, one, machine, energy_mv):
    """A beam: two control points for each segment; between them meterset accrues, from one pair to the next none."""
    height = one.point[2]
    ssd_cm = SAD_CM - height - one.depth_cm
    whole = sum(segment.share for segment in one.segments)
    points, before = [], 0.0
    for segment in one.segments:
        after = before + segment.share
        for weight in (before, after):
            points.append(
                item(
                    ControlPointIndex=len(points),
                    CumulativeMetersetWeight=text_of(weight / whole),
                    BeamLimitingDevicePositionSequence=devices(segment),
                )
            )
        before = after
    first = points[0]
    for keyword, value in dict(
        NominalBeamEnergy=text_of(energy_mv),
        DoseRateSet="600",
        GantryAngle="0",
        GantryRotationDirection="NONE",
        BeamLimitingDeviceAngle="0",
        BeamLimitingDeviceRotationDirection="NONE",
        PatientSupportAngle="0",
        PatientSupportRotationDirection="NONE",
        TableTopEccentricAngle="0",
        TableTopEccentricRotationDirection="NONE",
        IsocenterPosition=[text_of(value) for value in ISOCENTRE_MM],
        SourceToSurfaceDistance=text_of(10 * ssd_cm),
    ).items():
        setattr(first, keyword, value)
    limiting = [
        item(RTBeamLimitingDeviceType="ASYMX", NumberOfLeafJawPairs=1),
        item(RTBeamLimitingDeviceType="ASYMY", NumberOfLeafJawPairs=1),
    ]
    has_leaves = one.segments[0].leaves is not None
    assert all((segment.leaves is not None) == has_leaves for segment in one.segments), one.name
    if has_leaves:
        limiting.append(
            item(
                RTBeamLimitingDeviceType="MLCX",
                NumberOfLeafJawPairs=PAIRS,
                LeafPositionBoundaries=[text_of(mm(line)) for line in BOUNDARIES_CM],
            )
        )
    beam = item(
        BeamNumber=number,
        BeamName=one.name,
        BeamType="STATIC" if len(points) == 2 else "DYNAMIC",
        RadiationType="PHOTON",
        TreatmentMachineName=machine,
        PrimaryDosimeterUnit="MU",
        SourceAxisDistance=text_of(10 * SAD_CM),
        BeamLimitingDeviceSequence=limiting,
        PrimaryFluenceModeSequence=[item(FluenceMode="STANDARD")],
        TreatmentDeliveryType="TREATMENT",
        NumberOfWedges=0,
        NumberOfCompensators=0,
        NumberOfBoli=0,
        NumberOfBlocks=len(one.blocks),
        FinalCumulativeMetersetWeight="1",
        NumberOfControlPoints=len(points),
        ControlPointSequence=points,
        ReferencedPatientSetupNumber=1,
    )
    if one.blocks:
        beam.BlockSequence = [block_of(index + 1, block) for index, block in enumerate(one.blocks)]
    return beam


def block_of(number, block):
    return item(
        BlockNumber=number,
        BlockName=f"block {number}",
        BlockType="SHIELDING" if block.shields else "APERTURE",
        BlockDivergence="PRESENT",
        BlockMountingPosition="PATIENT_SIDE",
        SourceToBlockTrayDistance=text_of(10 * BLOCKS_CM),
        MaterialID="ALLOY",
        BlockThickness="75",
        BlockTransmission="0",
        BlockNumberOfPoints=len(block.outline),
        BlockData=[text_of(mm(value)) for point in block.outline for value in point],
    )


def plan_of(name, fields, machine, energy_mv):
    numbered = list(enumerate(fields, start=1))
    references = [
        item(
            ReferencedBeamNumber=number,
            BeamMeterset=text_of(one.meterset),
            # 1 cGy/MU.
            BeamDose=text_of(one.dose * one.meterset / 100),
            BeamDoseSpecificationPoint=[text_of(value) for value in position(one.point)],
        )
        for number, one in numbered
    ]
    group = item(
        FractionGroupNumber=1,
        NumberOfFractionsPlanned=1,
        NumberOfBeams=len(fields),
        NumberOfBrachyApplicationSetups=0,
        ReferencedBeamSequence=references,
    )
    return item(
        SOPClassUID="1.2.840.10008.5.1.4.1.1.481.5",
        SOPInstanceUID=f"{ROOT_UID}.{zlib.crc32(name.encode())}.1",
        StudyInstanceUID=f"{ROOT_UID}.1",
        SeriesInstanceUID=f"{ROOT_UID}.2",
        Modality="RTPLAN",
        Manufacturer="tests/external",
        PatientName="Nobody^Test",
        PatientID="T-0001",
        RTPlanLabel=name[:16],
        RTPlanDate="20260301",
        RTPlanTime="101112",
        RTPlanGeometry="PATIENT",
        FractionGroupSequence=[group],
        BeamSequence=[beam_of(number, one, machine, energy_mv) for number, one in numbered],
        PatientSetupSequence=[item(PatientSetupNumber=1, PatientPosition="HFS", SetupTechnique="ISOCENTRIC")],
        ApprovalStatus="APPROVED",
    )


def write_plans(folder, fields, machine, energy_mv=6.0, per_plan=20):
    """Writes the fields as beams of plans into a folder; a field's name must be its own."""
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    assert len({one.name for one in fields}) == len(fields), "two fields of one name"
    for index in range(math.ceil(len(fields) / per_plan)):
        some = fields[per_plan * index : per_plan * (index + 1)]
        name = f"fields {index:03}"
        write(folder / f"fields-{index:03}.dcm", plan_of(name, some, machine, energy_mv))
    return folder


# --------------------------------------------------------------------------- audit


def audit_fields(folder, fields, data, machine="CHECK-1"):
    """Writes model and plans into a folder, audits them, and gives the outcome of each field by its name."""
    folder = Path(folder)
    write_model(folder / "models/check", machine, data)
    write_plans(folder / "plans", fields, machine)
    out = folder / "report"
    ran = run_program("audit", folder / "plans", "--models", folder / "models", "--out", out, kill_after_seconds=600)
    assert ran.status in (0, 1, 3), f"exit status {ran.status}: {ran.err.strip()[-800:]}"
    found = {row["beam_name"]: outcome_of(row) for row in rows_of(out / "beams.csv")}
    missing = [one.name for one in fields if one.name not in found]
    assert not missing, f"{len(missing)} fields without a row, such as {missing[0]}"
    return found


def outcome_of(row):
    def number(column):
        return float(row[column]) if row[column] else None

    return Outcome(
        verdict=row["verdict"],
        reasons=row["reasons"],
        technique=row["technique"],
        method=row["method"],
        deviation_percent=number("deviation_percent"),
        independent_dose_gy=number("independent_dose_gy"),
    )

