"""Shaped fields against the singular-value pencil-beam formula with the data of
an open photon machine (see `pencil_beam.py` for both).

A beam model is made from that calculation's own squares: TPR at depths of 2 to
30 cm, phantom scatter factors, and nothing else but the width of an edge.
Then generated apertures (see `shaped_apertures.py`) are calculated by the
formula, the result is written into plans as the planned dose, and the audit's
deviation is the program's error against the formula. The points lie 90 to
110 cm from the source; what the formula says there holds in the point's plane,
and the inverse square is added.

The penumbra of the model comes from the formula's own edge, not from what the
program makes of it. What square tables cannot tell from the primary is the
part of the kernel within 1.5 cm, half the smallest square; its edge, blurred
by the source as the file states it (sigma 0.21 cm), is read at 10 cm depth in
the two ways that a model can hold, both settled before any comparison:
  - one Gaussian by the rule of the model's format, the distance from 20 to 80 %
    over 1.68: 0.27 cm;
  - two Gaussians fitted to the whole edge: 0.21 cm and, for 28 % of it, 0.58 cm.
The limits are asserted for both, and over all apertures whose point lies 1 cm or
more inside: also over those that the program itself refuses. An open field whose
point is nearer to an edge is reported apart.
"""

from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import least_squares
from scipy.special import ndtr, ndtri

from common import Checks, close, scratch
from field_models import SAD_CM, BeamData, Field, audit_fields, shaped
from pencil_beam import PencilBeam
from shaped_apertures import Aperture, generate

SEED = 20931
DISTANCE_SEED = 20932
DEPTHS_CM = np.arange(2.0, 31.0)
SIDES_CM = np.array([3, 4, 5, 6, 8, 10, 12, 15, 20, 25, 30, 35, 40], dtype=float)
EDGE_DEPTH_CM = 10.0
EDGE_REACH_CM = SIDES_CM[0] / 2
NEAR = "near an edge"
# The program's margin between point and edge, in the point's plane.
EDGE_CM = 1.0
# How far the open fluence of a sum may change within that margin, unless the site says otherwise.
FLUENCE_CHANGE = 0.3
SUMS = ("field in field", "segment sum")

# Per cent of dose.
MEDIAN, PERCENTILE_99 = 0.2, 1.0
SQUARES = 0.2
LEAST_APERTURES = 200
LEAST_SUMS = 10


# --------------------------------------------------------------------------- the model


def edge_of(pencil):
    return pencil.edge_spread(EDGE_DEPTH_CM, EDGE_REACH_CM)


def two_gaussians(pencil):
    """Sigma, share of the tail, sigma of the tail of the edge; cm."""
    places, edge = edge_of(pencil)

    def missed(values):
        sigma, share, tail = values
        return (1 - share) * ndtr(places / sigma) + share * ndtr(places / tail) - edge

    fitted = least_squares(missed, [0.2, 0.2, 0.5])
    return fitted.x, np.abs(fitted.fun).max()


def one_gaussian(pencil):
    """Sigma by the distance from 20 to 80 % of the edge, cm."""
    places, edge = edge_of(pencil)
    return float(np.diff(np.interp([0.2, 0.8], edge, places))[0] / 1.68)


def model_of(pencil):
    dose = np.array([[pencil.square(depth, side) for side in SIDES_CM] for depth in DEPTHS_CM])
    at_ten = dose[list(DEPTHS_CM).index(10.0)]
    return BeamData(
        depths_cm=DEPTHS_CM,
        sides_cm=SIDES_CM,
        relative=dose / at_ten,
        sp=at_ten / at_ten[list(SIDES_CM).index(10.0)],
        penumbra_sigma_cm=one_gaussian(pencil),
    )


