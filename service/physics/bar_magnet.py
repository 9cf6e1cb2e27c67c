"""A rectangular bar magnet under the poles or beside their lower ends."""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from service.physics.arguments import finite, positive
from service.physics.gauss import gauss_legendre
from service.physics.magnet import MagnetGrade
from service.physics.rod_mesh import Floats

_AVERAGE: Final = 10
# Keeps 0/0 finite on an edge of the bar.
_TINY: Final = 1e-250
_CONTACT: Final = 1e-9


@dataclass(frozen=True, slots=True)
class BarMagnet:
    """A bar with its upper face at `top`, north pole up or, `across`, toward +y.

    Attributes:
        length, width: along x and y, m.
        thickness: along the axis, m.
        top: height of its upper face over the coil's mid-plane, m.
        grade: of the magnet.
        x, y: place of its middle, m.
        across: magnetised through its width, as a bar between two rows of poles is, instead of
            through its thickness, as a bar under a row is.
    """

    length: float
    width: float
    thickness: float
    top: float
    grade: MagnetGrade
    x: float = 0.0
    y: float = 0.0
    across: bool = False

    def __post_init__(self) -> None:
        for name in ("length", "width", "thickness"):
            object.__setattr__(self, name, positive(name, getattr(self, name)))
        for name in ("top", "x", "y"):
            object.__setattr__(self, name, finite(name, getattr(self, name)))

    @property
    def volume(self) -> float:
        """In m3."""
        return self.length * self.width * self.thickness

    def field(self, points: Floats) -> Floats:
        """Return H outside the bar for a magnetisation of one, dimensionless, at x, y, z in m.

        Closed form of two evenly charged rectangles. Places on the bar's surface count as
        outside it.
        """
        offset = points - np.array([self.x, self.y, self.top - 0.5 * self.thickness])
        sizes = np.array([self.length, self.width, self.thickness])
        # Turned so that the last axis is that of the magnetisation.
        order = [2, 0, 1] if self.across else [0, 1, 2]
        offset, (half_u, half_v, half_w) = offset[..., order], 0.5 * sizes[order]
        to_north, to_south = offset.copy(), offset
        to_north[..., 2] -= half_w
        to_south[..., 2] += half_w
        for away, sign in ((to_north[..., 2], 1.0), (to_south[..., 2], -1.0)):
            away[np.abs(away) < _CONTACT * half_w] = sign * _CONTACT * half_w
        field = _sheet_field(to_north, half_u, half_v) - _sheet_field(to_south, half_u, half_v)
        back: Floats = field[..., np.argsort(order)]
        return back

    def demagnetising_factor(self) -> float:
        """Return the factor along the magnetisation, averaged over the volume, to 1e-3."""
        node, weight = gauss_legendre(_AVERAGE)
        shape = 0.125 * weight[:, None, None] * weight[:, None] * weight
        points = np.stack(
            np.meshgrid(
                self.x + 0.5 * self.length * node,
                self.y + 0.5 * self.width * node,
                self.top + 0.5 * self.thickness * (node - 1.0),
                indexing="ij",
            ),
            axis=-1,
        )
        along = self.field(points)[..., 1 if self.across else 2]
        return -float(np.sum(shape * along))


def _sheet_field(offset: Floats, half_x: float, half_y: float) -> Floats:
    """Field of a rectangle in z = 0 with unit charge density."""
    field = np.zeros(offset.shape)
    z = offset[..., 2]
    for sign_x in (1.0, -1.0):
        u = offset[..., 0] - sign_x * half_x
        for sign_y in (1.0, -1.0):
            v = offset[..., 1] - sign_y * half_y
            sign = sign_x * sign_y
            distance = np.sqrt(u * u + v * v + z * z)
            field[..., 0] += sign * np.arcsinh(v / np.sqrt(u * u + z * z + _TINY))
            field[..., 1] += sign * np.arcsinh(u / np.sqrt(v * v + z * z + _TINY))
            field[..., 2] += sign * np.arctan(u * v / (z * distance + np.copysign(_TINY, z)))
    scaled: Floats = field * np.array([-1.0, -1.0, 1.0]) / (4.0 * math.pi)
    return scaled
