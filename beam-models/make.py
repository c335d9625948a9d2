#!/usr/bin/env python3
"""Makes the tables of the two invented machines in this folder.

    python3 make.py            writes rowan/*/*.csv and sorrel/*/*.csv beside this file
    python3 make.py FOLDER     writes them below FOLDER instead

Needs numpy and nothing else; knows nothing of the program that reads the tables. What is published and what is
invented is told in README.md. The machine.toml files are written by hand and are not touched.

Lengths are cm, angles radians unless a name says otherwise.
"""

import csv
import math
import sys
from pathlib import Path

import numpy as np

HERE = Path(__file__).resolve().parent

SIDES = [3, 4, 5, 6, 8, 10, 12, 15, 20, 25, 30, 35, 40]
DEEP = [*range(5, 20), *range(20, 42, 2)]
OFF_AXIS_RADII = [0, 1, 2, 3, 4, 5, 6, 8, 10, 12, 14, 16, 18, 20, 22, 24]
KERNEL_DEPTH = 10.0  # where the kernel's phantom scatter factors are looked at in the literature

# One entry per beam; every number here but the kernel is invented, chosen near common values of the trade.
#   q            TPR20,10 put into the kernel (the kernel gives back a slightly smaller one)
#   d_max        depth of maximum at 5x5 and its change per cm of side
#   surface      share of build-up missing at the surface at 10x10, and its change per cm of side
#   join         depth from which the kernel is taken as it is; above it its logarithm goes on as a straight line
#   sc           extra-focal share, its Gaussian radius at the isocentre plane, monitor backscatter per cm of side
#   horn         primary in-air ratio off axis: see horn()
#   mu           effective attenuation of the primary on the axis, per cm: drives the softening off axis
BEAMS = {
    "rowan/6": dict(q=0.6774, d0=10.0, d_max=(1.6, 0.0), surface=(0.50, 0.0075), join=3.0,
                    sc=(0.060, 6.5, 0.00035), horn=("flat", 0.048, 8.0), mu=0.0480,
                    shallow=[0, 0.3, 0.6, 0.9, 1.2, 1.3, 1.4, 1.5, 1.6, 1.8, 2, 2.5, 3, 3.5, 4],
                    table="tpr", off_axis="in-air"),
    "rowan/18": dict(q=0.7807, d0=10.0, d_max=(3.8, 0.006), surface=(0.72, 0.0085), join=6.0,
                     sc=(0.058, 7.5, 0.00050), horn=("flat", 0.042, 6.5), mu=0.0300,
                     shallow=[0, 0.5, 1, 1.5, 2, 2.5, 2.8, 3, 3.2, 3.4, 3.6, 3.8, 4, 4.5],
                     table="tpr", off_axis="in-air"),
    "sorrel/6": dict(q=0.6735, d0=1.5, d_max=(1.5, 0.0), surface=(0.48, 0.0075), join=3.0,
                     sc=(0.055, 7.0, 0.00030), horn=("flat", 0.055, 9.0), mu=0.0490,
                     shallow=[0, 0.3, 0.6, 0.9, 1.2, 1.3, 1.4, 1.5, 1.6, 1.8, 2, 2.5, 3, 3.5, 4],
                     table="pdd", ssd=100.0, off_axis="in-water"),
    "sorrel/6-fff": dict(q=0.6495, d0=10.0, d_max=(1.3, 0.0), surface=(0.44, 0.0070), join=3.0,
                         sc=(0.022, 5.5, 0.00020), horn=("cone", 13.0, 1.25), mu=0.0530,
                         shallow=[0, 0.3, 0.6, 0.9, 1.2, 1.3, 1.4, 1.5, 1.6, 1.8, 2, 2.5, 3, 3.5, 4],
                         table="pdd at maximum", ssd=100.0, off_axis="in-air"),
}


