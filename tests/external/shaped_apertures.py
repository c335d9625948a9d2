"""Generated apertures of photon fields, from a seed: rectangles, L shapes,
combs of leaves, irregular outlines, blocked centres, small openings and sums
of segments, each with a point. The dose is left to whoever asks for them.

Edges across the leaves lie on leaf boundaries, so that leaves represent every
outline exactly; blocks take any outline. Lengths are cm in the collimator
system at the isocentre plane.
"""

import math
from dataclasses import dataclass, field

import numpy as np

from field_models import Block, Segment, opened_by, shaped

LEAF_CM = 0.5
LIMIT_CM = 20.0
# Step of the strips into which slanted outlines are cut for the other calculation; the penumbra smooths it away.
STRIP_CM = 0.025


@dataclass
class Aperture:
    """A field without its dose."""

    name: str
    kind: str
    segments: list
    point: tuple
    depth_cm: float
    # Distance of the point from the outline of what is open at any time.
    edge_cm: float
    # Distance of the point from the nearest edge of any segment.
    segment_edge_cm: float
    blocks: list = field(default_factory=list)

    def rectangles(self):
        """What is open, as (x1, x2, y1, y2, mean fluence); fluences of overlapping rectangles add."""
        whole = sum(segment.share for segment in self.segments)
        found = []
        for segment in self.segments:
            parts = opened_by(segment)
            shares = [one for block in self.blocks if not block.shields for one in strips(block.outline)] or None
            if shares is not None:
                assert len(parts) == 1, "an aperture block inside leaves"
                parts = [within(one, parts[0]) for one in shares]
            found += [(*one, segment.share / whole) for one in parts]
            for block in self.blocks:
                if block.shields:
                    found += [(*within(one, parts[0]), -segment.share / whole) for one in strips(block.outline)]
        return found


def within(one, bounds):
    x1, x2, y1, y2 = one
    left, right, low, high = bounds
    x1, x2 = min(max(x1, left), right), min(max(x2, left), right)
    y1, y2 = min(max(y1, low), high), min(max(y2, low), high)
    return x1, x2, y1, y2


def strips(outline):
    """A polygon as strips between levels; exact where its sides run along the axes."""
    levels = sorted({y for _, y in outline})
    around = list(zip(outline, outline[1:] + outline[:1]))
    found = []
    for low, high in zip(levels, levels[1:]):
        sides = [(a, b) for a, b in around if min(a[1], b[1]) <= low and max(a[1], b[1]) >= high and a[1] != b[1]]
        slanted = any(a[0] != b[0] for a, b in sides)
        count = max(1, math.ceil((high - low) / STRIP_CM)) if slanted else 1
        for index in range(count):
            y1 = low + (high - low) * index / count
            y2 = low + (high - low) * (index + 1) / count
            middle = (y1 + y2) / 2
            crossings = sorted(a[0] + (b[0] - a[0]) * (middle - a[1]) / (b[1] - a[1]) for a, b in sides)
            found += [(x1, x2, y1, y2) for x1, x2 in zip(crossings[::2], crossings[1::2])]
    return found


# --------------------------------------------------------------------------- distances


def distance_to_edge(rectangles, point):
    """Distance of a point from the outline of what these rectangles open together; negative outside it."""
    px, py = point[:2]
    table = np.array([one[:4] for one in rectangles])
    far = 100.0
    xs = np.unique(np.concatenate([table[:, 0], table[:, 1], [-far, far]]))
    ys = np.unique(np.concatenate([table[:, 2], table[:, 3], [-far, far]]))
    open_cells = np.zeros((len(xs) - 1, len(ys) - 1), dtype=bool)
    for x1, x2, y1, y2 in table:
        across = slice(*np.searchsorted(xs, [x1, x2]))
        along = slice(*np.searchsorted(ys, [y1, y2]))
        open_cells[across, along] = True
    away_x = np.maximum(np.maximum(xs[:-1] - px, px - xs[1:]), 0.0)
    away_y = np.maximum(np.maximum(ys[:-1] - py, py - ys[1:]), 0.0)
    away = np.hypot(away_x[:, None], away_y[None, :])
    closed = away[~open_cells].min()
    return closed if closed > 0 else -away[open_cells].min()


