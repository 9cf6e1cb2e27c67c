"""Measure what a shop would notice: ``python -m tests.measure`` prints it; timings are noisy."""

import os
import socket
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import httpx

from seed_demo.client import Client
from service.people.command import add_from_terminal
from service.settings import Settings

PASSWORD = "an invented password"
ROOT = Path(__file__).parents[1]


def milliseconds(values: list[float]) -> str:
    ordered = sorted(values)
    p95 = ordered[int(0.95 * (len(ordered) - 1))]
    return (
        f"median {1e3 * statistics.median(values):.1f} ms, p95 {1e3 * p95:.1f} ms, n {len(values)}"
    )


def timed(times: int, step: object) -> list[float]:
    found = []
    for _ in range(times):
        start = time.perf_counter()
        step()  # type: ignore[operator]  # a callable without arguments
        found.append(time.perf_counter() - start)
    return found


@contextmanager
def served(folder: Path) -> Iterator[tuple[str, float, int]]:
    """A real service in a process of its own: address, seconds until ready, process id."""
    with socket.socket() as free:
        free.bind(("127.0.0.1", 0))
        port = free.getsockname()[1]
    environment = {**os.environ, "COILWRIGHT_DATA_FOLDER": str(folder)}
    start = time.perf_counter()
    process = subprocess.Popen(
        [sys.executable, "-m", "service.cli", "serve", "--port", str(port)],
        env=environment,
        stdout=subprocess.DEVNULL,
    )
    address = f"http://127.0.0.1:{port}"
    try:
        while True:
            try:
                httpx.get(f"{address}/api/v1/health", timeout=1).raise_for_status()
                break
            except httpx.HTTPError:
                time.sleep(0.01)
        yield address, time.perf_counter() - start, process.pid
    finally:
        process.terminate()
        process.wait(10)


def resident_mb(pid: int) -> float:
    for line in Path(f"/proc/{pid}/status").read_text().splitlines():
        if line.startswith("VmRSS"):
            return int(line.split()[1]) / 1024
    return float("nan")


PREDICT = """
import json, time
from service.recipes.body import read_recipe
from service.recipes.prediction import predict
body = read_recipe(open({path!r}).read())
start = time.perf_counter(); predict(body); cold = time.perf_counter() - start
start = time.perf_counter(); predict(body); again = time.perf_counter() - start
print(cold, again)
"""


def main() -> None:
    help_times = timed(
        5,
        lambda: subprocess.run(
            [sys.executable, "-m", "service.cli", "--help"], stdout=subprocess.DEVNULL, check=True
        ),
    )
    print(f"coilwright --help (bar 300 ms): {milliseconds(help_times)}")
    for name in ("long-single", "voice-25"):
        path = str(ROOT / "seed_demo" / "recipes" / f"{name}.json")
        code = PREDICT.format(path=path)
        runs = [
            subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
            for _ in range(3)
        ]
        cold, again = zip(*[tuple(map(float, r.stdout.split())) for r in runs], strict=True)
        print(f"prediction {name}, cold (bar 250 ms): {milliseconds(list(cold))}")
        print(f"prediction {name}, asked again (bar 1 ms): {milliseconds(list(again))}")
    folder = Path(tempfile.mkdtemp(prefix="coilwright-measure-"))
    add_from_terminal(Settings(data_folder=folder), "Invented", ["owner", "lead"], PASSWORD)
    ready = []
    for _ in range(2):
        with served(folder) as (_address, seconds, _pid):
            ready.append(seconds)
    with served(folder) as (address, seconds, pid):
        ready.append(seconds)
        print(f"ready after start (bar 2 s): {milliseconds(ready)}")
        time.sleep(3)
        print(f"memory at rest (bar 250 MB): {resident_mb(pid):.0f} MB")
        api = Client(address, "Invented", PASSWORD)
        machine = api.post("/machines", {"name": "M", "top_speed_rpm": 1500.0})
        device = api.post("/counters/devices", {"name": "D", "machine_id": machine["id"]})
        api.close()
        counter = httpx.Client(headers={"Authorization": f"Bearer {device['key']}"})
        sequence = iter(range(1, 10_000))

        def one_count() -> None:
            number = next(sequence)
            event = {"boot": 1, "sequence": number, "kind": "total", "count": number}
            counter.post(
                f"{address}/api/v1/counters/events", json={"events": [event]}
            ).raise_for_status()

        timed(20, one_count)
        stored = timed(300, one_count)
        print(f"one count stored durably (bar 10 ms): {milliseconds(stored)}")
        health = timed(
            300, lambda: counter.get(f"{address}/api/v1/openapi.json").raise_for_status()
        )
        print(f"beside it, a route that stores nothing: {milliseconds(health)}")
        counter.close()


if __name__ == "__main__":
    main()
