"""The table of the workshop's coils, read over the REST interface."""

from typing import Any

from rich.table import Table

from seed_demo.client import Client
from seed_demo.workshop import AUDITOR, PASSWORD

_CONFORMITY = {"conforms": "● conforms", "not decided": "◆ not decided"}
_PROCESS = {"signal": "▲ signal"}


def coils_table(address: str) -> Table:
    """One line a reading: expected for this very coil, measured, and the three answers."""
    table = Table(title="Coils (all invented)", show_lines=False)
    for name in ("coil", "recipe", "turns"):
        table.add_column(name, no_wrap=True)
    for name in ("R expected", "R measured", "L expected", "L measured"):
        table.add_column(name, justify="right", no_wrap=True)
    for name in ("does it conform?", "as predicted?", "drift?", "state"):
        table.add_column(name)
    api = Client(address, AUDITOR, PASSWORD)
    try:
        for run in reversed(api.get("/runs", limit=200)):
            for verdict in reversed(api.get(f"/runs/{run['serial']}/verdicts")):
                table.add_row(*_line(run, verdict))
    finally:
        api.close()
    return table


def _line(run: dict[str, Any], verdict: dict[str, Any]) -> list[str]:
    agreement = verdict["reasoning"]["agreement"]
    found = {one["characteristic"]: one for one in agreement["differences"]}
    causes = agreement["causes"]
    predicted = verdict["agreement"]
    if causes:
        predicted += f": {causes[0]['cause']} ({100 * causes[0]['probability']:.0f} %)"
    resistance, inductance = found.get("resistance"), found.get("inductance")
    return [
        run["label"],
        run["recipe"]["recipe"].removesuffix(" (invented)"),
        f"{agreement['turns']}",
        _quantity(resistance, "expected", 1.0, "Ω"),
        _quantity(resistance, "measured", 1.0, "Ω"),
        _quantity(inductance, "expected", 1.0, "H"),
        _quantity(inductance, "measured", 1.0, "H"),
        _CONFORMITY.get(verdict["conformity"], f"■ {verdict['conformity']}"),
        predicted,
        _PROCESS.get(verdict["process"], verdict["process"]),
        run["state"],
    ]


_PREFIXES = ((1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "µ"))


def _quantity(found: dict[str, Any] | None, what: str, factor: float, unit: str) -> str:
    if found is None:
        return "–"
    value, doubt = found[what] * factor, found[f"{what}_uncertainty"] * factor
    scale, prefix = next((pair for pair in _PREFIXES if abs(value) >= pair[0]), _PREFIXES[-1])
    return f"{value / scale:.4g} ± {doubt / scale:.2g} {prefix}{unit}"