def distance_to_outline(outline, point):
    px, py = point[:2]
    least = math.inf
    for (ax, ay), (bx, by) in zip(outline, outline[1:] + outline[:1]):
        length2 = (bx - ax) ** 2 + (by - ay) ** 2
        share = min(max(((px - ax) * (bx - ax) + (py - ay) * (by - ay)) / length2, 0.0), 1.0)
        least = min(least, math.hypot(ax + share * (bx - ax) - px, ay + share * (by - ay) - py))
    return least


def inside(outline, point):
    px, py = point[:2]
    crossed = 0
    for (ax, ay), (bx, by) in zip(outline, outline[1:] + outline[:1]):
        if (ay < py) != (by < py) and ax + (bx - ax) * (py - ay) / (by - ay) > px:
            crossed += 1
    return crossed % 2 == 1


# --------------------------------------------------------------------------- shapes


def steps(rng, low, high, step=LEAF_CM):
    """A random multiple of a step between two bounds."""
    return step * int(rng.integers(math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9) + 1))


def fine(value):
    return round(value, 2)


def rectangle_shape(rng):
    short = steps(rng, 3, 7)
    long = min(steps(rng, short, 8 * short), 34.0)
    width, height = (short, long) if rng.random() < 0.5 else (long, short)
    return [(0.0, width, 0.0, height)]


def small_shape(rng):
    return [(0.0, steps(rng, 3, 4.5), 0.0, steps(rng, 3, 4.5))]


def l_shape(rng):
    width, height = steps(rng, 5, 20), steps(rng, 5, 20)
    foot, leg = steps(rng, 2.5, height - 2), steps(rng, 2.5, width - 2)
    rows = [(0.0, width, 0.0, foot), (0.0, leg, foot, height)]
    if rng.random() < 0.5:
        rows[1] = (width - leg, width, foot, height)
    return rows


def comb_shape(rng):
    """Teeth of one to four leaves on a spine, or, without a spine, leaves open in turn beside a wide opening."""
    teeth = int(rng.integers(2, 6))
    rows, y = [], 0.0
    if rng.random() < 0.6:
        spine = fine(rng.uniform(2.5, 8))
        for tooth in range(2 * teeth + 1):
            height = LEAF_CM * int(rng.integers(1, 5))
            end = fine(spine + rng.uniform(2, 8)) if tooth % 2 == 0 else spine
            rows.append((0.0, end, y, y + height))
            y += height
        return rows
    width = fine(rng.uniform(4, 14))
    wide = int(rng.integers(0, teeth))
    for tooth in range(teeth):
        height = steps(rng, 2.5, 5) if tooth == wide else LEAF_CM * int(rng.integers(1, 5))
        start = fine(rng.uniform(-1.5, 1.5))
        rows.append((start, start + width, y, y + height))
        y += height + LEAF_CM * int(rng.integers(1, 5))
    return rows


def irregular_shape(rng):
    """A lobed outline drawn by leaves."""
    radius = rng.uniform(2.5, 9)
    stretch = rng.uniform(0.6, 1.6)
    phases, sizes = rng.uniform(0, 2 * math.pi, 4), rng.uniform(0, 0.25, 4)
    turn = 2 * math.pi * np.arange(720) / 720
    out = radius * (1 + sum(size * np.cos((k + 1) * turn + p) for k, (p, size) in enumerate(zip(phases, sizes))))
    x, y = stretch * out * np.cos(turn), out * np.sin(turn) / stretch
    low, high = LEAF_CM * math.ceil(y.min() / LEAF_CM), LEAF_CM * math.floor(y.max() / LEAF_CM)
    rows = []
    for line in np.arange(low, high - 1e-9, LEAF_CM):
        here = (y >= line - 0.05) & (y <= line + LEAF_CM + 0.05)
        if here.any():
            rows.append((fine(x[here].min()), fine(x[here].max()), float(line), float(line) + LEAF_CM))
    return rows