# Wedges, all invented, near common values of the trade.
#   angle        nominal, degrees
#   factor       on the axis at 10 cm depth for 10 x 10
#   harder       growth of its logarithm per cm of depth (the wedge hardens the beam)
#   wider        growth of its logarithm per cm of side (scatter from the wedge)
#   reach        half width of the profile, cm; None for a dynamic wedge, which has a sweep instead
WEDGES = {
    "rowan/6": {"W15": dict(angle=15, factor=0.776, harder=0.0008, wider=0.0003, reach=15),
                "W30": dict(angle=30, factor=0.624, harder=0.0012, wider=0.0006, reach=15),
                "W45": dict(angle=45, factor=0.497, harder=0.0020, wider=0.0010, reach=12),
                "W60": dict(angle=60, factor=0.402, harder=0.0025, wider=0.0014, reach=10),
                "M60": dict(angle=60, factor=0.268, harder=0.0024, wider=0.0022, reach=15),
                "D60": dict(angle=60, reach=None)},
    "rowan/18": {"W15": dict(angle=15, factor=0.828, harder=0.0002, wider=0.0003, reach=15),
                 "W30": dict(angle=30, factor=0.701, harder=0.0003, wider=0.0006, reach=15),
                 "W45": dict(angle=45, factor=0.583, harder=0.0004, wider=0.0009, reach=12),
                 "W60": dict(angle=60, factor=0.481, harder=0.0005, wider=0.0013, reach=10),
                 "M60": dict(angle=60, factor=0.334, harder=0.0004, wider=0.0020, reach=15),
                 "D60": dict(angle=60, reach=None)},
}
WEDGE_SIDES = [4, 6, 8, 10, 12, 15, 20, 25]
WEDGE_DEPTHS = {"rowan/6": [1.5, 3, 5, 7.5, 10, 12.5, 15, 20, 25, 30, 35],
                "rowan/18": [3, 5, 7.5, 10, 12.5, 15, 20, 25, 30, 35]}
SWEEP = (-20.0, 9.5, 0.5)  # from, to, step of the moving jaw, positive towards the thin end


def read_kernel():
    with open(HERE / "kernel.csv", encoding="ascii", newline="") as file:
        rows = [row for row in csv.reader(file) if not row[0].startswith("#")]
    return {row[0]: [float(cell) for cell in row[1:]] for row in rows[1:]}


KERNEL = read_kernel()
GAUSS_X, GAUSS_W = np.polynomial.legendre.leggauss(48)


def kernel_terms(q, depth):
    """A/a, B/b, a, b of Nyholm et al. 2006 at a depth, per unit energy fluence."""
    p = {name: sum(c * q**power for power, c in enumerate(row)) for name, row in KERNEL.items()}
    big_a = (p["A1"] * (1 - math.exp(p["A2"] * math.sqrt(depth**2 + p["A5"] ** 2)))
             * math.exp(p["A3"] * depth + p["A4"] * depth**2))
    big_b = (p["B1"] * (1 - math.exp(p["B2"] * math.sqrt(depth**2 + p["B5"] ** 2)))
             * math.exp(p["B3"] * depth + p["B4"] * depth**2))
    a = p["a2"] + p["a1"] * depth
    b = (p["b1"] * (1 - math.exp(p["b2"] * math.sqrt(depth**2 + p["b5"] ** 2)))
         * math.exp(p["b3"] * depth + p["b4"] * depth**2))
    return big_a, big_b, a, b


def kernel_square(q, depth, side):
    """Kernel dose on the axis of a square field of this side at the depth, per unit fluence."""
    big_a, big_b, a, b = kernel_terms(q, depth)
    angle = math.pi / 8 * (GAUSS_X + 1)  # 0 to 45 degrees: an eighth of the square
    radius = side / 2 / np.cos(angle)
    ring = big_a * (1 - np.exp(-a * radius)) + big_b * (1 - np.exp(-b * radius))
    return 8 * math.pi / 8 * float(GAUSS_W @ ring)


def without_build_up(beam, depth, side):
    """Dose without build-up: the kernel beyond the join; above it the tangent of its logarithm (the kernel is not valid in the build-up)."""
    join = beam["join"]
    if depth >= join:
        return kernel_square(beam["q"], depth, side)
    step = 0.05
    at_join = math.log(kernel_square(beam["q"], join, side))
    beyond = math.log(kernel_square(beam["q"], join + step, side))
    return math.exp(at_join + (beyond - at_join) / step * (depth - join))


def build_up_rate(beam, side):
    """The rate of the build-up term that puts the maximum of the on-axis dose at d_max of this side.

    With D = exp(-m d) * (1 - c exp(-v d)) the maximum lies where m = (m + v) c exp(-v d). For a beam whose table is
    a PDD, m holds the fall by distance too, so that the maximum of the PDD, not of the TPR, lies at d_max.
    """
    d_max = beam["d_max"][0] + beam["d_max"][1] * (side - 5)
    missing = surface_missing(beam, side)
    attenuation = -math.log(without_build_up(beam, 1.0, side) / without_build_up(beam, 0.0, side))
    if "ssd" in beam:
        attenuation += 2 / (beam["ssd"] + d_max)
    low, high = 0.3, 20.0
    for _ in range(80):
        rate = (low + high) / 2
        if (attenuation + rate) * missing * math.exp(-rate * d_max) > attenuation:
            low = rate
        else:
            high = rate
    return (low + high) / 2


