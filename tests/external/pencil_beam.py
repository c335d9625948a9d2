"""Dose by the singular-value pencil-beam formula (T. Bortfeld, W. Schlegel,
B. Rhein, Med Phys 20:311, 1993), with the data of an open photon machine:

    D(x, y, d) = sum_i D_i(d) (F * w_i)(x, y)
    D_i(d) = beta_i / (beta_i - m) (exp(-m d) - exp(-beta_i d))

w_i are three radial kernels in the isocentre plane, given at steps of 0.5 mm
for each source-surface distance; F is the fluence there. The data are
`photons_Generic.mat` of the PyPI package pyRadPlan, taken out of its wheel;
the package is neither installed nor imported.

How the data are read here:
  - isocentric: the SSD is 1000 mm - d, and the kernels act in the point's plane,
    also where that is not the isocentre plane: rectangles and point are then
    those of the point's plane, and the dose is per unit fluence there;
    the depth that attenuates is along the ray from the source to the point;
  - the value at radius 0 is a delta in one cell of 0.5 mm by 0.5 mm;
  - the source's penumbra that the file states, a full width at half maximum of
    5 mm at the isocentre, blurs the fluence as a Gaussian;
  - the fluence is flat: the file's primary fluence off the axis is left out;
  - beyond the last radius, 179.5 mm, the kernel is 0.
No inverse-square factor is in the dose; whoever leaves the isocentre plane adds it. Lengths are mm inside
`PencilBeam`, as in the file, and cm in its methods.
"""

import hashlib
import math
import subprocess
import sys
import zipfile
from functools import cached_property

import numpy as np
from scipy.io import loadmat
from scipy.special import ndtr

from common import ROOT

PACKAGE, VERSION = "pyRadPlan", "0.5.0"
WHEEL = "pyradplan-0.5.0-py3-none-any.whl"
MEMBER = "pyRadPlan/data/machines/photons_Generic.mat"
SHA256 = "ca9860ebccaa1a2da29da05cc651cb9c1639b13f322289fb019be981c72a5986"

CELL_MM = 0.5
FWHM_PER_SIGMA = 2 * math.sqrt(2 * math.log(2))


def machine_file():
    """The data file, fetched once into target/; the wheel is only unzipped."""
    folder = ROOT / "target/external-data"
    path = folder / MEMBER
    if not path.exists():
        command = [sys.executable, "-m", "pip", "download", "-q", "--disable-pip-version-check", "--no-deps"]
        subprocess.run([*command, "-d", str(folder), f"{PACKAGE}=={VERSION}"], check=True)
        with zipfile.ZipFile(folder / WHEEL) as wheel:
            wheel.extract(MEMBER, folder)
    found = hashlib.sha256(path.read_bytes()).hexdigest()
    assert found == SHA256, f"{path}: SHA-256 {found}, expected {SHA256}"
    return path


