"""The fields of a recipe, once: for the form, for reading it, and for telling it in words."""

from collections.abc import Mapping
from copy import deepcopy
from dataclasses import dataclass
from typing import Any, get_args

from service.pages.forms import Form
from service.pages.numbers import (
    CELSIUS,
    HENRY,
    HERTZ,
    MILLIMETRE,
    NEWTON,
    OHM,
    OHM_PER_METRE,
    PERCENT,
    PLAIN,
    TESLA,
    TURNS,
    Unit,
)
from service.physics.guide import TRAVERSES
from service.physics.voice_coil import FORMER_MATERIALS
from service.recipes.body import StageLimitPart
from service.recipes.building import CONDUCTORS

BUILDS = ("single", "heavy", "grade 1", "grade 2")
LIMIT_ROWS = 6
LIMIT_STAGES: tuple[str, ...] = get_args(StageLimitPart.model_fields["stage"].annotation)
LIMIT_CHARACTERISTICS: tuple[str, ...] = get_args(
    StageLimitPart.model_fields["characteristic"].annotation
)
LIMIT_KINDS: tuple[str, ...] = get_args(StageLimitPart.model_fields["kind"].annotation)


@dataclass(frozen=True)
class Field:
    """One field: its place in the body, how it is asked, and how it is read."""

    path: str
    label: str
    unit: Unit = PLAIN
    kind: str = "number"  # number | whole | text | choice | flag
    hint: str = ""
    required: bool = False
    options: tuple[str, ...] = ()
    empty: str = ""
    fresh: object = None

    @property
    def pairs(self) -> list[tuple[str, str]]:
        """The options as value and words."""
        return [(option, option) for option in self.options]


@dataclass(frozen=True)
class Group:
    """Fields that stand together. ``part`` is absent from the body where all are empty."""

    title: str
    fields: tuple[Field, ...]
    part: str = ""
    only: str = ""
    hint: str = ""


def _mm(path: str, label: str, hint: str = "", required: bool = False) -> Field:
    return Field(path, label, MILLIMETRE, hint=hint, required=required)


GROUPS = (
    Group(
        "Former",
        (
            _mm("former.straight_x_mm", "Long straight side", "0 for a round coil", True),
            _mm("former.straight_y_mm", "Short straight side", "0 for a racetrack", True),
            _mm("former.corner_radius_mm", "Corner radius", "Of the innermost turn", True),
            _mm("former.winding_height_mm", "Winding height", "Between the flanges", True),
            _mm("former.flange_build_mm", "Depth to the flange’s edge", "Empty: no limit"),
        ),
    ),
    Group(
        "Former’s material",
        (
            Field(
                "former_material",
                "Material",
                kind="choice",
                options=tuple(FORMER_MATERIALS),
                empty="not stated",
                hint="A closed metal former is a shorted turn.",
            ),
            _mm("former_thickness_mm", "Thickness"),
            _mm("former_length_mm", "Length"),
            Field("former_slit", "It is slit", kind="flag"),
        ),
        only="voice coil",
    ),
    Group(
        "Wire",
        (
            Field("wire.size", "Size", kind="text", hint="AWG 42, or 0.063 mm", required=True),
            Field("wire.build", "Build", kind="choice", options=BUILDS, fresh="single"),
            Field(
                "wire.conductor",
                "Conductor",
                kind="choice",
                options=tuple(CONDUCTORS),
                fresh="copper",
            ),
            Field(
                "wire.spool_resistance_ohm_per_m",
                "Resistance at 20 °C, if measured",
                OHM_PER_METRE,
                hint="A run takes its own spool’s; here it stands for the recipe’s expectation.",
            ),
        ),
    ),
    Group("Turns", (Field("turns", "On the coil", TURNS, "whole", required=True),)),
    Group(
        "Scatter",
        (
            Field(
                "scatter.traverse",
                "Traverse",
                kind="choice",
                options=TRAVERSES,
                empty="even layers, no scatter",
            ),
            Field("scatter.turns_per_pass", "Turns a pass", TURNS),
            _mm("scatter.wander_mm", "Wander", "Standard deviation of a turn’s place"),
            Field("scatter.edge_dwell_turns", "Turns at each flange", TURNS),
            Field("scatter.tension_n", "Tension", NEWTON, hint="20 gf is 0.196 N"),
        ),
        part="scatter",
        hint="Left out altogether: even layers.",
    ),
    Group(
        "Even layers",
        (Field("layers", "Layers", kind="whole", hint="Without scatter; empty: fill the height"),),
        only="voice coil",
    ),
    Group(
        "Poles or rod magnets",
        (
            Field("poles.count", "How many", kind="whole"),
            _mm("poles.diameter_mm", "Diameter"),
            _mm("poles.length_mm", "Length"),
            _mm("poles.pitch_mm", "From one to the next"),
            _mm("poles.offset_mm", "Middle above the coil’s middle"),
            Field("poles.material", "Material", kind="text", hint="alnico 5, steel, ferrite …"),
        ),
        part="poles",
        only="pickup",
    ),
    Group(
        "Bar magnet under the poles",
        (
            _mm("magnet_bar.length_mm", "Length"),
            _mm("magnet_bar.width_mm", "Width"),
            _mm("magnet_bar.thickness_mm", "Thickness"),
            _mm("magnet_bar.gap_mm", "Gap to the poles"),
            Field("magnet_bar.material", "Material", kind="text"),
        ),
        part="magnet_bar",
        only="pickup",
    ),
    Group(
        "Core",
        (
            _mm("core.diameter_mm", "Diameter"),
            _mm("core.length_mm", "Length"),
            _mm("core.offset_mm", "Middle above the coil’s middle"),
            Field("core.material", "Material", kind="text", hint="steel, soft iron …"),
        ),
        part="core",
        only="voice coil",
    ),
    Group(
        "Conditions",
        (
            Field("conditions.temperature_c", "Coil’s temperature", CELSIUS, fresh=20.0),
            Field("conditions.test_frequency_hz", "Test frequency", HERTZ, fresh=1000.0),
            Field("lead_resistance_ohm", "Leads of the coil", OHM),
        ),
    ),
    Group(
        "Motor",
        (
            Field("conditions.gap_flux_density_t", "Flux density in the gap", TESLA),
            _mm("conditions.gap_height_mm", "Height of the gap"),
        ),
        only="voice coil",
    ),
    Group(
        "Tolerance",
        (
            Field("tolerance.resistance_percent", "Resistance ±", PERCENT),
            Field("tolerance.inductance_percent", "Inductance ±", PERCENT),
            Field("tolerance.turns", "Turns ±", TURNS, "whole"),
            Field(
                "tolerance.nominal_resistance_ohm",
                "around a resistance at 20 °C of",
                OHM,
                hint="Empty: around what is expected",
            ),
            Field("tolerance.nominal_inductance_h", "around an inductance of", HENRY),
        ),
        part="tolerance",
        hint="The customer’s limits, at every stage.",
    ),
)