def surface_missing(beam, side):
    return beam["surface"][0] - beam["surface"][1] * (side - 10)


def dose(beam, depth, side):
    """On-axis dose at a depth in a phantom per unit in-air fluence at that depth; side at that depth."""
    build_up = 1 - surface_missing(beam, side) * math.exp(-build_up_rate(beam, side) * depth)
    return without_build_up(beam, depth, side) * build_up


def sp(beam, side):
    return dose(beam, beam["d0"], side) / dose(beam, beam["d0"], 10)


def sc(beam, side):
    """Extra-focal Gaussian seen through the opening, and a term linear in the side (monitor backscatter)."""
    share, radius, backscatter = beam["sc"]

    def output(s):
        return 1 + share * math.erf(s / 2 / radius) ** 2 + backscatter * s

    return output(side) / output(10)


def tpr(beam, depth, side):
    return dose(beam, depth, side) / dose(beam, beam["d0"], side)


def pdd(beam, depth, side):
    """Dose on the axis in per cent of that at d0; side at the surface, so the field widens with depth."""
    ssd, d0 = beam["ssd"], beam["d0"]
    here = dose(beam, depth, side * (ssd + depth) / ssd) / (ssd + depth) ** 2
    there = dose(beam, d0, side * (ssd + d0) / ssd) / (ssd + d0) ** 2
    return 100 * here / there


def horn(beam, radius):
    """In-air primary ratio in a plane across the axis at a radius at the isocentre plane."""
    kind, first, second = beam["horn"]
    if kind == "flat":  # rises to 1 + first with the Gaussian radius second
        return 1 + first * (1 - np.exp(-((radius / second) ** 2)))
    return 1 / (1 + (radius / first) ** 2) ** (second / 2)  # cone of a beam without flattening filter


def softening(beam, radius, depth):
    """Primary that is softer off the axis is attenuated more: Tailor et al. 1998, t in degrees off axis."""
    t = np.degrees(np.arctan(radius / 100))
    excess = 0.00181 * t + 0.00202 * t**2 - 0.0000942 * t**3
    return np.exp(-beam["mu"] * excess * depth)


def off_axis_in_air(beam, radius, depth):
    """`depth` along the ray."""
    return float(horn(beam, radius) * softening(beam, radius, depth))


def fluence_dose(beam, radius, depth):
    """Dose at a radius along the diagonal of a 40x40 field, from horn and kernel; `depth` below a flat surface."""
    big_a, big_b, a, b = kernel_terms(beam["q"], max(depth, beam["join"]))
    half = 20.0
    away = np.linspace(0, 70, 1401)
    away = (away[1:] + away[:-1]) / 2  # midpoints of 0.05 cm
    angle = (np.arange(180) + 0.5) * (2 * math.pi / 180)
    x = radius / math.sqrt(2) + away[:, None] * np.cos(angle)
    y = radius / math.sqrt(2) + away[:, None] * np.sin(angle)
    rho = np.hypot(x, y)
    fluence = np.where((np.abs(x) < half) & (np.abs(y) < half), horn(beam, rho), 0.0)
    fluence = fluence * softening(beam, rho, depth * np.hypot(1, rho / 100))
    weight = big_a * a * np.exp(-a * away) + big_b * b * np.exp(-b * away)
    # The short-range part is finer than the steps: normalise each part to what it must integrate to.
    weight *= (big_a + big_b) / (weight.sum())
    return float((weight[:, None] * fluence).sum())


def off_axis_in_water(beam, radius, depth):
    return fluence_dose(beam, radius, depth) / fluence_dose(beam, 0.0, depth)


def wedge_gradient(beam, angle):
    """Gradient of the logarithm of fluence along a wedge, per cm: attenuation with depth times tan(angle).

    A wedge of this angle tilts the isodoses by it where fluence across and dose with depth fall alike. The fall with
    depth is that of a 10 x 10 field about 10 cm deep, inverse square with the surface 90 cm from the source.
    """
    def along_depth(depth):
        return math.log(dose(beam, depth, 10 * (90 + depth) / 100) / (90 + depth) ** 2)

    return (along_depth(9) - along_depth(11)) / 2 * math.tan(math.radians(angle))


def wedge_factor(wedge, depth, side):
    return wedge["factor"] * math.exp(wedge["harder"] * (depth - 10) + wedge["wider"] * (side - 10))


