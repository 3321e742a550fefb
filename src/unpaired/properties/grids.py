"""Planes and boxes around a molecule: where a picture of the spin density is taken."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

FLAT_BOHR = 0.05
"""Nuclei that all lie this close to a plane are shown in it."""
COLLINEAR = 1e-3
"""Sine of the angle below which three atoms make no plane."""


@dataclass(frozen=True, eq=False)
class Plane:
    """A rectangle of points in space."""

    origin_bohr: Array
    """Middle of the rectangle."""
    right: Array
    """Unit vector of the horizontal axis."""
    up: Array
    """Unit vector of the vertical axis."""
    half_width_bohr: float
    half_height_bohr: float

    @property
    def normal(self) -> Array:
        """Unit vector out of the plane."""
        return np.cross(self.right, self.up)

    def axes_bohr(self, spacing_bohr: float) -> tuple[Array, Array]:
        """Horizontal and vertical coordinates of the points."""
        columns = 2 * int(np.ceil(self.half_width_bohr / spacing_bohr)) + 1
        rows = 2 * int(np.ceil(self.half_height_bohr / spacing_bohr)) + 1
        return (
            np.linspace(-self.half_width_bohr, self.half_width_bohr, columns),
            np.linspace(-self.half_height_bohr, self.half_height_bohr, rows),
        )

    def points_bohr(self, spacing_bohr: float) -> Array:
        """Positions in space, shape (rows * columns, 3), row by row from below."""
        across, upwards = self.axes_bohr(spacing_bohr)
        return np.asarray(
            self.origin_bohr
            + (across[None, :, None] * self.right + upwards[:, None, None] * self.up).reshape(-1, 3)
        )

    def seen(self, coordinates_bohr: Array) -> tuple[Array, Array]:
        """Positions of nuclei in the plane, shape (atoms, 2), and their heights above it, shape (atoms,)."""
        away = coordinates_bohr - self.origin_bohr
        return np.stack([away @ self.right, away @ self.up], axis=1), away @ self.normal


def molecular_plane(coordinates_bohr: Array, margin_bohr: float) -> tuple[Plane, float]:
    """The plane that fits all nuclei best, long axis to the right, and the largest distance from it in bohr."""
    centred = coordinates_bohr - coordinates_bohr.mean(axis=0)
    _, _, axes = np.linalg.svd(np.vstack([centred, np.zeros((3, 3))]))
    plane = _around(coordinates_bohr, coordinates_bohr.mean(axis=0), axes[0], axes[1], margin_bohr)
    return plane, float(np.abs(centred @ axes[2]).max())


def plane_through(three_bohr: Array, coordinates_bohr: Array, margin_bohr: float) -> Plane:
    """The plane of three positions, shape (3, 3); the first two lie along the horizontal axis.

    Raises ValueError if they lie on a line.
    """
    first, second = three_bohr[1] - three_bohr[0], three_bohr[2] - three_bohr[0]
    across = np.cross(first, second)
    lengths = np.linalg.norm(first) * np.linalg.norm(second)
    if lengths == 0 or np.linalg.norm(across) < COLLINEAR * lengths:
        raise ValueError("the three atoms lie on a line, which makes no plane")
    right = first / np.linalg.norm(first)
    up = np.cross(across / np.linalg.norm(across), right)
    return _around(coordinates_bohr, three_bohr.mean(axis=0), right, up, margin_bohr)


def _around(coordinates_bohr: Array, origin: Array, right: Array, up: Array, margin_bohr: float) -> Plane:
    """The rectangle in a plane that holds all nuclei, seen along its normal, and a margin."""
    seen = np.stack([(coordinates_bohr - origin) @ right, (coordinates_bohr - origin) @ up], axis=1)
    low, high = seen.min(axis=0) - margin_bohr, seen.max(axis=0) + margin_bohr
    middle = (low + high) / 2
    half = (high - low) / 2
    return Plane(origin + middle[0] * right + middle[1] * up, right, up, float(half[0]), float(half[1]))


@dataclass(frozen=True, eq=False)
class Box:
    """A regular grid of points with equal spacing along x, y and z."""

    origin_bohr: Array
    """The first point."""
    counts: tuple[int, int, int]
    """Points along x, y and z."""
    spacing_bohr: float

    @property
    def size(self) -> int:
        """Number of points."""
        return self.counts[0] * self.counts[1] * self.counts[2]

    def slab_bohr(self, layer: int) -> Array:
        """Points of one layer of constant z, x running fastest, shape (nx ny, 3)."""
        x, y, z = (
            start + self.spacing_bohr * np.arange(count)
            for start, count in zip(self.origin_bohr, self.counts, strict=True)
        )
        return np.stack(
            [np.tile(x, len(y)), np.repeat(y, len(x)), np.full(len(x) * len(y), z[layer])], axis=1
        )


def box_around(coordinates_bohr: Array, margin_bohr: float, spacing_bohr: float) -> Box:
    """The box that leaves a margin around all nuclei."""
    low = coordinates_bohr.min(axis=0) - margin_bohr
    extent = coordinates_bohr.max(axis=0) + margin_bohr - low
    counts = np.ceil(extent / spacing_bohr).astype(int) + 1
    return Box(low, (int(counts[0]), int(counts[1]), int(counts[2])), spacing_bohr)


def vtk_image(box: Box, values: Array, name: str, comment: str) -> str:
    """VTK XML ImageData (.vti), text values, x running fastest; the open format's layout as VTK documents it."""
    last = [count - 1 for count in box.counts]
    extent = f"0 {last[0]} 0 {last[1]} 0 {last[2]}"
    origin = " ".join(f"{value:.10g}" for value in box.origin_bohr)
    lines = [" ".join(f"{value:.6e}" for value in row) for row in values.reshape(-1, box.counts[0])]
    return (
        '<?xml version="1.0"?>\n'
        f"<!-- {_plain(comment)} -->\n"
        '<VTKFile type="ImageData" version="1.0" byte_order="LittleEndian">\n'
        f'<ImageData WholeExtent="{extent}" Origin="{origin}" Spacing="{" ".join([f"{box.spacing_bohr:.10g}"] * 3)}">\n'
        f'<Piece Extent="{extent}">\n<PointData Scalars="{name}">\n'
        f'<DataArray type="Float64" Name="{name}" format="ascii">\n'
        + "\n".join(lines)
        + "\n</DataArray>\n</PointData>\n</Piece>\n</ImageData>\n</VTKFile>\n"
    )


def _plain(comment: str) -> str:
    """Text that may stand in an XML comment."""
    return comment.replace("--", "- -").replace("<", "(").replace(">", ")")


def labelled_atoms(labels: Sequence[str], wanted: Sequence[str]) -> list[int]:
    """0-based places of three different labels. Raises ValueError naming the wrong one."""
    unknown = [label for label in wanted if label not in labels]
    if unknown:
        raise ValueError(f"there is no atom {', '.join(unknown)}")
    if len(set(wanted)) != 3:
        raise ValueError("a plane needs three different atoms")
    return [labels.index(label) for label in wanted]