def star_outline(rng, radius):
    corners = int(rng.integers(3, 10))
    turns = np.sort(rng.uniform(0, 2 * math.pi, 40))[:: 40 // corners][:corners]
    return [
        (fine(size * math.cos(turn)), fine(size * math.sin(turn)))
        for turn, size in zip(turns, rng.uniform(0.6, 1.2, len(turns)) * radius)
    ]


# --------------------------------------------------------------------------- placing


def depth(rng):
    return round(float(rng.uniform(3, 25)), 1)


def pick(rng, bounds, wanted, distance, tries=400):
    """A point in these bounds whose distance from the outline lies between two bounds; None when none is met."""
    x1, x2, y1, y2 = bounds
    for _ in range(tries):
        point = (fine(rng.uniform(x1, x2)), fine(rng.uniform(y1, y2)))
        found = distance(point)
        if wanted[0] <= found < wanted[1]:
            return point, found
    return None


def bounds_of(rectangles):
    x1, x2, y1, y2 = zip(*(one[:4] for one in rectangles))
    return min(x1), max(x2), min(y1), max(y2)


def shift_for(rng, bounds, point, off_axis_cm):
    """A shift (y by whole leaves) that brings the point to about a place this far from the axis at most, and
    leaves the shape within reach of the leaves; None when there is none."""
    turn, radius = rng.uniform(0, 2 * math.pi), off_axis_cm * math.sqrt(rng.random())
    dx = fine(radius * math.cos(turn) - point[0])
    dy = LEAF_CM * round((radius * math.sin(turn) - point[1]) / LEAF_CM)
    x1, x2, y1, y2 = bounds
    reach = LIMIT_CM
    if min(x1 + dx, y1 + dy) < -reach or max(x2 + dx, y2 + dy) > reach:
        return None
    return dx, dy


def moved(one, dx, dy):
    return (round(one[0] + dx, 4), round(one[1] + dx, 4), round(one[2] + dy, 4), round(one[3] + dy, 4))


def by_leaves(rng, kind, name, shape, wanted, off_axis_cm):
    while True:
        rows = shape(rng)
        bounds = bounds_of(rows)
        found = pick(rng, bounds, wanted, lambda point: distance_to_edge(rows, point))
        if found is None:
            continue
        point, edge = found
        shift = shift_for(rng, bounds, point, off_axis_cm)
        if shift is None:
            continue
        dx, dy = shift
        rows = [moved(one, dx, dy) for one in rows]
        point = (round(point[0] + dx, 4), round(point[1] + dy, 4), 0.0)
        return Aperture(name, kind, [shaped(rows)], point, depth(rng), edge, edge)


def by_blocks(rng, kind, name, shields, wanted, off_axis_cm):
    """An island in the middle of a jaw opening, or an outline that alone is open."""
    while True:
        size = rng.uniform(5, 12) if shields else rng.uniform(3, 9)
        half = (fine(size), fine(size * rng.uniform(0.7, 1.3)))
        jaws = (-half[0], half[0], -half[1], half[1])
        radius = rng.uniform(0.15, 0.5) * min(half) if shields else 0.8 * min(half)
        if shields and rng.random() < 0.4:
            a, b = fine(radius), fine(radius * rng.uniform(0.5, 1.5))
            outline = [(-a, -b), (a, -b), (a, b), (-a, b)]
        else:
            outline = star_outline(rng, radius)
        if any(abs(x) > half[0] or abs(y) > half[1] for x, y in outline):
            continue

        def distance(point):
            if inside(outline, point) == shields:
                return -1.0
            return min(distance_to_outline(outline, point), distance_to_edge([jaws], point))

        found = pick(rng, jaws, wanted, distance)
        if found is None:
            continue
        point, edge = found
        shift = shift_for(rng, jaws, point, off_axis_cm)
        if shift is None:
            continue
        dx, dy = shift
        x1, x2, y1, y2 = moved(jaws, dx, dy)
        outline = [(round(x + dx, 4), round(y + dy, 4)) for x, y in outline]
        segment = Segment(jaw_x=(x1, x2), jaw_y=(y1, y2))
        point = (round(point[0] + dx, 4), round(point[1] + dy, 4), 0.0)
        return Aperture(name, kind, [segment], point, depth(rng), edge, edge, [Block(outline, shields)])


def field_in_field(rng):
    """An open field and two to five smaller ones inside it, with 5 to 15 % of the meterset each."""
    rows = irregular_shape(rng) if rng.random() < 0.5 else rectangle_shape(rng)
    parts = int(rng.integers(2, 6))
    segments, rest = [], 1.0
    x1, x2, y1, y2 = bounds_of(rows)
    for _ in range(parts):
        left, right = sorted(fine(value) for value in rng.uniform(x1, x2, 2))
        if right - left < 1.5:
            continue
        inner = [(max(one[0], left), min(one[1], right), one[2], one[3]) for one in rows]
        inner = [one for one in inner if one[1] > one[0]]
        if rng.random() < 0.5:
            level = steps(rng, y1, y2)
            inner = [one for one in inner if one[3] <= level] or inner
        share = round(float(rng.uniform(0.05, 0.15)), 3)
        segments.append((inner, share))
        rest -= share
    return [(rows, round(rest, 3)), *segments]


def windows(rng):
    """Eight openings of random width about one place, equal in meterset, leaf pairs in bands of their own."""
    bands, y = [], 0.0
    for _ in range(int(rng.integers(2, 6))):
        height = steps(rng, 1, 4)
        bands.append((y, y + height))
        y += height
    segments = []
    for _ in range(8):
        rows = []
        for low, high in bands:
            left, right = fine(-rng.exponential(2.5) + 0.5), fine(rng.exponential(2.5) - 0.5)
            if right - left > 0.5:
                rows.append((left - 1.0, right + 1.0, low, high))
        if rows:
            segments.append((rows, 0.125))
    return segments


def by_segments(rng, kind, name, make, wanted, off_axis_cm, least_fluence=0.5):
    while True:
        made = make(rng)
        if len(made) < 2:
            continue
        union = [one for rows, _ in made for one in rows]
        whole = sum(share for _, share in made)
        bounds = bounds_of(union)
        found = pick(rng, bounds, wanted, lambda point: distance_to_edge(union, point))
        if found is None:
            continue
        point, edge = found
        away = [distance_to_edge(rows, point) for rows, _ in made]
        held = sum(share for (_, share), one in zip(made, away) if one > 0)
        if held < least_fluence * whole:
            continue
        shift = shift_for(rng, bounds, point, off_axis_cm)
        if shift is None:
            continue
        dx, dy = shift
        segments = [shaped([moved(one, dx, dy) for one in rows], share) for rows, share in made]
        point = (round(point[0] + dx, 4), round(point[1] + dy, 4), 0.0)
        nearest = min(abs(one) for one in away)
        return Aperture(name, kind, segments, point, depth(rng), edge, nearest)


# --------------------------------------------------------------------------- the set

INSIDE, NEAR = (1.0, math.inf), (0.3, 1.0)
# Kind, how many, how it is made.
SHAPES = [
    ("rectangle to 8:1", 45, rectangle_shape, 0.0),
    ("L shape", 35, l_shape, 0.0),
    ("comb of leaves", 40, comb_shape, 0.0),
    ("irregular leaves", 35, irregular_shape, 0.0),
    ("small opening", 30, small_shape, 4.0),
]
OFF_AXIS = [rectangle_shape, l_shape, comb_shape, irregular_shape]


def generate(seed):
    """All apertures; the last kind has its points within 1 cm of an edge."""
    rng = np.random.default_rng(seed)
    found = []

    def add(make, kind, count, *arguments):
        for index in range(count):
            found.append(make(rng, kind, f"{kind} {index}", *arguments))

    for kind, count, shape, off_axis_cm in SHAPES:
        add(by_leaves, kind, count, shape, INSIDE, off_axis_cm)
    for index in range(40):
        shape = OFF_AXIS[index % len(OFF_AXIS)]
        found.append(by_leaves(rng, "off axis", f"off axis {index}", shape, INSIDE, 12.0))
    add(by_blocks, "blocked centre", 40, True, INSIDE, 6.0)
    add(by_blocks, "block outline", 25, False, INSIDE, 6.0)
    add(by_segments, "field in field", 30, field_in_field, INSIDE, 4.0)
    add(by_segments, "segment sum", 30, windows, INSIDE, 4.0)
    for index in range(40):
        shape = OFF_AXIS[index % len(OFF_AXIS)]
        found.append(by_leaves(rng, "near an edge", f"near an edge {index}", shape, NEAR, 4.0))
    return found
