"""The recipe file: what a coil is made of and what it must measure, with units in the names.

The same body is read from a file at the command line, posted for a prediction, and kept with a
recipe's revision. Limits of single fields stand here; whether the parts fit together is told by
`service.recipes.building`.
"""

from typing import Annotated, Any, Final, Literal

from pydantic import ConfigDict, Field, ValidationError, field_validator
from pydantic_core import PydanticCustomError
from pydantic_core.core_schema import ValidationInfo

from service.errors import InvalidValue
from service.physics.voice_coil import former_material
from service.physics.wire import available_designations, standard_wire
from service.web.schemas import Body, Flag, Number, Whole

EXAMPLE: Final[dict[str, Any]] = {
    "former": {
        "straight_x_mm": 52.0,
        "straight_y_mm": 0.0,
        "corner_radius_mm": 3.0,
        "winding_height_mm": 11.0,
        "flange_build_mm": 5.5,
    },
    "wire": {
        "conductor": "copper",
        "size": "AWG 42",
        "build": "single",
        "spool_resistance_ohm_per_m": None,
    },
    "turns": 7600,
    "scatter": {
        "traverse": "triangle",
        "turns_per_pass": 60,
        "wander_mm": 0.10,
        "edge_dwell_turns": 2,
        "tension_n": 0.20,
    },
    "poles": {
        "count": 6,
        "diameter_mm": 4.8,
        "length_mm": 17.0,
        "pitch_mm": 10.4,
        "offset_mm": 0.0,
        "material": "alnico 5",
    },
    "conditions": {"temperature_c": 20.0, "test_frequency_hz": 1000.0},
    "tolerance": {"resistance_percent": 5.0, "inductance_percent": 8.0, "turns": 10},
}
VOICE_COIL_EXAMPLE: Final[dict[str, Any]] = {
    "former": {
        "straight_x_mm": 0.0,
        "straight_y_mm": 0.0,
        "corner_radius_mm": 12.75,
        "winding_height_mm": 12.0,
        "flange_build_mm": 0.6,
    },
    "wire": {"conductor": "copper", "size": "0.200 mm", "build": "grade 1"},
    "turns": 104,
    "layers": 2,
    "former_material": "aluminium",
    "former_thickness_mm": 0.1,
    "former_length_mm": 30.0,
    "lead_resistance_ohm": 0.05,
    "conditions": {
        "temperature_c": 20.0,
        "test_frequency_hz": 1000.0,
        "gap_flux_density_t": 1.1,
        "gap_height_mm": 6.0,
    },
    "tolerance": {"resistance_percent": 5.0, "inductance_percent": 15.0, "turns": 0},
}

Text = Annotated[str, Field(strict=True, min_length=1, max_length=60)]


class FormerPart(Body):
    """A former as a rounded rectangle: round with both straights 0, a racetrack with one."""

    straight_x_mm: Annotated[Number, Field(ge=0, le=500)]
    straight_y_mm: Annotated[Number, Field(ge=0, le=500)]
    corner_radius_mm: Annotated[Number, Field(ge=0, le=250)] = Field(
        description="Of the innermost turn; half the diameter of a round former."
    )
    winding_height_mm: Annotated[Number, Field(ge=0.1, le=500)]
    flange_build_mm: Annotated[Number, Field(gt=0, le=250)] | None = Field(
        default=None, description="Depth that the flanges or the gap leave; null for no limit."
    )


class WirePart(Body):
    """A standard enamelled wire, and what was measured on the spool."""

    conductor: Literal[
        "copper", "aluminium", "copper-clad aluminium 10 %", "copper-clad aluminium 15 %"
    ] = "copper"
    size: Text = Field(description="'AWG 20' to 'AWG 46', or a metric size like '0.063 mm'.")
    build: Text = Field(description="single or heavy (AWG); grade 1 or grade 2 (metric).")
    spool_resistance_ohm_per_m: Annotated[Number, Field(ge=1e-3, le=1e3)] | None = Field(
        default=None, description="Measured on the spool, at 20 °C; null if not measured."
    )
    spool_standard_uncertainty_ohm_per_m: Annotated[Number, Field(ge=0, le=100)] | None = Field(
        default=None, description="0.5 % of the value if null."
    )

    @field_validator("size")
    @classmethod
    def _known_size(cls, size: str) -> str:
        for build in ("single", "grade 1"):
            try:
                standard_wire(size, build)
            except ValueError as error:
                if "build of" not in str(error):
                    known = available_designations()
                    raise PydanticCustomError(
                        "unknown_wire",
                        "{size} is no standard wire; use AWG 20 to AWG 46, or a metric size of "
                        "IEC 60317-0-1 such as 0.063 mm ({count} sizes are known)",
                        {"size": repr(size), "count": len(known)},
                    ) from error
            else:
                break
        return size

    @field_validator("build")
    @classmethod
    def _known_build(cls, build: str, info: ValidationInfo) -> str:
        size = info.data.get("size")
        if size is not None:
            try:
                standard_wire(size, build)
            except ValueError as error:
                raise PydanticCustomError(
                    "unknown_build",
                    "{build} is no build of {size}; use single or heavy for AWG sizes, grade 1 "
                    "or grade 2 for metric sizes",
                    {"build": repr(build), "size": size},
                ) from error
        return build


