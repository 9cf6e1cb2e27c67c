"""Whether the service is up and its database stands at the program's schema."""

from fastapi import APIRouter, Request

from service.errors import Unavailable
from service.storage.engine import Database
from service.storage.migrate import is_current
from service.web.access import Open
from service.web.schemas import View
from service.web.unit import UnitRoute

router = APIRouter(prefix="/api/v1/health", route_class=UnitRoute, tags=["health"])


class HealthView(View):
    status: str
    database: str


@router.get("")
def health(request: Request, _actor: Open) -> HealthView:
    database: Database = request.app.state.database
    if not is_current(database.writer):
        raise Unavailable(
            "The database's schema is not this program's.", mend="Run “coilwright serve” again."
        )
    return HealthView(status="ok", database=database.writer.dialect.name)
