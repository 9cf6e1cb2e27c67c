"""Drawings of a winding to scale, in millimetres: a section and a view from above."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

_EDGE = 0.12  # share of the drawing left free round it


@dataclass(frozen=True)
class Box:
    """A rectangle, mm; y downward as SVG has it."""

    x: float
    y: float
    width: float
    height: float
    radius: float = 0.0


@dataclass(frozen=True)
class Drawing:
    """What is drawn, and the frame round it."""

    kind: str
    frame: Box
    wires: list[Box]
    formers: list[Box]
    poles: list[Box]
    discs: list[tuple[float, float, float]]
    bars: list[Box]
    flanges: list[Box]
    scale: float  # length of the scale bar, mm

    @property
    def text(self) -> float:
        return round(max(self.frame.width, self.frame.height) / 26, 3)


def drawings_of(body: Mapping[str, Any], build_mm: float | None) -> list[Drawing]:
    """The section across the coil's short side, and the view from above."""
    former = body["former"]
    build = build_mm or former.get("flange_build_mm") or 1.0
    return [_section(body, former, build), _plan(body, former, build)]


def _section(body: Mapping[str, Any], former: Mapping[str, Any], build: float) -> Drawing:
    inner = min(former["straight_x_mm"], former["straight_y_mm"]) / 2 + former["corner_radius_mm"]
    height = former["winding_height_mm"]
    depth = former.get("flange_build_mm")
    top = -height / 2
    wires = [Box(inner, top, build, height), Box(-inner - build, top, build, height)]
    flanges = []
    if depth:
        thick = max(0.4, height / 30)
        flanges = [Box(-inner - depth, y, 2 * (inner + depth), thick) for y in (top - thick, -top)]
    poles, bars = _rods_in_section(body)
    formers = [Box(-inner, top, 2 * inner, height)]
    return _framed("section", wires, formers, poles, [], bars, flanges)


def _rods_in_section(body: Mapping[str, Any]) -> tuple[list[Box], list[Box]]:
    rod = body.get("poles") or body.get("core")
    if not rod:
        return [], []
    width, length, offset = rod["diameter_mm"], rod["length_mm"], rod.get("offset_mm") or 0.0
    poles = [Box(-width / 2, -offset - length / 2, width, length)]
    bar = body.get("magnet_bar")
    if not bar:
        return poles, []
    under = -offset + length / 2 + (bar.get("gap_mm") or 0.0)
    return poles, [Box(-bar["width_mm"] / 2, under, bar["width_mm"], bar["thickness_mm"])]


def _plan(body: Mapping[str, Any], former: Mapping[str, Any], build: float) -> Drawing:
    along = max(former["straight_x_mm"], former["straight_y_mm"])
    across = min(former["straight_x_mm"], former["straight_y_mm"])
    radius = former["corner_radius_mm"]

    def ring(depth: float) -> Box:
        r = radius + depth
        return Box(-along / 2 - r, -across / 2 - r, along + 2 * r, across + 2 * r, r)

    poles = body.get("poles")
    discs: list[tuple[float, float, float]] = []
    if poles:
        count, pitch = poles["count"], poles.get("pitch_mm") or 0.0
        discs = [
            ((index - (count - 1) / 2) * pitch, 0.0, poles["diameter_mm"] / 2)
            for index in range(count)
        ]
    elif core := body.get("core"):
        discs = [(0.0, 0.0, core["diameter_mm"] / 2)]
    depth = former.get("flange_build_mm")
    flanges = [ring(depth)] if depth else []
    return _framed("plan", [ring(build)], [ring(0.0)], [], discs, [], flanges)


def _framed(
    kind: str,
    wires: list[Box],
    formers: list[Box],
    poles: list[Box],
    discs: list[tuple[float, float, float]],
    bars: list[Box],
    flanges: list[Box],
) -> Drawing:
    boxes = [*wires, *formers, *poles, *bars, *flanges]
    left = min(box.x for box in boxes)
    right = max(box.x + box.width for box in boxes)
    top = min(box.y for box in boxes)
    bottom = max(box.y + box.height for box in boxes)
    edge = _EDGE * max(right - left, bottom - top)
    # A strip below holds the scale bar.
    frame = Box(left - edge, top - edge, right - left + 2 * edge, bottom - top + 2.4 * edge)
    scale = next((step for step in (20.0, 10.0, 5.0, 2.0) if step < (right - left) / 2), 1.0)
    return Drawing(kind, frame, wires, formers, poles, discs, bars, flanges, scale)
