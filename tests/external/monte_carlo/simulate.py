"""Monte Carlo of square and shaped photon fields in a water box, with the PyPI
package `ompmc`, as reference data for the scatter integration of the program.

    python simulate.py run     --out WORK [--minutes 60] [--threads 2]
    python simulate.py reduce  --out WORK
    python simulate.py edge

`run` simulates and may be stopped and started again: it continues with the
replicas that WORK does not hold yet. `reduce` makes the CSV files beside this
script. `edge` simulates the profile across one field edge and writes it beside
this script. README.md says the rest.

What is simulated, cm: a point source at z = -90, water from z = 0 to 40 and
60 x 60 across, isocentre at z = 10. No head, so no head scatter, sharp edges.
The fluence is uniform in the isocentre plane: the same number of photons for
every cm2 of a plane across the axis. Collision kerma in air off the axis is
therefore 1/cos(angle of the ray) of that on the axis, and the in-air off-axis
ratio is sqrt(1 + (r/100)^2) with r in the isocentre plane; the spectrum is
the same everywhere.

How: the isocentre plane is cut into small rectangles (beamlets), the dose
of each in the scoring voxels is simulated per incident photon, and a field is
the sum of its beamlets, each by its area: dose is additive, and no field is
approximated. Beamlets near a scoring point get many more histories than those
that reach it by scatter alone. Geometry, fluence and box are unchanged by the
eight symmetries of the square, so that every beamlet and voxel is averaged
with its mirror images, weighted by their histories. Everything is done in
independent replicas, from which all errors are estimated.
"""

import argparse
import contextlib
import csv
import ctypes
import datetime
import itertools
import os
import sys
import time
from pathlib import Path

import numpy as np

HERE = Path(__file__).resolve().parent

# ------------------------------------------------------------------ geometry, cm

SSD, ISOCENTRE_DEPTH = 90.0, 10.0
SAD = SSD + ISOCENTRE_DEPTH
BOX_HALF, BOX_DEPTH = 30.0, 40.0
MEDIUM = "H2O700ICRU"

# Beamlet boundaries in the isocentre plane, the same along x and y.
POSITIVE = [0.5, 1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 7.0, 7.5, 8.0, 9.0, 10.0, 11.0, 12.0, 13.0, 14.0, 15.0]
LINES = np.array([-line for line in reversed(POSITIVE)] + [0.0] + POSITIVE)

# Scoring columns: 1 x 1 cm across, 1 cm slabs whose middles are whole depths.
POINTS = {"axis": (0.0, 0.0), "beside": (6.0, 0.0), "oblique": (8.0, -6.0)}
VOXEL_HALF = 0.5
LATERAL = np.array([-BOX_HALF, -8.5, -7.5, -6.5, -5.5, -0.5, 0.5, 5.5, 6.5, 7.5, 8.5, BOX_HALF])
SLABS = np.concatenate([[0.0], np.arange(1.5, 28.0), [BOX_DEPTH]])
DEPTHS = np.arange(2, 28)

# ------------------------------------------------------------------ fields

SQUARES = [3, 4, 6, 8, 10, 15, 20, 30]
REFERENCE_SIDE, REFERENCE_DEPTH = 10, 10
TABLE_DEPTHS = [3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15, 16, 18, 20, 22, 25]
APERTURE_DEPTHS = [5, 10, 20]

