"""The former that a coil is wound on: a rounded rectangle with flanges."""

import math
from dataclasses import dataclass

from service.physics.arguments import non_negative, positive
from service.physics.section import WindingSection


@dataclass(frozen=True, slots=True)
class Former:
    """A former, lengths in m.

    Attributes:
        straight_x, straight_y: straight sides of the innermost turn; both 0 for a round former.
        corner_radius: of the innermost turn (half the diameter of a round former).
        winding_height: between the flanges, or of the winding where there are none.
        flange_build: depth that the flanges (or a gap) leave for the winding; None for no limit.
    """

    straight_x: float
    straight_y: float
    corner_radius: float
    winding_height: float
    flange_build: float | None = None

    def __post_init__(self) -> None:
        non_negative("straight_x", self.straight_x)
        non_negative("straight_y", self.straight_y)
        non_negative("corner_radius", self.corner_radius)
        positive("winding_height", self.winding_height)
        if self.flange_build is not None:
            positive("flange_build", self.flange_build)
        if self.straight_x == self.straight_y == 0.0 and self.corner_radius == 0.0:
            raise ValueError("corner_radius must be positive without straight sides, got 0")

    def turn_length(self, build: float) -> float:
        """Length in m of the turn whose middle lies `build` m outside the former.

        Straight sides keep their length, corners become quarter circles of radius
        corner_radius + build. Wire on long straight sides bows outward a little; a bow of 0.5 mm
        on 50 mm adds 13 µm and is left out.
        """
        straight = 2.0 * (self.straight_x + self.straight_y)
        return straight + 2.0 * math.pi * (self.corner_radius + non_negative("build", build))

    def section(self, build: float, height: float | None = None) -> WindingSection:
        """Winding of the given build in m on this former, filling the height unless given."""
        return WindingSection(
            self.straight_x,
            self.straight_y,
            self.corner_radius,
            self.corner_radius + positive("build", build),
            self.winding_height if height is None else height,
        )
