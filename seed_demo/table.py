"""The table of the workshop's coils, read over the REST interface."""

from typing import Any

from rich.table import Table

from seed_demo.client import Client
from seed_demo.workshop import AUDITOR, PASSWORD

_CONFORMITY = {"conforms": "● conforms", "not decided": "◆ not decided"}
_PROCESS = {"signal": "▲ signal"}


def coils_table(address: str) -> Table:
    """One row a reading: expected for this very coil, measured, and the three answers."""
    table = Table(title="Coils (all invented)", show_lines=True)
    table.add_column("coil, recipe, turns", no_wrap=True)
    table.add_column("R expected\nand measured", justify="right", no_wrap=True)
    table.add_column("L expected\nand measured", justify="right", no_wrap=True)
    table.add_column("does it conform? as predicted?\ndoes the process drift? now")
    api = Client(address, AUDITOR, PASSWORD)
    try:
        for run in reversed(api.get("/runs", limit=200)):
            for verdict in reversed(api.get(f"/runs/{run['serial']}/verdicts")):
                table.add_row(*_row(run, verdict))
    finally:
        api.close()
    return table


def _row(run: dict[str, Any], verdict: dict[str, Any]) -> list[str]:
    agreement = verdict["reasoning"]["agreement"]
    found = {one["characteristic"]: one for one in agreement["differences"]}
    recipe = run["recipe"]["recipe"].removesuffix(" (invented)")
    answers = [
        _CONFORMITY.get(verdict["conformity"], f"■ {verdict['conformity']}"),
        _predicted(verdict["agreement"], agreement),
        f"{_PROCESS.get(verdict['process'], verdict['process'])}; {run['state']}",
    ]
    return [
        f"{run['label']}\n{recipe}\n{agreement['turns']}",
        _pair(found.get("resistance"), "Ω"),
        _pair(found.get("inductance"), "H"),
        "\n".join(answers),
    ]


def _predicted(answer: str, agreement: dict[str, Any]) -> str:
    """The second answer with its likeliest cause, and one that looks the same."""
    if not agreement["causes"]:
        return answer
    likely = agreement["causes"][0]
    groups: list[list[str]] = agreement["not_told_apart"]
    alike = next((group for group in groups if likely["cause"] in group), [])
    others = [cause for cause in alike if cause != likely["cause"]]
    words = f"{answer}: {likely['cause']} ({100 * likely['probability']:.0f} %)"
    return f"{words}, or {others[0]}" if others else words


_PREFIXES = ((1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "µ"))


def _pair(found: dict[str, Any] | None, unit: str) -> str:
    if found is None:
        return "–"
    return f"{_quantity(found, 'expected', unit)}\n{_quantity(found, 'measured', unit)}"


def _quantity(found: dict[str, Any], what: str, unit: str) -> str:
    value, doubt = found[what], found[f"{what}_uncertainty"]
    scale, prefix = next((pair for pair in _PREFIXES if abs(value) >= pair[0]), _PREFIXES[-1])
    return f"{value / scale:.4g} ± {doubt / scale:.1g} {prefix}{unit}"