# Rectangles (x1, x2, y1, y2) in the isocentre plane, by segment with its weight. At every depth and in every
# segment the point is 1 cm or more from an edge, in its own plane.
APERTURES = {
    "rectangle 5x20": ("axis", [(1.0, [(-2.5, 2.5, -10, 10)])]),
    "rectangle 20x4": ("axis", [(1.0, [(-10, 10, -2, 2)])]),
    "corner of a 16x16": ("axis", [(1.0, [(-2, 14, -2, 14)])]),
    "L shape": ("axis", [(1.0, [(-2, 4, 3, 12), (-2, 9, -2, 3)])]),
    "comb": (
        "axis",
        [(1.0, [(-7, 7, y, y + 1) for y in (-8, -6, -4, 3, 5, 7)] + [(-7, 7, -2, 2)])],
    ),
    "comb across": (
        "axis",
        [(1.0, [(-10, 10, y, y + 1) for y in (-9, -7, -5, -3)] + [(-2, 3, -2, 2), (-10, 10, 4, 10)])],
    ),
    "two segments": ("axis", [(0.7, [(-3, 3, -8, 8)]), (0.3, [(2, 9, -6, 6)])]),
    "blocked centre": (
        "beside",
        [(1.0, [(-9, 9, -9, -3), (-9, 9, 3, 9), (-9, -3, -3, 3), (3, 9, -3, 3)])],
    ),
    "4x4 off axis": ("beside", [(1.0, [(4, 8, -2, 2)])]),
    "off-axis rectangle": ("oblique", [(1.0, [(3, 12, -9, -3)])]),
    "large, point off axis": ("oblique", [(1.0, [(-5, 11, -11, 5)])]),
}

# ------------------------------------------------------------------ smoothing along depth

FIT_DEGREE, FIT_FROM, FIT_TO = 4, 3, 26

# ------------------------------------------------------------------ histories

# Histories in one replica for a cm2 of the isocentre plane, by the gap (cm, in that plane) between a beamlet and the
# projection of a scoring column: each point asks, the largest demand counts. A negative gap is an overlap.
GAPS = [-0.25, 0.05, 0.6, 2.0, 5.0, 9.0, np.inf]
DENSITY = {
    "axis": [1_000_000, 400_000, 100_000, 35_000, 10_000, 3_000, 1_600],
    "beside": [400_000, 160_000, 50_000, 20_000, 6_000, 2_000, 1_600],
    "oblique": [400_000, 160_000, 50_000, 20_000, 6_000, 2_000, 1_600],
}
SEED = 20_260
# Electrons below this total energy, MeV, that cannot leave their voxel end there.
ESAVE = 1.5
EDGE_HISTORIES = 5_000_000


def beamlets():
    """All beamlets (x1, x2, y1, y2), by row the same order everywhere."""
    spans = list(zip(LINES[:-1], LINES[1:]))
    return np.array([(x1, x2, y1, y2) for (y1, y2), (x1, x2) in itertools.product(spans, spans)])


def demand(cells):
    """Histories for a cm2 of each beamlet in one replica."""
    found = np.zeros(len(cells))
    for name, point in POINTS.items():
        depths = (TABLE_DEPTHS[0] - 0.5, TABLE_DEPTHS[-1] + 0.5) if name == "axis" else (4.5, 20.5)
        gap = np.full(len(cells), -np.inf)
        for axis in (0, 1):
            ends = [
                (point[axis] + side * VOXEL_HALF) * SAD / (SSD + depth)
                for side in (-1, 1)
                for depth in depths
            ]
            low, high = cells[:, 2 * axis], cells[:, 2 * axis + 1]
            gap = np.maximum(gap, np.maximum(min(ends) - high, low - max(ends)))
        found = np.maximum(found, np.array(DENSITY[name])[np.searchsorted(GAPS, gap)])
    return found


def area(cells):
    return (cells[:, 1] - cells[:, 0]) * (cells[:, 3] - cells[:, 2])


# ------------------------------------------------------------------ simulation


@contextlib.contextmanager
def quiet():
    """The engine prints from C; what it prints goes nowhere."""
    sys.stdout.flush()
    kept, null = (os.dup(1), os.dup(2)), os.open(os.devnull, os.O_WRONLY)
    os.dup2(null, 1)
    os.dup2(null, 2)
    try:
        yield
    finally:
        ctypes.CDLL(None).fflush(None)
        for stream in (0, 1):
            os.dup2(kept[stream], stream + 1)
            os.close(kept[stream])
        os.close(null)


def box(ompmc, density=1.0):
    shape = (len(LATERAL) - 1, len(LATERAL) - 1, len(SLABS) - 1)
    return ompmc.Geometry(
        LATERAL,
        LATERAL,
        SLABS,
        [MEDIUM],
        np.full(shape, density, order="F"),
        np.ones(shape, dtype=np.int32, order="F"),
    )


