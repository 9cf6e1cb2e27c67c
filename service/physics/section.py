"""The shape of a coil: a winding of rectangular section around a rounded rectangle."""

import math
from dataclasses import dataclass

from service.physics.arguments import non_negative, positive


@dataclass(frozen=True, slots=True)
class WindingSection:
    """A coil around a former in the shape of a rounded rectangle, lengths in m.

    The innermost turn consists of four straight sides and four quarter circles; a turn that lies
    `u` further out keeps the straight sides and has quarter circles of radius inner_radius + u.
    With both straights 0 the coil is circular; with one it is a racetrack.

    Attributes:
        straight_x, straight_y: straight sides along x and along y.
        inner_radius: corner radius of the innermost turn (of the coil itself when circular).
        outer_radius: corner radius of the outermost turn.
        height: along the axis, between the flanges.
    """

    straight_x: float
    straight_y: float
    inner_radius: float
    outer_radius: float
    height: float

    def __post_init__(self) -> None:
        checked = {
            "straight_x": non_negative("straight_x", self.straight_x),
            "straight_y": non_negative("straight_y", self.straight_y),
            "inner_radius": non_negative("inner_radius", self.inner_radius),
            "outer_radius": positive("outer_radius", self.outer_radius),
            "height": positive("height", self.height),
        }
        for name, value in checked.items():
            object.__setattr__(self, name, value)
        if self.outer_radius <= self.inner_radius:
            raise ValueError(
                f"outer_radius must exceed inner_radius ({self.inner_radius!r}), "
                f"got {self.outer_radius!r}"
            )

    @property
    def build(self) -> float:
        """Depth of the winding on each side, m."""
        return self.outer_radius - self.inner_radius

    @property
    def mean_radius(self) -> float:
        """Corner radius of the mean turn, m."""
        return (self.inner_radius + self.outer_radius) / 2.0

    @property
    def mean_turn_length(self) -> float:
        """Length of the mean turn, m; also the mean length of turns spread evenly."""
        return self.turn_length(self.build / 2.0)

    @property
    def area(self) -> float:
        """Area of the winding's section on one side, m2."""
        return self.build * self.height

    @property
    def is_circular(self) -> bool:
        """Whether the turns are plain circles."""
        return self.straight_x == 0.0 and self.straight_y == 0.0

    def turn_length(self, build: float) -> float:
        """Length in m of the turn that lies `build` m outside the innermost one."""
        straight = 2.0 * (self.straight_x + self.straight_y)
        return straight + 2.0 * math.pi * (self.inner_radius + non_negative("build", build))