class ScatterPart(Body):
    """How the wire is spread over the winding height."""

    traverse: Literal["triangle", "sine", "stepped", "hand"]
    turns_per_pass: Annotated[Number, Field(ge=1, le=10_000)] = Field(
        description="Turns from one flange to the other."
    )
    wander_mm: Annotated[Number, Field(ge=0, le=50)] = Field(
        description="Standard deviation of a turn's place from the guide's."
    )
    edge_dwell_turns: Annotated[Number, Field(ge=0, le=1_000)] = 0.0
    tension_n: Annotated[Number, Field(ge=0, le=50)]
    seed: Annotated[Whole, Field(ge=0, le=2**32 - 1)] = Field(
        default=0, description="The same seed gives the same random lay."
    )


class PolesPart(Body):
    """A row of rods along the longer straight side, centred in the coil."""

    count: Annotated[Whole, Field(ge=1, le=24)]
    diameter_mm: Annotated[Number, Field(ge=0.5, le=200)]
    length_mm: Annotated[Number, Field(ge=0.5, le=500)]
    pitch_mm: Annotated[Number, Field(ge=0, le=200)] = Field(
        default=0.0, description="From rod to rod; not looked at for a single rod."
    )
    offset_mm: Annotated[Number, Field(ge=-250, le=250)] = Field(
        default=0.0, description="Of the rods' middle above the middle of the winding."
    )
    material: Text


class MagnetBarPart(Body):
    """A bar magnet under soft rods, magnetised upward, centred below them."""

    length_mm: Annotated[Number, Field(ge=1, le=500)] = Field(description="Along the row of rods.")
    width_mm: Annotated[Number, Field(ge=1, le=200)]
    thickness_mm: Annotated[Number, Field(ge=0.5, le=200)]
    gap_mm: Annotated[Number, Field(ge=0, le=100)] = Field(
        default=0.0, description="From the bar's upper face to the rods' lower ends."
    )
    material: Text


class CorePart(Body):
    """A pole piece on the axis of a round coil."""

    diameter_mm: Annotated[Number, Field(ge=0.5, le=500)]
    length_mm: Annotated[Number, Field(ge=0.5, le=500)]
    offset_mm: Annotated[Number, Field(ge=-250, le=250)] = 0.0
    material: Text


class StringPart(Body):
    """The string that the output is predicted for; it swings over the middle rod."""

    diameter_mm: Annotated[Number, Field(ge=0.1, le=3)] = Field(
        default=0.43, description="Of the ferrous core."
    )
    distance_mm: Annotated[Number, Field(ge=0.5, le=30)] = Field(
        default=3.0, description="From the rod's top to the string's middle at rest."
    )
    amplitude_mm: Annotated[Number, Field(ge=0, le=20)] = 0.5
    frequency_hz: Annotated[Number, Field(ge=10, le=10_000)] = 196.0
    ferrous: Flag = True


class ConditionsPart(Body):
    """At what the coil is measured, and the motor that a voice coil works in."""

    temperature_c: Annotated[Number, Field(ge=-40, le=150)] = 20.0
    test_frequency_hz: Annotated[Number, Field(ge=1, le=1e6)] = 1000.0
    gap_flux_density_t: Annotated[Number, Field(ge=0, le=3)] | None = None
    gap_height_mm: Annotated[Number, Field(gt=0, le=200)] | None = None


