"""Bodies of an invented workshop's spools and magnets."""

from typing import Any

from fastapi.testclient import TestClient

Json = dict[str, Any]

SPOOLS = "/api/v1/spools"
MAGNET_LOTS = "/api/v1/magnet-lots"


def spool(**changes: Any) -> Json:
    usual = {
        "wire_size": "AWG 42",
        "wire_build": "single",
        "supplier_lot": "INV-2026-07",
        "net_mass_kg": 1.2,
    }
    return {**usual, **changes}


def magnets(**changes: Any) -> Json:
    usual = {
        "material": "alnico 5",
        "piece": "rod 4.8 x 17 mm",
        "supplier_lot": "INV-M-3",
        "pieces": 600,
    }
    return {**usual, **changes}


def received(client: TestClient, **changes: Any) -> Json:
    """A spool that was received, as answered."""
    answer = client.post(SPOOLS, json=spool(**changes))
    assert answer.status_code == 201, answer.text
    body: Json = answer.json()
    return body
