#!/usr/bin/env python3
"""Reference values of monotone cubic interpolation, from SciPy's PchipInterpolator.

    python3 check_pchip_values.py           compares tests/data/interpolation/pchip.csv with SciPy, exit status 1 when it differs
    python3 check_pchip_values.py --write   writes that file anew

The file holds, for each case, the knots (x, y) and values between them. The test suite holds the program against it, so that its
expected numbers come from SciPy and not from the program. Needs numpy and scipy.
"""

import csv
import sys
from pathlib import Path

import numpy as np
from scipy.interpolate import PchipInterpolator

FILE = Path(__file__).resolve().parents[1] / "data" / "interpolation" / "pchip.csv"
HEADER = "# Monotone cubic interpolation by scipy.interpolate.PchipInterpolator; written by tests/external/check_pchip_values.py.\n"


def cases():
    """Knots of each case: a depth dose with its maximum, uneven steps, a flat piece, turns, two and three knots, random ones."""
    depths = [0, 0.5, 1, 1.3, 1.5, 1.7, 2, 3, 5, 8, 12, 20, 30]
    yield "depth-dose", depths, [100 * np.exp(-0.047 * d) * (1 - 0.5 * np.exp(-2 * d)) for d in depths]
    yield "uneven", [0, 1, 1.1, 4, 9, 9.5], [0, 1, 1.5, 2, 2.1, 5]
    yield "flat", [0, 1, 2, 3, 4], [1, 1, 1, 2, 2]
    yield "turns", [0, 1, 2, 3, 4, 5], [0, 2, -1, 3, 3, -4]
    yield "steep-start", [0, 1, 3, 4], [0, 10, 10.5, 9]
    yield "three", [0, 2, 3], [5, 1, 0.5]
    yield "two", [1, 4], [2, -7]
    random = np.random.default_rng(20261102)
    for index in range(5):
        yield f"random-{index}", np.cumsum(random.uniform(0.1, 5, 9)).round(3), random.uniform(-10, 10, 9).round(3)


def rows():
    for name, xs, ys in cases():
        yield from ((name, "knot", repr(float(x)), repr(float(y))) for x, y in zip(xs, ys))
        curve = PchipInterpolator(np.asarray(xs, float), np.asarray(ys, float))
        for low, high in zip(xs, xs[1:]):
            for share in (0.1, 0.37, 0.5, 0.9):
                x = float(low + share * (high - low))
                yield name, "value", repr(x), repr(float(curve(x)))


def main():
    if "--write" in sys.argv[1:]:
        with open(FILE, "w", encoding="ascii", newline="") as file:
            file.write(HEADER)
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(["case", "kind", "x", "y"])
            writer.writerows(rows())
        return 0
    with open(FILE, encoding="ascii", newline="") as file:
        committed = [row for row in csv.reader(file) if not row[0].startswith("#")][1:]
    fresh = list(rows())
    if len(committed) != len(fresh):
        print(f"FAIL pchip: {FILE.name}: {len(committed)} rows, SciPy makes {len(fresh)}")
        return 1
    worst = 0.0
    for old, new in zip(committed, fresh):
        if old[:2] != list(new[:2]):
            print(f"FAIL pchip: {FILE.name}: {old} where SciPy makes {new}")
            return 1
        worst = max(worst, *(abs(float(a) - float(b)) for a, b in zip(old[2:], new[2:])))
    good = worst < 1e-9
    print(f"{'ok' if good else 'FAIL'} pchip: {len(fresh)} rows, largest difference from SciPy {worst:.1e}")
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main())
