"""All tables, imported in one place, so that mappers and migrations see the whole schema."""

from importlib.metadata import version

from service.bench import models as bench
from service.counters import models as counters
from service.drift import models as drift
from service.people import models as people
from service.recipes import models as recipes
from service.runs import models as runs
from service.shop import models as shop
from service.stock import models as stock
from service.storage import idempotency, records
from service.storage.types import Base

VERSION = version("coilwright")

TABLES = (bench, counters, drift, people, recipes, runs, shop, stock, idempotency, records)

__all__ = ["TABLES", "VERSION", "Base"]