def source_of(ompmc, cells):
    count = len(cells)
    corner = np.column_stack([cells[:, 0], cells[:, 2], np.full(count, ISOCENTRE_DEPTH)])
    side_x = np.column_stack([cells[:, 1] - cells[:, 0], np.zeros(count), np.zeros(count)])
    side_y = np.column_stack([np.zeros(count), cells[:, 3] - cells[:, 2], np.zeros(count)])
    return ompmc.BeamletSource(np.zeros(count, dtype=np.int32), [[0.0, 0.0, -SSD]], corner, side_x, side_y)


def voxels():
    """For each scoring point and each of its eight images: the indices of the voxels of its column."""
    shape = (len(LATERAL) - 1, len(LATERAL) - 1, len(SLABS) - 1)
    middles = (LATERAL[:-1] + LATERAL[1:]) / 2
    first = int(np.searchsorted(SLABS, DEPTHS[0] - 0.5))
    found = {}
    for name, point in POINTS.items():
        for image in range(8):
            x, y = moved(image, *point)
            at = [int(np.argmin(abs(middles - value))) for value in (x, y)]
            assert abs(middles[at[0]] - x) < 1e-9 and abs(middles[at[1]] - y) < 1e-9
            found[name, image] = np.array(
                [np.ravel_multi_index((*at, first + slab), shape, order="F") for slab in range(len(DEPTHS))]
            )
    return found


def moved(image, x, y):
    """One of the eight symmetries of the square."""
    if image & 4:
        x, y = y, x
    return (-x if image & 1 else x, -y if image & 2 else y)


def images_of(cells):
    """For each symmetry, the index of each beamlet's image."""
    index = {tuple(np.round(cell, 6)): number for number, cell in enumerate(cells)}
    found = []
    for image in range(8):
        first = np.array([moved(image, x, y) for x, y in cells[:, [0, 2]]])
        second = np.array([moved(image, x, y) for x, y in cells[:, [1, 3]]])
        low, high = np.minimum(first, second) + 0.0, np.maximum(first, second) + 0.0
        found.append(
            np.array([index[tuple(np.round((a[0], b[0], a[1], b[1]), 6) + 0.0)] for a, b in zip(low, high)])
        )
    return found


def replica(ompmc, number):
    """Dose per incident photon, Gy, by scoring point, beamlet and depth; images averaged by their histories."""
    cells = beamlets()
    density = demand(cells)
    columns = voxels()
    wanted = np.unique(np.concatenate(list(columns.values())))
    dose = np.zeros((len(wanted), len(cells)))
    histories = np.zeros(len(cells))
    groups = sorted(set(zip(density, np.round(area(cells), 6))), reverse=True)
    for group, (of_density, of_area) in enumerate(groups):
        some = np.flatnonzero((density == of_density) & (abs(area(cells) - of_area) < 1e-6))
        with quiet():
            matrix = ompmc.calc_dij(
                box(ompmc),
                source_of(ompmc, cells[some]),
                ompmc.Spectrum.default(),
                ompmc.Physics(n_split=1, esave=ESAVE, seeds=(SEED + number, 1 + group)),
                n_histories=int(round(of_density * of_area)),
                n_batches=2,
                rel_dose_threshold=0.0,
            )
        dose[:, some] = matrix.tocsr()[wanted].toarray()
        histories[some] = int(round(of_density * of_area))
    place = {voxel: row for row, voxel in enumerate(wanted)}
    images = images_of(cells)
    weights = np.array([histories[image] for image in images])
    folded = np.zeros((len(POINTS), len(cells), len(DEPTHS)))
    for index, name in enumerate(POINTS):
        for image in range(8):
            rows = [place[voxel] for voxel in columns[name, image]]
            folded[index] += weights[image][:, None] * dose[np.ix_(rows, images[image])].T
        folded[index] /= weights.sum(axis=0)[:, None]
    return folded, histories.sum()


