"""What a coil wound to a recipe should show: the answer of predictions, in the trade's units."""

from functools import lru_cache
from typing import Final

from pydantic import BaseModel, ConfigDict, Field

from service.errors import InvalidValue
from service.physics.caution import Caution
from service.physics.design import Design, Learned
from service.physics.expectation import Expectation, expect
from service.recipes.body import RecipeBody
from service.recipes.building import to_design

# Field of the answer: the kernel's output, and what turns its SI value into the field's unit.
FIELDS: Final[dict[str, tuple[str, float]]] = {
    "resistance_ohm": ("resistance", 1.0),
    "resistance_at_20_c_ohm": ("resistance_20", 1.0),
    "inductance_h": ("inductance", 1.0),
    "air_inductance_h": ("air_inductance", 1.0),
    "apparent_inductance_h": ("apparent_inductance", 1.0),
    "quality_factor": ("quality_factor", 1.0),
    "self_capacitance_f": ("self_capacitance", 1.0),
    "self_resonance_hz": ("self_resonance", 1.0),
    "output_mv": ("output", 1e3),
    "wire_length_m": ("wire_length", 1.0),
    "wire_mass_g": ("wire_mass", 1e3),
    "outer_build_mm": ("outer_build", 1e3),
    "fill_factor": ("fill_factor", 1.0),
    "pole_flux_density_t": ("pole_flux_density", 1.0),
    "force_factor_n_per_a": ("force_factor", 1.0),
}
_KEPT: Final = 256


class Quantity(BaseModel):
    """A value and its standard uncertainty, in the unit of the field's name."""

    model_config = ConfigDict(frozen=True)

    value: float
    standard_uncertainty: float


class BudgetLine(BaseModel):
    """What one input contributes to the standard uncertainty of each result."""

    model_config = ConfigDict(frozen=True)

    input: str
    value: float
    unit: str
    standard_uncertainty: float
    source: str = Field(
        description="What coils share this error: those of a spool, former, magnets, motor, "
        "model (the recipe), or the coil alone."
    )
    contribution: dict[str, float] = Field(description="By result, in the result's unit.")
    share: dict[str, float] = Field(description="By result, of its variance, 0 to 1.")


class Warning_(BaseModel):  # noqa: N801 - `Warning` is Python's own
    """Something to look at before winding."""

    model_config = ConfigDict(frozen=True, title="Warning")

    code: str
    sentence: str


class PredictionAnswer(BaseModel):
    """What a coil of this recipe should show."""

    model_config = ConfigDict(frozen=True)

    resistance_ohm: Quantity = Field(description="At the recipe's temperature.")
    resistance_at_20_c_ohm: Quantity
    inductance_h: Quantity = Field(
        description="True series inductance at the test frequency, poles or core fitted."
    )
    air_inductance_h: Quantity = Field(description="Without poles or core.")
    apparent_inductance_h: Quantity = Field(
        description="As a meter shows it in series at the test frequency, with the coil's own "
        "capacitance across it."
    )
    quality_factor: Quantity = Field(description="At the test frequency, series.")
    self_capacitance_f: Quantity = Field(description="Raw winding without leads.")
    self_resonance_hz: Quantity
    output_mv: Quantity = Field(description="Open circuit, root mean square, fundamental.")
    wire_length_m: Quantity = Field(description="As laid, without leads.")
    wire_mass_g: Quantity = Field(description="Bare conductor, without enamel.")
    outer_build_mm: Quantity = Field(description="Mean depth of the winding.")
    fill_factor: Quantity = Field(description="Conductor over section.")
    pole_flux_density_t: Quantity = Field(description="On the axis at the poles' tops.")
    force_factor_n_per_a: Quantity | None = Field(
        description="For a stated flux density in the gap; null without one."
    )
    outer_build_greatest_mm: float
    uncertainty_budget: list[BudgetLine]
    warnings: list[Warning_]
    kernel_version: str


def predict(body: RecipeBody, learned: Learned | None = None) -> PredictionAnswer:
    """Return what a coil wound to a recipe should show.

    Raises:
        InvalidValue: parts that do not fit together, or a design that the physics refuses.

    The last predictions are kept by the recipe's content: asked again, the answer is the same
    object.
    """
    return _known(body.model_dump_json(), learned)


@lru_cache(maxsize=_KEPT)
def _known(content: str, learned: Learned | None) -> PredictionAnswer:
    body = RecipeBody.model_validate_json(content)
    return answer(expectation_of(to_design(body, learned)), body)


def expectation_of(design: Design) -> Expectation:
    """Return the kernel's expectation; what it refuses becomes a problem that can be told.

    Raises:
        InvalidValue: the physics refuses the design.
    """
    try:
        return expect(design)
    except ValueError as error:
        raise InvalidValue(
            f"No such coil can be reckoned: {error}.",
            mend="Correct the dimension that is named.",
        ) from error


def answer(expectation: Expectation, body: RecipeBody) -> PredictionAnswer:
    """Return an expectation in the units of the answer's field names."""
    quantities = {}
    for field, (name, factor) in FIELDS.items():
        found = expectation.quantity(name)
        quantities[field] = Quantity(
            value=found.value * factor, standard_uncertainty=found.standard_uncertainty * factor
        )
    budget = [
        BudgetLine(
            input=row.input.name,
            value=row.input.value,
            unit=row.input.unit,
            standard_uncertainty=row.input.standard_uncertainty,
            source=row.input.source,
            contribution={f: row.contributions[name] * k for f, (name, k) in FIELDS.items()},
            share={f: row.shares[name] for f, (name, _k) in FIELDS.items()},
        )
        for row in expectation.budget()
    ]
    force = quantities.pop("force_factor_n_per_a")
    cautions = [*expectation.cautions, *_of_the_tolerance(expectation, body)]
    return PredictionAnswer(
        **quantities,
        force_factor_n_per_a=force if expectation.design.gap_flux_density is not None else None,
        outer_build_greatest_mm=expectation.lay.outer_build_greatest * 1e3,
        uncertainty_budget=budget,
        warnings=[Warning_(code=one.code, sentence=one.sentence) for one in cautions],
        kernel_version=expectation.kernel_version,
    )


def _of_the_tolerance(expectation: Expectation, body: RecipeBody) -> list[Caution]:
    """Whether the tolerance can be kept with what is known of the wire."""
    percent = None if body.tolerance is None else body.tolerance.resistance_percent
    if percent is None or expectation.design.spool is not None:
        return []
    wire = next(row for row in expectation.inputs if row.name == "wire resistance per metre")
    doubt = 200.0 * wire.standard_uncertainty / wire.value
    if doubt <= percent:
        return []
    return [
        Caution(
            "spool-not-measured",
            f"The standard lets this wire vary by about {doubt:.0f} % (twice the standard "
            f"uncertainty), more than the tolerance of {percent:g} % on resistance: measure the "
            "spool's ohm per metre.",
        )
    ]
