"""A winding machine's counter, as the player drives it."""

from datetime import UTC, datetime, timedelta
from typing import Any

import httpx

_STEP = 400


class Counter:
    """Counts turns and sends cumulative totals in batches, numbered, until acknowledged."""

    def __init__(self, base_url: str, key: str, speed_rpm: float) -> None:
        self._http = httpx.Client(
            base_url=base_url, timeout=30, headers={"Authorization": f"Bearer {key}"}
        )
        self._speed = speed_rpm
        self._boot = 1
        self._sequence = 0
        self._clock = datetime.now(UTC) - timedelta(hours=6)

    def close(self) -> None:
        self._http.close()

    def wind(self, turns: int, *, lose_answer: bool = False) -> int:
        """Zero the counter and wind; the number of events that the service called duplicates."""
        totals = [*range(min(_STEP, turns), turns, _STEP), turns]
        duplicates = self.send([self._event("start", 0)])
        half = len(totals) // 2
        for part, lossy in ((totals[:half], lose_answer), (totals[half:], False)):
            events = [self._event("total", count) for count in part]
            if events:
                duplicates += self.send(events, lose_answer=lossy)
        duplicates += self.send([self._event("stop", turns)])
        return duplicates

    def wire_broke(self, turns: int) -> None:
        self.send([self._event("wire break", turns)])

    def send(self, events: list[dict[str, Any]], *, lose_answer: bool = False) -> int:
        """Send a batch until it is acknowledged.

        With ``lose_answer`` the connection drops after the service has stored the batch and before
        its answer is heard, as a network does; the counter then sends the same batch again.
        """
        body = {"events": events}
        if lose_answer:
            self._http.post("/api/v1/counters/events", json=body)
        answer = self._http.post("/api/v1/counters/events", json=body)
        answer.raise_for_status()
        taken = answer.json()
        if taken["refused"] or taken["stored_through"] != self._sequence:
            raise RuntimeError(f"the counter's events were not all stored: {taken}")
        return int(taken["duplicates"])

    def _event(self, kind: str, count: int) -> dict[str, Any]:
        self._sequence += 1
        self._clock += timedelta(seconds=60 * _STEP / self._speed)
        return {
            "boot": self._boot,
            "sequence": self._sequence,
            "kind": kind,
            "count": count,
            "device_time": self._clock.isoformat(),
            "speed_rpm": self._speed,
        }