def groups_for(kind: str) -> list[Group]:
    return [group for group in GROUPS if group.only in ("", kind)]


def at(body: Mapping[str, Any], path: str) -> Any:
    """What stands at a path of the body, None where nothing does."""
    found: Any = body
    for step in path.split("."):
        if not isinstance(found, Mapping):
            return None
        found = found.get(step)
    return found


def _put(body: dict[str, Any], path: str, value: object) -> None:
    *steps, last = path.split(".")
    for step in steps:
        inner = body.get(step)
        if not isinstance(inner, dict):
            inner = body[step] = {}
        body = inner
    body[last] = value


def body_from(form: Form, kind: str, before: Mapping[str, Any]) -> dict[str, Any]:
    """The body as the form says it; what the form does not ask stays as it was before."""
    body: dict[str, Any] = deepcopy(dict(before))
    for group in GROUPS:
        if group.only not in ("", kind):
            for field in group.fields:
                if at(body, field.path) is not None:
                    _put(body, field.path, False if field.kind == "flag" else None)
            if group.part:
                body[group.part] = None
            continue
        values = {field.path: _read(form, field) for field in group.fields}
        if group.part and _is_left_out(group, values):
            body[group.part] = None
            continue
        for path, value in values.items():
            if value is not None or at(body, path) is not None:
                _put(body, path, value)
    limits = _limits(form)
    if limits or at(body, "tolerance.stage_limits"):
        _put(body, "tolerance.stage_limits", limits)
    return body


def _is_left_out(group: Group, values: Mapping[str, object]) -> bool:
    """A part is left out where nothing is entered; a scatter, where its traverse is."""
    if group.part == "scatter":
        return values["scatter.traverse"] is None
    return all(value is None for value in values.values())


def _read(form: Form, field: Field) -> object:
    if field.kind == "flag":
        return form.flag(field.path)
    if field.kind == "choice":
        return form.optional_choice(field.path, field.options)
    if field.kind == "text":
        return form.text(field.path, 60) if field.required else form.optional_text(field.path, 60)
    if field.kind == "whole":
        return (
            form.whole(field.path, field.unit)
            if field.required
            else form.optional_whole(field.path, field.unit)
        )
    return (
        form.number(field.path, field.unit)
        if field.required
        else form.optional_number(field.path, field.unit)
    )


def _limits(form: Form) -> list[dict[str, Any]]:
    """Limits of single stages, one a row; a row without numbers is none."""
    found = []
    for row in range(LIMIT_ROWS):
        name = f"limit{row}"
        lower = form.optional_number(f"{name}.lower")
        upper = form.optional_number(f"{name}.upper")
        if lower is None and upper is None:
            continue
        found.append(
            {
                "stage": form.choice(f"{name}.stage", LIMIT_STAGES),
                "characteristic": form.choice(f"{name}.characteristic", LIMIT_CHARACTERISTICS),
                "lower": lower,
                "upper": upper,
                "kind": form.choice(f"{name}.kind", LIMIT_KINDS),
            }
        )
    return found


@dataclass(frozen=True)
class Told:
    """A group of the body in words."""

    title: str
    facts: list[tuple[str, str]]


def told(body: Mapping[str, Any], kind: str) -> list[Told]:
    """The body as a list to read: only what is stated."""
    groups = []
    for group in groups_for(kind):
        facts = [
            (field.label, _in_words(value, field))
            for field in group.fields
            if (value := at(body, field.path)) is not None and value is not False
        ]
        if facts:
            groups.append(Told(group.title, facts))
    return groups


def _in_words(value: Any, field: Field) -> str:
    if value is True:
        return "yes"
    if isinstance(value, (int, float)):
        return f"{value:g} {field.unit.symbol}".strip()
    return str(value)


_LABELS = {field.path: field.label for group in GROUPS for field in group.fields}
_TITLES = {field.path: group.title for group in GROUPS for field in group.fields}


def name_of(pointer: str) -> str:
    """A field of the body, by JSON Pointer, as people call it."""
    path = pointer.strip("/").replace("/", ".")
    if path in _LABELS:
        return f"{_TITLES[path]}: {_LABELS[path].lower()}"
    return path.replace(".", " ").replace("_", " ")