class StageLimitPart(Body):
    """A limit at one stage, besides the tolerance that holds at every stage."""

    stage: Literal["raw", "potted", "final"]
    characteristic: Literal["resistance", "inductance", "self_resonance", "quality_factor"]
    lower: Annotated[Number, Field(ge=-1e9, le=1e9)] | None = None
    upper: Annotated[Number, Field(ge=-1e9, le=1e9)] | None = Field(
        default=None, validate_default=True
    )
    kind: Literal["relative", "absolute"] = Field(
        description="relative: in % from the nominal value; absolute: in ohm, H, Hz or 1."
    )

    @field_validator("upper")
    @classmethod
    def _a_range(cls, upper: float | None, info: ValidationInfo) -> float | None:
        lower = info.data.get("lower")
        if upper is not None and lower is not None and upper <= lower:
            raise PydanticCustomError(
                "empty_range",
                "must be above lower ({lower}), got {upper}",
                {"lower": lower, "upper": upper},
            )
        if upper is None and lower is None and "lower" in info.data:
            raise PydanticCustomError("no_limit", "state lower, upper or both")
        return upper


class TolerancePart(Body):
    """What the customer allows."""

    resistance_percent: Annotated[Number, Field(gt=0, le=100)] | None = None
    inductance_percent: Annotated[Number, Field(gt=0, le=100)] | None = None
    turns: Annotated[Whole, Field(ge=0, le=10_000)] | None = None
    nominal_resistance_ohm: Annotated[Number, Field(gt=0, le=1e7)] | None = Field(
        default=None, description="At 20 °C; the recipe's own expectation if null."
    )
    nominal_inductance_h: Annotated[Number, Field(gt=0, le=1e4)] | None = Field(
        default=None, description="The recipe's own expectation if null."
    )
    stage_limits: Annotated[list[StageLimitPart], Field(max_length=24)] = Field(
        default_factory=list
    )


class RecipeBody(Body):
    """A recipe: former, wire, turns, lay, what stands inside, conditions and tolerance."""

    model_config = ConfigDict(json_schema_extra={"examples": [EXAMPLE, VOICE_COIL_EXAMPLE]})

    former: FormerPart
    wire: WirePart
    turns: Annotated[Whole, Field(ge=1, le=100_000)]
    scatter: ScatterPart | None = Field(default=None, description="Null for even layers.")
    layers: Annotated[Whole, Field(ge=1, le=200)] | None = Field(
        default=None, description="Number of even layers; null to fill the height."
    )
    poles: PolesPart | None = None
    magnet_bar: MagnetBarPart | None = Field(default=None, description="Under soft rods.")
    core: CorePart | None = Field(default=None, description="Pole piece of a round coil.")
    former_material: Text | None = Field(
        default=None, description="A closed metal former is a shorted turn."
    )
    former_thickness_mm: Annotated[Number, Field(gt=0, le=20)] | None = None
    former_length_mm: Annotated[Number, Field(gt=0, le=500)] | None = None
    former_slit: Flag = Field(
        default=False, description="A slit metal former carries no current round the coil."
    )
    lead_resistance_ohm: Annotated[Number, Field(ge=0, le=1e4)] | None = None
    gap_flux_density_t: Annotated[Number, Field(ge=0, le=3)] | None = Field(
        default=None, description="May stand here or under conditions."
    )
    string: StringPart | None = Field(
        default=None, description="A plain steel string 3 mm above the rods if null."
    )
    conditions: ConditionsPart = Field(default_factory=ConditionsPart)
    tolerance: TolerancePart | None = None

    @field_validator("former_material")
    @classmethod
    def _known_former_material(cls, name: str | None) -> str | None:
        if name is not None:
            try:
                former_material(name)
            except ValueError as error:
                raise PydanticCustomError(
                    "unknown_material", "{why}", {"why": str(error)}
                ) from error
        return name


def read_recipe(text: str | bytes) -> RecipeBody:
    """Read a recipe from JSON text.

    Raises:
        InvalidValue: what is wrong with the first field that is wrong, and what to do.
    """
    try:
        return RecipeBody.model_validate_json(text)
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        pointer = "".join(f"/{part}" for part in first["loc"])
        given = first.get("input")
        shown = None if isinstance(given, dict | list | bytes) else given
        name = str(first["loc"][-1]) if first["loc"] else "the recipe"
        raise InvalidValue(
            f"{name}: {first['msg']}.",
            pointer=pointer or None,
            value=shown,
            mend="Correct this field and read the recipe again.",
        ) from error