class PencilBeam:
    def __init__(self):
        machine = loadmat(machine_file(), squeeze_me=True, struct_as_record=False)["machine"]
        data = machine.data
        assert machine.meta.SAD == 1000
        self.betas = np.asarray(data.betas, dtype=float)
        self.m = float(data.m)
        self.radii = np.asarray(data.kernelPos, dtype=float)
        assert np.allclose(np.diff(self.radii), CELL_MM) and self.radii[0] == 0
        self.kernels = {int(one.SSD): np.array([one.kernel1, one.kernel2, one.kernel3]) for one in data.kernel}
        self.sigma_mm = float(data.penumbraFWHMatIso) / FWHM_PER_SIGMA

    @property
    def sigma_cm(self):
        return self.sigma_mm / 10

    @cached_property
    def _grid(self):
        count = int(self.radii[-1] / CELL_MM)
        line = CELL_MM * np.arange(-count, count + 1)
        return line, np.hypot(line[:, None], line[None, :])

    def radial(self, depth_cm, along_cm=None):
        """sum_i D_i w_i by radius, per mm2, at a depth on the axis; `along_cm` is the depth along the ray."""
        along = 10 * (depth_cm if along_cm is None else along_cm)
        ssd = 1000 - 10 * depth_cm
        nearest = min(self.kernels, key=lambda one: abs(one - ssd))
        shares = self.betas / (self.betas - self.m) * (np.exp(-self.m * along) - np.exp(-self.betas * along))
        return shares @ self.kernels[nearest]

    def _kernel_at(self, depth_cm, point, distance_cm):
        slant = math.hypot(point[0], point[1]) / distance_cm
        return self.radial(depth_cm, depth_cm * math.hypot(1.0, slant))

    def dose(self, rectangles, depth_cm, point=(0.0, 0.0), distance_cm=100.0):
        """At a point (x, y) of a plane at this distance from the source. `rectangles` are (x1, x2, y1, y2, fluence)
        in the same plane, cm; where they overlap, fluences add."""
        kernel = self._kernel_at(depth_cm, point, distance_cm)
        line, radius = self._grid
        # Between the steps linear; the cell at 0 takes the delta.
        cells = np.interp(radius, self.radii, kernel, right=0.0)
        # Next to the delta nothing lies between radius 0 and 0.5 mm on this grid.
        across, along = self._edges(rectangles, point, line)
        return float(np.einsum("ku,uv,kv->", across, cells, along, optimize=True)) * CELL_MM**2

    def _edges(self, rectangles, point, line):
        """Blurred fluence along x and along y of each rectangle at places `line`, mm from the point."""
        table = np.array([[*one[:4], one[4]] for one in rectangles], dtype=float)
        x1, x2 = (10 * (table[:, side, None] - point[0]) for side in (0, 1))
        y1, y2 = (10 * (table[:, side, None] - point[1]) for side in (2, 3))
        sigma = self.sigma_mm
        across = ndtr((x2 - line) / sigma) - ndtr((x1 - line) / sigma)
        along = ndtr((y2 - line) / sigma) - ndtr((y1 - line) / sigma)
        return across * table[:, 4, None], along

    def dose_by_rings(self, rectangles, depth_cm, point=(0.0, 0.0), distance_cm=100.0, angles=720):
        """The same by another way of integrating: the delta, and rings about the point with the blurred fluence's
        mean over the angle. The kernel is linear between its radii; within 0.5 mm it keeps the value at 0.5 mm,
        outside the circle that has the delta's area."""
        x, y = point[:2]
        kernel = self._kernel_at(depth_cm, point, distance_cm)
        node = 0.5 / math.sqrt(3)
        inner = CELL_MM / math.sqrt(math.pi)
        edges = np.concatenate([[inner], self.radii[1:]])
        middle, width = (edges[1:] + edges[:-1]) / 2, np.diff(edges)
        radii = np.concatenate([middle - node * width, middle + node * width])
        weights = np.concatenate([width / 2, width / 2]) * 2 * math.pi * radii
        values = np.interp(radii, self.radii[1:], kernel[1:])
        turn = 2 * math.pi * (np.arange(angles) + 0.5) / angles
        u = radii[:, None] * np.cos(turn)
        v = radii[:, None] * np.sin(turn)

        def fluence(u, v):
            total = 0.0
            for one in rectangles:
                x1, x2, y1, y2 = (10 * (side - at) for side, at in zip(one[:4], (x, x, y, y)))
                sigma = self.sigma_mm
                part = (ndtr((x2 - u) / sigma) - ndtr((x1 - u) / sigma)) * (
                    ndtr((y2 - v) / sigma) - ndtr((y1 - v) / sigma)
                )
                total = total + one[4] * part
            return total

        mean = fluence(u, v).mean(axis=1)
        delta = kernel[0] * CELL_MM**2 * fluence(np.array(0.0), np.array(0.0))
        return float(delta + np.sum(weights * values * mean))

    def square(self, depth_cm, side_cm):
        half = side_cm / 2
        return self.dose([(-half, half, -half, half, 1.0)], depth_cm)

    # ------------------------------------------------------------------ the edge of a field

    def edge_spread(self, depth_cm, reach_cm):
        """Places in cm across an edge (open at positive x), and the dose there of the kernel within a reach, as a
        share of its dose far inside."""
        kernel = self.radial(depth_cm)
        line, radius = self._grid
        cells = np.where(radius <= 10 * reach_cm, np.interp(radius, self.radii, kernel, right=0.0), 0.0)
        spread = cells.sum(axis=1)
        places = np.arange(-300, 301) * 0.1
        share = ndtr((places[:, None] - line[None, :]) / self.sigma_mm) @ spread / spread.sum()
        return places / 10, share
