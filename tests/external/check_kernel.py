"""The shipped depth tables and phantom scatter factors against an independent
evaluation of the published pencil kernel (Nyholm, Olofsson, Ahnesjo, Karlsson
2006, Radiother Oncol 78:347-351), whose coefficients stand in
`beam-models/kernel.csv`:

    p(r, d) = (A exp(-a r) + B exp(-b r)) / r

integrated over the square by SciPy, in polar coordinates and by parts of the
radius. Only from 10 cm on, where the invented build-up has died away.
"""

import csv
import importlib.util
import math

import numpy as np
from scipy.integrate import dblquad

from check_interpolation import output_factors, table
from common import MODELS, Checks, close


def coefficients():
    with open(MODELS / "kernel.csv", encoding="ascii", newline="") as file:
        rows = [row for row in csv.reader(file) if not row[0].startswith("#")]
    return {row[0]: np.array([float(cell) for cell in row[1:]]) for row in rows[1:]}


COEFFICIENTS = coefficients()


def parameters(quality):
    return {name: float(np.polynomial.Polynomial(row)(quality)) for name, row in COEFFICIENTS.items()}


def square_dose(quality, depth, side):
    """Dose on the axis of a square field, per unit fluence."""
    p = parameters(quality)

    def rise(scale, inner, middle=0.0):
        return scale * (1 - math.exp(inner * math.hypot(depth, middle)))

    share_a = rise(p["A1"], p["A2"], p["A5"]) * math.exp(p["A3"] * depth + p["A4"] * depth * depth)
    share_b = rise(p["B1"], p["B2"], p["B5"]) * math.exp(p["B3"] * depth + p["B4"] * depth * depth)
    a = p["a2"] + p["a1"] * depth
    b = rise(p["b1"], p["b2"], p["b5"]) * math.exp(p["b3"] * depth + p["b4"] * depth * depth)

    # Dose = integral of p r dr d(angle) over the square: eight times the sector from 0 to 45 degrees.
    def density(r, _):
        return share_a * a * math.exp(-a * r) + share_b * b * math.exp(-b * r)

    def edge(angle):
        return side / 2 / math.cos(angle)

    near, _ = dblquad(density, 0, math.pi / 4, 0, lambda angle: min(1.5, edge(angle)), epsabs=1e-13, epsrel=1e-9)
    far, _ = dblquad(density, 0, math.pi / 4, lambda angle: min(1.5, edge(angle)), edge, epsabs=1e-13, epsrel=1e-9)
    return 8 * (near + far)


def beams():
    """Name and TPR20,10 that make.py puts into the kernel for each beam: the one number taken from it."""
    spec = importlib.util.spec_from_file_location("make", MODELS / "make.py")
    make = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(make)
    return {name: beam["q"] for name, beam in make.BEAMS.items()}


def check_evaluation():
    """Values computed elsewhere from the published coefficients, TPR20,10 0.68, depth 10 cm."""
    close("10 x 10", square_dose(0.68, 10, 10), 0.0195167, 1e-7)


def cells(rows, columns):
    for depth in rows[rows >= 10]:
        for side in columns[::2]:
            yield float(depth), float(side)


# Tables are rounded to the fourth decimal of a ratio near 1, or to 0.01 of a per cent; and the build-up
# term still differs from 1 by a few 1e-5 at 10 cm, in the value and in what it is divided by.
ROUNDING = 1.5e-4


def check_tpr(name, quality):
    rows, columns, values = table(MODELS / name / "tpr.csv")
    worst = 0.0
    for depth, side in cells(rows, columns):
        found = values[list(rows).index(depth), list(columns).index(side)]
        expected = square_dose(quality, depth, side) / square_dose(quality, 10, side)
        worst = max(worst, abs(found - expected))
    assert worst <= ROUNDING, f"largest difference {worst:.6f}"


def check_pdd(name, quality, ssd=100.0):
    rows, columns, values = table(MODELS / name / "pdd.csv")

    def at(depth, side):
        return square_dose(quality, depth, side * (ssd + depth) / ssd) / (ssd + depth) ** 2

    worst = 0.0
    tenth = list(rows).index(10.0)
    for depth, side in cells(rows, columns):
        column = list(columns).index(side)
        found = values[list(rows).index(depth), column] / values[tenth, column]
        worst = max(worst, abs(found - at(depth, side) / at(10, side)))
    assert worst <= 2 * ROUNDING, f"largest difference {worst:.6f}"


def check_sp(name, quality):
    factors = output_factors(MODELS / name / "output.csv")
    ten = square_dose(quality, 10, 10)
    for side, found in zip(factors["side_cm"], factors["sp"]):
        close(f"Sp of side {side}", found, square_dose(quality, 10, side) / ten, ROUNDING)


def main():
    checks = Checks()
    checks.run("kernel: the evaluation itself", check_evaluation)
    for name, quality in beams().items():
        is_tpr = (MODELS / name / "tpr.csv").exists()
        checks.run(f"kernel: {name} depth table", check_tpr if is_tpr else check_pdd, name, quality)
        # Sp of a model normalised at its maximum lies in the build-up, where the kernel does not hold.
        if name != "sorrel/6":
            checks.run(f"kernel: {name} phantom scatter", check_sp, name, quality)
    checks.finish()


if __name__ == "__main__":
    main()