def read_as_circles(data):
    """The model as it were if its squares were read as circles of their half side: a circle of radius s/2 lies at
    the square of s/2 / 0.5611 (mean radius of a unit square)."""
    sides = data.sides_cm * 0.5 / 0.561100
    # Sp is 1 at 10 cm whatever the reading; the sides of the table stay clear of that.
    sides = np.append(sides, 10.0)
    order = np.argsort(sides)
    at_ten = np.array([np.interp(10.0, sides[:-1], row) for row in data.relative])
    sp_ten = np.interp(10.0, sides[:-1], data.sp)
    return replace(
        data,
        sides_cm=sides[order],
        relative=np.column_stack([data.relative, at_ten])[:, order],
        sp=np.append(data.sp, sp_ten)[order] / sp_ten,
    )


# --------------------------------------------------------------------------- the fields


@dataclass
class Placed:
    """An aperture whose point lies at a distance from the source, on the ray through its `point`."""

    aperture: Aperture
    distance_cm: float

    @property
    def name(self):
        return self.aperture.name

    @property
    def scale(self):
        return self.distance_cm / SAD_CM

    @property
    def kind(self):
        apart = self.aperture.kind not in SUMS and self.aperture.edge_cm * self.scale < EDGE_CM
        return NEAR if apart else self.aperture.kind

    @property
    def segment_edge_cm(self):
        """In the point's plane."""
        return self.aperture.segment_edge_cm * self.scale

    def seen(self):
        """The rectangles with their fluence, and the point, in the point's plane."""
        rectangles = [(*(side * self.scale for side in one[:4]), one[4]) for one in self.aperture.rectangles()]
        return rectangles, tuple(at * self.scale for at in self.aperture.point[:2])

    def dose_by(self, way):
        rectangles, point = self.seen()
        return way(rectangles, self.aperture.depth_cm, point, distance_cm=self.distance_cm)


def placed(apertures):
    """At 90 to 110 cm; points near an edge not beyond the isocentre, so that they stay near."""
    rng = np.random.default_rng(DISTANCE_SEED)
    found = []
    for one in apertures:
        furthest = 100.0 if one.kind == NEAR else 110.0
        found.append(Placed(one, float(round(rng.uniform(90.0, furthest), 1))))
    return found


def fields_of(pencil, apertures):
    reference = pencil.square(10.0, 10.0)
    found = []
    for one in apertures:
        _, point = one.seen()
        field = Field(
            name=one.name,
            segments=one.aperture.segments,
            depth_cm=one.aperture.depth_cm,
            dose=one.dose_by(pencil.dose) / reference / one.scale**2,
            point=(*point, SAD_CM - one.distance_cm),
            blocks=one.aperture.blocks,
        )
        found.append(field)
    return found


def square_fields(pencil):
    """The squares and depths of the table themselves, opened by leaves."""
    reference = pencil.square(10.0, 10.0)
    found = []
    # At 40 cm the leaves would stand where the jaws do.
    for side in SIDES_CM[SIDES_CM < 40]:
        half = side / 2
        for depth in (3.0, 5.0, 10.0, 15.0, 20.0, 25.0):
            opening = shaped([(-half, half, -half, half)])
            name = f"square {side:g} at {depth:g}"
            found.append(Field(name, [opening], depth, pencil.square(depth, side) / reference))
    return found


def errors_of(outcomes, names):
    """Deviations in per cent; every field must have a number from the integration."""
    without = [name for name in names if outcomes[name].deviation_percent is None]
    assert not without, f"{len(without)} without a number, such as {without[0]}: {outcomes[without[0]].reasons}"
    return np.array([outcomes[name].deviation_percent for name in names])


def summary(errors):
    size = np.abs(errors)
    return float(np.median(size)), float(np.percentile(size, 99)), float(size.max())


