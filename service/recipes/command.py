"""A recipe file's prediction at the terminal: a table for people, JSON for scripts."""

from rich.console import Console
from rich.table import Table

from service.recipes.body import read_recipe
from service.recipes.prediction import PredictionAnswer, Quantity, predict

# Field of the answer: what a person calls it, and how many of the unit make one of the field's.
_ROWS: tuple[tuple[str, str, str, float], ...] = (
    ("resistance_ohm", "resistance, at the recipe's temperature", "Ω", 1.0),
    ("resistance_at_20_c_ohm", "resistance at 20 °C", "Ω", 1.0),
    ("inductance_h", "inductance, poles fitted", "mH", 1e3),
    ("apparent_inductance_h", "inductance as the meter shows it", "mH", 1e3),
    ("air_inductance_h", "inductance without poles", "mH", 1e3),
    ("quality_factor", "Q at the test frequency", "", 1.0),
    ("self_capacitance_f", "self-capacitance", "pF", 1e12),
    ("self_resonance_hz", "self-resonance", "kHz", 1e-3),
    ("output_mv", "output for the stated string", "mV", 1.0),
    ("pole_flux_density_t", "flux density at the poles' tops", "mT", 1e3),
    ("force_factor_n_per_a", "force factor", "N/A", 1.0),
    ("wire_length_m", "wire", "m", 1.0),
    ("wire_mass_g", "bare conductor", "g", 1.0),
    ("outer_build_mm", "depth of the winding", "mm", 1.0),
    ("fill_factor", "copper fill", "", 1.0),
)
_LARGEST_PARTS = 3


def print_prediction(text: str, *, as_json: bool) -> None:
    """Print what a coil of the recipe in ``text`` should show. Raises InvalidValue."""
    answer = predict(read_recipe(text))
    console = Console(highlight=False, soft_wrap=as_json)
    if as_json:
        console.print(answer.model_dump_json(indent=2), markup=False)
        return
    table = Table("what", "expected", "standard uncertainty", "mostly from")
    for field, name, unit, factor in _ROWS:
        found: Quantity | None = getattr(answer, field)
        if found is None:
            continue
        table.add_row(
            name,
            f"{found.value * factor:.5g} {unit}".rstrip(),
            f"{found.standard_uncertainty * factor:.2g} {unit}".rstrip(),
            _mostly_from(answer, field),
        )
    console.print(table)
    for warning in answer.warnings:
        console.print(f"▲ {warning.sentence}", markup=False)


def _mostly_from(answer: PredictionAnswer, field: str) -> str:
    """The inputs that make most of a result's variance, with their shares."""
    shares = sorted(
        ((line.share.get(field, 0.0), line.input) for line in answer.uncertainty_budget),
        reverse=True,
    )[:_LARGEST_PARTS]
    return ", ".join(f"{name} {100 * share:.0f} %" for share, name in shares if share >= 0.05)