def run(out, minutes, threads, replicas):
    os.environ["OMP_NUM_THREADS"] = str(threads)
    import ompmc

    out.mkdir(parents=True, exist_ok=True)
    began, spent = time.monotonic(), []
    for number in range(replicas):
        path = out / f"replica-{number:03}.npz"
        if path.exists():
            continue
        if time.monotonic() - began + (max(spent) if spent else 0) > 60 * minutes:
            break
        start = time.monotonic()
        dose, histories = replica(ompmc, number)
        spent.append(time.monotonic() - start)
        partial = path.with_suffix(".part")
        with open(partial, "wb") as file:
            np.savez_compressed(
                file,
                dose=dose,
                histories=histories,
                seconds=spent[-1],
                density=str(DENSITY),
                seed=SEED,
                version=ompmc.__version__,
            )
        partial.rename(path)
        print(f"replica {number}: {histories:.3g} histories in {spent[-1]:.0f} s", flush=True)


def edge(threads):
    """Profile across the edge at x = 5 of a field 0 to 5 by -4 to 4 cm, at isocentre depth: for the penumbra."""
    os.environ["OMP_NUM_THREADS"] = str(threads)
    import ompmc

    lines = np.round(np.arange(3.5, 6.55, 0.1), 6)
    across = np.concatenate([[-BOX_HALF], lines, [BOX_HALF]])
    along = np.array([-BOX_HALF, -3.0, 3.0, BOX_HALF])
    down = np.array([0.0, ISOCENTRE_DEPTH - 0.5, ISOCENTRE_DEPTH + 0.5, BOX_DEPTH])
    shape = (len(across) - 1, len(along) - 1, len(down) - 1)
    water = ompmc.Geometry(
        across, along, down, [MEDIUM], np.full(shape, 1.0, order="F"), np.ones(shape, dtype=np.int32, order="F")
    )
    began = time.monotonic()
    with quiet():
        dose, error = ompmc.calc_forward(
            water,
            source_of(ompmc, np.array([(0.0, 5.0, -4.0, 4.0)])),
            [1.0],
            physics=ompmc.Physics(n_split=1, seeds=(SEED, 1000)),
            n_histories=EDGE_HISTORIES,
            n_batches=40,
        )
    print(f"{EDGE_HISTORIES} histories in {time.monotonic() - began:.0f} s")
    profile, relative = dose[1:-1, 1, 1], error[1:-1, 1, 1]
    notes = [
        "Monte Carlo across a field edge in water; made by tests/external/monte_carlo/simulate.py, see README.md",
        f"package ompmc {ompmc.__version__} (PyPI), medium {MEDIUM}, made on {datetime.date.today().isoformat()}",
        f"{EDGE_HISTORIES} histories, seeds ({SEED}, 1000); spectrum, source and box as in squares.csv",
        f"field 0 to 5 by -4 to 4 cm, {ISOCENTRE_DEPTH:g} cm deep in the isocentre plane; "
        "scored in 0.1 x 6 x 1 cm; any unit",
    ]
    with written("edge.csv", notes) as table:
        table.writerow(["x_cm", "dose", "error"])
        for low, high, value, one in zip(lines[:-1], lines[1:], profile, relative):
            table.writerow([f"{(low + high) / 2:.2f}", f"{value / profile[0]:.5f}", f"{value * one / profile[0]:.5f}"])


# ------------------------------------------------------------------ fields from beamlets


def open_share(cells, rectangles):
    """1 for each beamlet inside one of the rectangles, which must lie on beamlet boundaries."""
    share = np.zeros(len(cells))
    for x1, x2, y1, y2 in rectangles:
        width = np.clip(np.minimum(cells[:, 1], x2) - np.maximum(cells[:, 0], x1), 0, None)
        height = np.clip(np.minimum(cells[:, 3], y2) - np.maximum(cells[:, 2], y1), 0, None)
        share += width * height / area(cells)
    assert np.all((abs(share) < 1e-9) | (abs(share - 1) < 1e-9)), "a rectangle off the beamlet boundaries"
    return np.round(share)


def fields(cells):
    """(kind, name, scoring point, fluence of each beamlet) of all squares and apertures."""
    found = []
    for side in SQUARES:
        half = side / 2
        found.append(("square", str(side), "axis", open_share(cells, [(-half, half, -half, half)])))
    for name, (point, segments) in APERTURES.items():
        parts = [weight * open_share(cells, rectangles) for weight, rectangles in segments]
        found.append(("aperture", name, point, sum(parts)))
    return found


# ------------------------------------------------------------------ from replicas to tables


