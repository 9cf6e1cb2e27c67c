"""The invented shop of the other tests, looked at through its pages."""

from tests.bench.conftest import Bench, bench, floor, lead, operator

__all__ = ["Bench", "bench", "floor", "lead", "operator"]
