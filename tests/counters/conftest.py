"""A machine with a counter, and a coil on it."""

from dataclasses import dataclass, field
from typing import Any

import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient
from httpx import Response

from tests.runs.conftest import Floor, Hands, floor, lead

__all__ = ["Floor", "floor", "lead"]

Json = dict[str, Any]


@dataclass
class CounterClient:
    """Speaks with a device's key; numbers its events itself unless told otherwise."""

    client: TestClient
    key: str
    device_id: str
    boot: int = 1
    sequence: int = field(default=0)

    def event(self, count: int, kind: str = "total", **changes: Any) -> Json:
        self.sequence += 1
        usual = {"boot": self.boot, "sequence": self.sequence, "kind": kind, "count": count}
        return {**usual, **changes}

    def post(self, *events: Json) -> Response:
        answer: Response = self.client.post(
            "/api/v1/counters/events",
            json={"events": list(events)},
            headers={"Authorization": f"Bearer {self.key}"},
        )
        return answer

    def taken(self, *events: Json) -> Json:
        answer = self.post(*events)
        assert answer.status_code == 200, answer.text
        found: Json = answer.json()
        return found


@pytest.fixture
def counter(app: FastAPI, client: TestClient, lead: Hands) -> CounterClient:
    issued = lead.client.post(
        "/api/v1/counters/devices",
        json={"name": "Counter A", "machine_id": lead.floor.machine_id},
    )
    assert issued.status_code == 201, issued.text
    bare = TestClient(app, base_url="http://testserver", raise_server_exceptions=False)
    bare.portal = client.portal
    return CounterClient(bare, issued.json()["key"], issued.json()["id"])