def print_table(title, apertures, outcomes):
    print(f"   {title}: errors in per cent")
    print("   kind                   n    mean      SD  median    99 %     max  refused")
    kinds = list(dict.fromkeys(one.kind for one in apertures))
    groups = [(kind, [one for one in apertures if one.kind == kind]) for kind in kinds]
    inside = [one for one in apertures if one.kind != NEAR]
    groups.append(("all but near an edge", inside))
    groups.append(("of these not refused", [one for one in inside if outcomes[one.name].verdict != "not-verifiable"]))
    for kind, group in groups:
        names = [one.name for one in group if outcomes[one.name].deviation_percent is not None]
        if not names:
            print(f"   {kind:20} {0:3}  no numbers")
            continue
        errors = errors_of(outcomes, names)
        median, high, _ = summary(errors)
        worst = errors[np.argmax(np.abs(errors))]
        refused = sum(outcomes[one.name].verdict == "not-verifiable" for one in group)
        print(
            f"   {kind:20} {len(names):3} {errors.mean():+7.3f} {errors.std():7.3f} {median:7.3f} {high:7.3f}"
            f" {worst:+7.3f} {refused:8}"
        )


# --------------------------------------------------------------------------- checks


def check_two_ways(pencil, apertures):
    """The grid and the rings, relative to the 10 cm square of each, as plans carry the dose."""
    ten = [(-5.0, 5.0, -5.0, 5.0, 1.0)]
    unit = pencil.dose_by_rings(ten, 10.0) / pencil.dose(ten, 10.0)
    some = [one for one in apertures if len(one.aperture.rectangles()) <= 60][::8]
    found = []
    for one in some:
        by_rings = one.dose_by(pencil.dose_by_rings)
        found.append(100 * (by_rings / unit / one.dose_by(pencil.dose) - 1))
    worst = np.abs(found).max()
    print(f"   {len(some)} apertures by both ways: largest difference {worst:.4f} %")
    assert len(some) >= 20 and worst <= 0.02, f"largest difference {worst:.4f} %"


def check_data(pencil):
    """A beam of 6 MV: TPR20,10 of 0.66 to 0.70 (common practice)."""
    quality = pencil.square(20.0, 10.0) / pencil.square(10.0, 10.0)
    print(f"   TPR20,10 {quality:.4f}")
    close("TPR20,10", quality, 0.68, 0.02)


def check_edge(pencil):
    (sigma, share, tail), missed = two_gaussians(pencil)
    print(
        f"   edge: sigma {sigma:.4f} cm, {100 * share:.1f} % of {tail:.4f} cm, fitted within {missed:.5f};"
        f" one Gaussian by 20 to 80 %: {one_gaussian(pencil):.4f} cm; the source alone {pencil.sigma_cm:.4f} cm"
    )
    assert missed <= 0.001, f"the two Gaussians miss the edge by {missed:.4f}"


def check_squares(fields, outcomes):
    errors = errors_of(outcomes, [one.name for one in fields])
    _, _, greatest = summary(errors)
    print(f"   {len(errors)} squares of the table: mean {errors.mean():+.4f}, largest {greatest:.4f} %")
    assert len(errors) >= 40 and greatest <= SQUARES, f"largest error {greatest:.3f} %"


def check_method(apertures, outcomes):
    other = [one.name for one in apertures if outcomes[one.name].method != "scatter-integration"]
    assert not other, f"{len(other)} by another method, such as {other[0]}"


def check_refusals(apertures, outcomes, sigma_cm):
    """A point well inside is not refused, unless the opening scatters less than the smallest square of the table;
    one within 1 cm of an edge always is. The edge of a slanted block is uncertain by half a strip, 0.05 cm.
    A sum is judged by its blurred fluence 1 cm from the point, which may fall by 30 %: an edge that all its segments
    share lets it fall further until it lies 0.524 sigma beyond that centimetre (0.524: the normal share there is 0.7)."""

    def clear(one):
        beyond = ndtri(1 - FLUENCE_CHANGE) * sigma_cm if one.kind in SUMS else 0.05 * one.scale
        return one.segment_edge_cm >= EDGE_CM + beyond

    refused = [
        one.name
        for one in apertures
        if clear(one)
        and outcomes[one.name].verdict == "not-verifiable"
        and "the tables begin at" not in outcomes[one.name].reasons
    ]
    assert not refused, f"{len(refused)} refused, such as {refused[0]}: {outcomes[refused[0]].reasons}"
    near = [one.name for one in apertures if one.kind == NEAR]
    passed = [name for name in near if outcomes[name].verdict != "not-verifiable"]
    assert not passed, f"{len(passed)} with the point within 1 cm of an edge not refused, such as {passed[0]}"