def smoothed(dose, error):
    """Dose along depth (last axis) by a polynomial in depth through its logarithm; and chi-square by freedom."""
    x = (DEPTHS - DEPTHS.mean()) / np.ptp(DEPTHS) * 2
    used = (DEPTHS >= FIT_FROM) & (DEPTHS <= FIT_TO)
    log = np.log(dose)
    powers = np.vander(x, FIT_DEGREE + 1)
    fitted = np.empty_like(dose)
    chi_square = np.empty(len(dose))
    for row in range(len(dose)):
        weight = dose[row][used] / error[row][used]
        factors, *_ = np.linalg.lstsq(powers[used] * weight[:, None], log[row][used] * weight, rcond=None)
        fitted[row] = np.exp(powers @ factors)
        missed = (log[row][used] - powers[used] @ factors) * weight
        chi_square[row] = (missed**2).sum() / (used.sum() - FIT_DEGREE - 1)
    return fitted, chi_square


def jackknife_error(left_out):
    """Standard error from the values that leave out one replica each (first axis)."""
    count = len(left_out)
    return np.sqrt((count - 1) / count * ((left_out - left_out.mean(axis=0)) ** 2).sum(axis=0))


def reduce(out):
    paths = sorted(out.glob("replica-*.npz"))
    assert len(paths) >= 10, "too few replicas for an error"
    held = [np.load(path) for path in paths]
    assert len({(str(one["density"]), int(one["seed"]), str(one["version"])) for one in held}) == 1
    cells = beamlets()
    all_fields = fields(cells)
    order = list(POINTS)
    # By replica, field, depth: Gy for one photon per cm2 of the isocentre plane.
    dose = np.array(
        [
            [(share * area(cells)) @ one["dose"][order.index(point)] for _, _, point, share in all_fields]
            for one in held
        ]
    )
    count = len(held)
    error = dose.std(axis=0, ddof=1) / np.sqrt(count)
    whole, chi_square = smoothed(dose.mean(axis=0), error)
    without = np.array([(dose.sum(axis=0) - one) / (count - 1) for one in dose])
    left_out = np.array([smoothed(one, error)[0] for one in without])
    reference = next(row for row, one in enumerate(all_fields) if one[:2] == ("square", str(REFERENCE_SIDE)))
    at = {int(depth): column for column, depth in enumerate(DEPTHS)}

    histories = sum(int(one["histories"]) for one in held)
    notes = [
        "Monte Carlo of photon fields in a water box; made by tests/external/monte_carlo/simulate.py, see README.md",
        f"package ompmc {held[0]['version']} (PyPI), medium {MEDIUM}, numpy {np.__version__}",
        f"reduced on {datetime.date.today().isoformat()}; seeds ({SEED} + replica, 1 + group)",
        f"{count} replicas, {histories} histories, {sum(float(one['seconds']) for one in held) / 60:.0f} minutes",
        "spectrum: the package's mohan6.spectrum (Mohan, Chui & Lidofsky 1985, 6 MV), the same at every angle",
        f"point source, SSD {SSD:g} cm, box {2 * BOX_HALF:g} x {2 * BOX_HALF:g} x {BOX_DEPTH:g} cm, no head",
        f"fluence: the same number of photons for every cm2 of the isocentre plane ({SAD:g} cm)",
        f"scored in {2 * VOXEL_HALF:g} x {2 * VOXEL_HALF:g} x 1 cm about the point; errors: 1 sigma, jackknife",
        f"along depth: polynomial of degree {FIT_DEGREE} through ln dose, {FIT_FROM} to {FIT_TO} cm; "
        "raw: the voxel by itself",
    ]

    def rows(kind, depths, relative):
        base, base_left = whole[reference, at[REFERENCE_DEPTH]], left_out[:, reference, at[REFERENCE_DEPTH]]
        raw_base, raw_left = dose[:, reference, at[REFERENCE_DEPTH]].mean(), without[:, reference, at[REFERENCE_DEPTH]]
        if not relative:
            base, base_left, raw_base, raw_left = 1.0, np.ones(count), 1.0, np.ones(count)
        for row, (its_kind, name, point, _) in enumerate(all_fields):
            if its_kind != kind:
                continue
            for depth in depths:
                value, each = whole[row, at[depth]] / base, left_out[:, row, at[depth]] / base_left
                raw, raw_each = dose[:, row, at[depth]].mean() / raw_base, without[:, row, at[depth]] / raw_left
                figures = [
                    f"{value:.6g}",
                    f"{100 * jackknife_error(each) / value:.3f}",
                    f"{raw:.6g}",
                    f"{100 * jackknife_error(raw_each) / raw:.3f}",
                ]
                yield name, point, depth, figures

    with written("squares.csv", notes) as table:
        table.writerow(["depth_cm", "side_cm", "dose_gy_cm2", "error_percent", "raw_gy_cm2", "raw_error_percent"])
        for name, _, depth, figures in rows("square", TABLE_DEPTHS, False):
            table.writerow([depth, name, *figures])
    more = notes + ["relative to the 10 x 10 at 10 cm; point: x_b, y_b in its own plane, at the depth"]
    with written("apertures.csv", more) as table:
        table.writerow(
            ["aperture", "point_x_cm", "point_y_cm", "depth_cm", "dose", "error_percent", "raw", "raw_error_percent"]
        )
        for name, point, depth, figures in rows("aperture", APERTURE_DEPTHS, True):
            table.writerow([name, *map(str, POINTS[point]), depth, *figures])
    with written("shapes.csv", ["open rectangles of the apertures, cm in the isocentre plane"]) as table:
        table.writerow(["aperture", "segment", "weight", "x1_cm", "x2_cm", "y1_cm", "y2_cm"])
        for name, (_, segments) in APERTURES.items():
            for number, (weight, rectangles) in enumerate(segments, start=1):
                for sides in rectangles:
                    table.writerow([name, number, weight, *(f"{side:g}" for side in sides)])
    more = notes + [
        "for errors of what is calculated from squares and apertures together, whose noise is in part the same:",
        "each column leaves out one replica; squares in Gy cm2, apertures relative to the 10 x 10 at 10 cm",
    ]
    with written("jackknife.csv", more) as table:
        table.writerow(["kind", "name", "depth_cm", *(f"without_{number}" for number in range(count))])
        for row, (kind, name, _, _) in enumerate(all_fields):
            for depth in TABLE_DEPTHS if kind == "square" else APERTURE_DEPTHS:
                base = left_out[:, reference, at[REFERENCE_DEPTH]] if kind == "aperture" else 1.0
                table.writerow([kind, name, depth, *(f"{one:.6g}" for one in left_out[:, row, at[depth]] / base)])

    print(f"{count} replicas, {histories:.4g} histories")
    for row, (kind, name, _, _) in enumerate(all_fields):
        base = left_out[:, reference, at[REFERENCE_DEPTH]]
        errors = [
            100 * jackknife_error(left_out[:, row, at[depth]] / base) / left_out[:, row, at[depth]].mean() * base.mean()
            for depth in APERTURE_DEPTHS
        ]
        values = [whole[row, at[depth]] / whole[reference, at[REFERENCE_DEPTH]] for depth in APERTURE_DEPTHS]
        print(f"{kind:9}{name:24}", *(f"{value:.4f} ({one:.2f} %)" for value, one in zip(values, errors)),
              f"chi2 {chi_square[row]:.2f}")  # fmt: skip


@contextlib.contextmanager
def written(name, notes):
    with open(HERE / name, "w", newline="", encoding="ascii") as file:
        file.writelines(f"# {note}\n" for note in notes)
        yield csv.writer(file, lineterminator="\n")


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("what", choices=("run", "reduce", "edge"))
    parser.add_argument("--out", type=Path, help="folder of the replicas")
    parser.add_argument("--minutes", type=float, default=60, help="no replica is begun that would end later")
    parser.add_argument("--replicas", type=int, default=40, help="at most so many")
    parser.add_argument("--threads", type=int, default=2)
    given = parser.parse_args()
    if given.what == "edge":
        edge(given.threads)
    elif given.out is None:
        parser.error("--out is missing")
    elif given.what == "run":
        run(given.out, given.minutes, given.threads, given.replicas)
    else:
        reduce(given.out)
