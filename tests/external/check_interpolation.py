"""The program's look-ups against SciPy's on the shipped tables: monotone cubic
down the depths against PchipInterpolator, bilinear and linear ones against
RegularGridInterpolator. The program is asked for whole fields; the trace gives
the single factors.
"""

import csv
import json
import math
import random
import shutil

import numpy as np
from scipy.interpolate import PchipInterpolator, RegularGridInterpolator

from common import MODELS, WITHIN, INCOMPLETE, Checks, close, run_program, scratch

# Both sides work in doubles; SciPy sums the same products in another order.
RELATIVE = 1e-12


def table(path):
    """Rows, columns and values of a table, its comments left out."""
    with open(path, encoding="utf-8", newline="") as file:
        rows = [row for row in csv.reader(file) if row and not row[0].startswith("#")]
    columns = np.array([float(cell) for cell in rows[0][1:]])
    body = np.array([[float(cell) for cell in row] for row in rows[1:]])
    return body[:, 0], columns, body[:, 1:]


def output_factors(path):
    with open(path, encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
    return {key: np.array([float(row[key]) for row in rows]) for key in ("side_cm", "sc", "sp")}


def bilinear(rows, columns, values):
    look_up = RegularGridInterpolator((rows, columns), values, method="linear", bounds_error=True)
    return lambda row, column: look_up([[row, column]])[0]


def monotone_cubic(rows, columns, values):
    """Cubic down each column, linear across."""
    curves = PchipInterpolator(rows, values, axis=0, extrapolate=False)
    return lambda row, column: np.interp(column, columns, curves(row))


def linear(name):
    return lambda factors: lambda side: np.interp(side, factors["side_cm"], factors[name])


def field(*arguments, models=MODELS):
    """The factors and the inputs of a field's trace."""
    ran = run_program("field", *arguments, "--dose", "1", "--models", models, "--json")
    # Near a field edge or above the maximum the factors stand all the same, with status 3.
    ran.assert_status(WITHIN, INCOMPLETE)
    trace = json.loads(ran.out)
    factors = {factor["name"]: factor["value"] for factor in trace["factors"]}
    return factors, {one["symbol"]: one["value"] for one in trace["inputs"]}


def places(rows, columns, count, seed):
    """Depths and sides: on grid lines, at the table's ends and in between."""
    dice = random.Random(seed)
    out = [(rows[0], columns[0]), (rows[-1], columns[-1]), (rows[3], columns[2]), (rows[1], columns[-1])]
    for _ in range(count):
        row = dice.uniform(rows[0], min(rows[-1], 12.0) if dice.random() < 0.6 else rows[-1])
        out.append((row, dice.uniform(columns[0], columns[-1])))
    return [(round(float(row), 3), round(float(column), 3)) for row, column in out]


def check_tpr(machine, folder, kind, seed, models=MODELS):
    """Isocentric squares: the equivalent square at the point's plane is the side itself."""
    grid = table(models / folder / "tpr.csv")
    expected = kind(*grid)
    for depth, side in places(grid[0], grid[1], 80, seed):
        factors, inputs = field("--machine", machine, "--energy", folder.split("/")[1], "--square", side,
                                "--depth", depth, models=models)
        close(f"s_d at {depth}, {side}", inputs["s_d"], side, 1e-9)
        value = expected(depth, side)
        close(f"TPR at {depth} cm, {side} cm", factors["tissue_phantom_ratio"], value, RELATIVE * value)


def check_pdd(energy, folder, kind, renormalised_at, seed):
    """Fixed SSD equal to the table's: side at the surface; 1 at the normalisation depth."""
    rows, columns, values = table(MODELS / folder / "pdd.csv")
    values = values / 100
    if renormalised_at is not None:
        (row,) = np.flatnonzero(rows == renormalised_at)
        values = values / values[row]
    expected = kind(rows, columns, values)
    # Sp is looked up at the plane of d0 (10 cm deep at most), whose side must lie in its table too.
    within = columns * 1.1 <= columns[-1]
    for depth, side in places(rows, columns[within], 80, seed):
        factors, _ = field("--machine", "SORREL", "--energy", energy, "--square", side, "--sides-at", "surface",
                           "--ssd", 100, "--depth", depth)
        value = expected(depth, side)
        close(f"PDD at {depth} cm, {side} cm", factors["percent_depth_dose"], value, 1e-10)


def check_output(machine, energy, folder, exchange, seed):
    """Sc by the jaws' square with collimator exchange (1 + k) L U / (k L + U), Sp by the square of the plane."""
    factors_of = output_factors(MODELS / folder / "output.csv")
    sc, sp = linear("sc")(factors_of), linear("sp")(factors_of)
    dice = random.Random(seed)
    for _ in range(40):
        x, y = round(dice.uniform(4, 39), 2), round(dice.uniform(4, 39), 2)
        factors, inputs = field("--machine", machine, "--energy", energy, "--x", x, "--y", y, "--depth", 10)
        upper, lower = y, x  # Y jaws are the upper ones of both shipped machines
        collimator = (1 + exchange) * lower * upper / (exchange * lower + upper)
        phantom = 2 * x * y / (x + y)
        close("c", inputs["c"], collimator, 1e-9)
        close("s_d", inputs["s_d"], phantom, 1e-9)
        close(f"Sc of {x} x {y}", factors["collimator_scatter"], sc(collimator), 1e-12)
        close(f"Sp of {x} x {y}", factors["phantom_scatter"], sp(phantom), 1e-12)


def check_off_axis(machine, energy, folder, in_air, seed):
    """In-air tables by the depth along the ray, in-water ones by the depth below the surface."""
    grid = table(MODELS / folder / "off-axis.csv")
    expected = bilinear(*grid)
    dice = random.Random(seed)
    for _ in range(40):
        x, y = round(dice.uniform(-14, 14), 2), round(dice.uniform(-14, 14), 2)
        depth = round(dice.uniform(3, 35), 2)
        factors, _ = field("--machine", machine, "--energy", energy, "--square", 34, "--depth", depth,
                           f"--point={x},{y}")
        radius = math.hypot(x, y)
        row_depth = depth * math.hypot(1, radius / 100) if in_air else depth
        close(f"OAR at {x}, {y}, depth {depth}", factors["off_axis_ratio"], expected(radius, row_depth), 1e-12)


def check_beyond_table():
    """Outside the table there is no number and no exit status of success."""
    for depth, side in ((40.5, 10), (10, 2.9), (10, 40.4)):
        ran = run_program("field", "--machine", "ROWAN-1", "--energy", "6", "--square", side, "--depth", depth,
                          "--dose", "1", "--models", MODELS)
        assert ran.status in (2, 3), f"{depth} cm, {side} cm: exit status {ran.status}"
        assert "MU for" not in ran.out, f"{depth} cm, {side} cm: {ran.out}"


def with_interpolation(word):
    """The first beam of the first machine with another interpolation named."""
    folder = scratch("interpolation")
    shutil.copytree(MODELS / "rowan", folder / "rowan")
    file = folder / "rowan/machine.toml"
    text = file.read_text(encoding="utf-8")
    before = 'interpolation = "linear" '
    assert text.count(before) == 1, "the first machine no longer names its interpolation as it did"
    file.write_text(text.replace(before, f'interpolation = "{word}" '), encoding="utf-8")
    return folder


def main():
    checks = Checks()
    cubic = with_interpolation("monotone-cubic")
    checks.run("interpolation: rowan 6 TPR, bilinear", check_tpr, "ROWAN-1", "rowan/6", bilinear, 1)
    checks.run("interpolation: rowan 18 TPR, monotone cubic", check_tpr, "ROWAN-1", "rowan/18", monotone_cubic, 2)
    checks.run("interpolation: rowan 6 TPR, made monotone cubic", check_tpr, "ROWAN-1", "rowan/6", monotone_cubic, 3, cubic)
    checks.run("interpolation: sorrel 6 PDD, monotone cubic", check_pdd, "6", "sorrel/6", monotone_cubic, None, 4)
    checks.run("interpolation: sorrel 6-FFF PDD, bilinear, renormalised", check_pdd, "6-FFF", "sorrel/6-fff", bilinear, 10.0, 5)
    checks.run("interpolation: rowan 6 output factors", check_output, "ROWAN-2", "6", "rowan/6", 1.6, 6)
    checks.run("interpolation: rowan 18 output factors", check_output, "ROWAN-1", "18", "rowan/18", 1.6, 7)
    checks.run("interpolation: rowan 6 off axis", check_off_axis, "ROWAN-1", "6", "rowan/6", True, 8)
    checks.run("interpolation: rowan 18 off axis", check_off_axis, "ROWAN-1", "18", "rowan/18", True, 9)
    checks.run("interpolation: sorrel 6 off axis, in water", check_off_axis, "SORREL", "6", "sorrel/6", False, 10)
    checks.run("interpolation: sorrel 6-FFF off axis", check_off_axis, "SORREL", "6-FFF", "sorrel/6-fff", True, 11)
    checks.run("interpolation: nothing beyond the tables", check_beyond_table)
    checks.finish()


if __name__ == "__main__":
    main()