def within_limits(errors):
    median, high, greatest = summary(errors)
    print(f"   {len(errors)} apertures: median {median:.3f}, 99th percentile {high:.3f}, largest {greatest:.3f} %")
    return median <= MEDIAN and high <= PERCENTILE_99


def check_apertures(names, outcomes, least):
    assert len(names) >= least, f"only {len(names)} apertures"
    limits = f"a median of {MEDIAN} or a 99th percentile of {PERCENTILE_99} %"
    assert within_limits(errors_of(outcomes, names)), f"beyond {limits}"


def check_guard(names, outcomes):
    """The comparison must notice what is wrong here."""
    assert names, "no apertures"
    assert not within_limits(errors_of(outcomes, names)), "the comparison passes with what ought to break it"


def main():
    checks = Checks()
    pencil = PencilBeam()
    apertures = placed(generate(SEED))
    data = model_of(pencil)
    checks.run("pencil beam: the data are of 6 MV", check_data, pencil)
    checks.run("pencil beam: two ways of integrating agree", check_two_ways, pencil, apertures)
    checks.run("pencil beam: two Gaussians hold its edge", check_edge, pencil)

    fields, squares = fields_of(pencil, apertures), square_fields(pencil)
    outcomes = audit_fields(scratch("pencil"), fields + squares, data)
    names = [one.name for one in apertures if one.kind != NEAR]
    checks.run("pencil beam: squares of the table come back", check_squares, squares, outcomes)
    print_table("one Gaussian", apertures, outcomes)
    checks.run("pencil beam: every aperture is integrated", check_method, apertures, outcomes)
    checks.run("pencil beam: only points near an edge are refused", check_refusals, apertures, outcomes, data.penumbra_sigma_cm)
    checks.run("pencil beam: apertures", check_apertures, names, outcomes, LEAST_APERTURES)

    (sigma, share, tail), _ = two_gaussians(pencil)
    tailed = replace(data, penumbra_sigma_cm=sigma, penumbra_tail=(share, tail))
    with_tail = audit_fields(scratch("pencil"), fields + squares, tailed)
    print_table("two Gaussians", apertures, with_tail)
    checks.run("pencil beam: squares come back, two Gaussians", check_squares, squares, with_tail)
    checks.run("pencil beam: apertures, two Gaussians", check_apertures, names, with_tail, LEAST_APERTURES)

    # Sums that the program judges, with an edge of one segment within 0.5 cm of the point.
    sums = [
        one.name
        for one in apertures
        if one.kind in SUMS and one.segment_edge_cm < 0.5 and outcomes[one.name].verdict != "not-verifiable"
    ]
    checks.run("pencil beam: sums with an edge near the point", check_apertures, sums, outcomes, LEAST_SUMS)
    sharp = replace(data, penumbra_sigma_cm=0.001)
    outcomes = audit_fields(scratch("pencil"), fields, sharp)
    print_table("without the blur, must fail", apertures, outcomes)
    checks.run("pencil beam: sums fail without the blur", check_guard, sums, outcomes)
    checks.run("pencil beam: apertures fail without the blur", check_guard, names, outcomes)

    outcomes = audit_fields(scratch("pencil"), fields, read_as_circles(data))
    print_table("squares read as circles, must fail", apertures, outcomes)
    checks.run("pencil beam: squares read as circles fail", check_guard, names, outcomes)
    checks.finish()


if __name__ == "__main__":
    main()