def wedge_ratio(gradient, position):
    """Profile: exponential, a little less steep towards the thin end (less hardening there)."""
    return math.exp(gradient * position * (1 - 0.004 * position))


def write(path, comments, header, rows):
    path.parent.mkdir(parents=True, exist_ok=True)
    lines = [f"# {comment}" for comment in comments]
    lines += [",".join(str(cell) for cell in row) for row in [header, *rows]]
    path.write_text("\n".join(lines) + "\n", encoding="ascii", newline="\n")


INVENTED = "Invented demonstration data of no real machine, not for clinical use; made by make.py."


def write_beam(folder, name, beam):
    depths = [*beam["shallow"], *DEEP]
    if beam["table"] == "tpr":
        write(folder / name / "tpr.csv",
              [INVENTED, "TPR, 1 at 10 cm; depth_cm down, side of the square at the point in cm across."],
              ["depth_cm", *SIDES],
              [[d, *(f"{tpr(beam, d, s):.4f}" for s in SIDES)] for d in depths])
    else:
        fields = [[pdd(beam, d, s) for s in SIDES] for d in depths]
        what = f"PDD at SSD {beam['ssd']:g} cm, 100 at {beam['d0']:g} cm"
        if beam["table"] == "pdd at maximum":
            fields = [[100 * cell / top for cell, top in zip(row, map(max, zip(*fields)))] for row in fields]
            what = f"PDD at SSD {beam['ssd']:g} cm, 100 at each side's maximum"
        write(folder / name / "pdd.csv",
              [INVENTED, what + "; depth_cm down, side of the square at the surface in cm across."],
              ["depth_cm", *SIDES],
              [[d, *(f"{cell:.2f}" for cell in row)] for d, row in zip(depths, fields)])
    write(folder / name / "output.csv",
          [INVENTED, f"Sc by side at the isocentre plane; Sp by side at {beam['d0']:g} cm depth; both 1 at 10."],
          ["side_cm", "sc", "sp"],
          [[s, f"{sc(beam, s):.4f}", f"{sp(beam, s):.4f}"] for s in SIDES])
    if beam["off_axis"] == "in-air":
        across, ratio = [0, 2, 5, 10, 15, 20, 25, 30, 35, 40], off_axis_in_air
        what = "In-air primary ratio with softening; radius_cm at the isocentre plane down, depth along the ray in cm across."
    else:
        across, ratio = [1.5, 3, 5, 7.5, 10, 15, 20, 25, 30, 35, 40], off_axis_in_water
        what = "Ratio in a flat water phantom, diagonal of 40x40; radius_cm at the isocentre plane down, depth in cm across."
    write(folder / name / "off-axis.csv", [INVENTED, what], ["radius_cm", *across],
          [[r, *(f"{ratio(beam, r, d):.4f}" for d in across)] for r in OFF_AXIS_RADII])


def write_wedges(folder, name, beam):
    for wedge_id, wedge in WEDGES.get(name, {}).items():
        gradient = wedge_gradient(beam, wedge["angle"])
        path = folder / name / f"wedge-{wedge_id}"
        if wedge["reach"] is None:
            start, stop, step = SWEEP
            places = [start + step * index for index in range(round((stop - start) / step) + 1)]
            write(path.with_name(path.name + "-segments.csv"),
                  [INVENTED, "Sweep of one jaw: share of the meterset delivered when it passes position_cm (isocentre plane, positive"
                   " towards the thin end); the first share comes with the jaw at rest."],
                  ["position_cm", "cumulative_meterset"],
                  [[f"{place:g}", f"{math.exp(gradient * (place - stop)):.5f}"] for place in places])
            continue
        write(path.with_name(path.name + ".csv"),
              [INVENTED, "Wedge factor on the axis; depth_cm down, side of the square at the point in cm across."],
              ["depth_cm", *WEDGE_SIDES],
              [[d, *(f"{wedge_factor(wedge, d, s):.4f}" for s in WEDGE_SIDES)] for d in WEDGE_DEPTHS[name]])
        write(path.with_name(path.name + "-profile.csv"),
              [INVENTED, "Fluence along the wedge at the isocentre plane, 1 on the axis; positions towards the thin end are positive."],
              ["position_cm", "ratio"],
              [[x, f"{wedge_ratio(gradient, x):.4f}"] for x in range(-wedge["reach"], wedge["reach"] + 1)])


def main():
    folder = Path(sys.argv[1]) if len(sys.argv) > 1 else HERE
    for name, beam in BEAMS.items():
        write_beam(folder, name, beam)
        write_wedges(folder, name, beam)


if __name__ == "__main__":
    main()
