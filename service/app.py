"""Puts the service together: database, routes, who hears what, limits around it all."""

import threading
from collections.abc import AsyncIterator
from contextlib import asynccontextmanager
from datetime import UTC, datetime
from typing import Any

from fastapi import FastAPI, Request
from starlette.concurrency import run_in_threadpool

from service import models
from service.bench.routes import router as bench_router
from service.counters.acts import KEY_PREFIX, identify_device
from service.counters.folding import hear_attempt_ended, hear_attempt_started
from service.counters.ingest import ingest
from service.counters.live import LiveHub
from service.counters.live import router as live_router
from service.counters.routes import router as counters_router
from service.counters.routes import runs_router as counts_router
from service.drift.acts import hear_measured
from service.drift.routes import router as drift_router
from service.health import router as health_router
from service.pages.install import error_page, install, wants_page
from service.people.acts import identify_person
from service.people.cookies import cookie_name
from service.people.routes import router as people_router
from service.recipes.body import EXAMPLE, RecipeBody
from service.recipes.prediction import predict
from service.recipes.routes import router as recipes_router
from service.reports.routes import router as reports_router
from service.runs.routes import router as runs_router
from service.settings import Settings
from service.shop.acts import ensure_workshop
from service.shop.routes import router as shop_router
from service.stock.routes import router as stock_router
from service.storage.engine import Database, check_sqlite
from service.storage.events import AttemptEnded, AttemptStarted, Measured, Subscribers
from service.storage.records import Actor
from service.storage.writer import GroupWriter
from service.web import problems
from service.web.limits import BodyGuard, SecurityHeaders
from service.web.unit import Gate

API_ROUTERS = (
    health_router,
    people_router,
    shop_router,
    stock_router,
    recipes_router,
    runs_router,
    counters_router,
    counts_router,
    live_router,
    bench_router,
    drift_router,
    reports_router,
)

SUBSCRIBERS: Subscribers = {
    AttemptStarted: (hear_attempt_started,),
    AttemptEnded: (hear_attempt_ended,),
    Measured: (hear_measured,),
}

PROBLEM_RESPONSES: dict[int | str, dict[str, Any]] = {
    "4XX": {
        "description": "The request cannot be carried out (RFC 9457).",
        "content": {
            problems.MEDIA_TYPE: {
                "schema": {
                    "type": "object",
                    "required": ["type", "title", "status"],
                    "properties": {
                        "type": {"type": "string"},
                        "title": {"type": "string"},
                        "status": {"type": "integer"},
                        "detail": {"type": "string"},
                        "pointer": {"type": "string"},
                        "value": {},
                        "mend": {"type": "string"},
                    },
                }
            }
        },
    },
    "5XX": {"description": "Nothing was recorded (RFC 9457)."},
}


def create_app(settings: Settings) -> FastAPI:
    """The whole service on the database that the settings name; it must be migrated."""

    @asynccontextmanager
    async def lifespan(app: FastAPI) -> AsyncIterator[None]:
        database = Database(settings.url(), settings.read_database_url, SUBSCRIBERS)
        check_sqlite(database.writer)
        with database.write() as session:
            ensure_workshop(session, datetime.now(UTC))
            session.commit()
        app.state.database = database
        app.state.gate = Gate(database)
        app.state.writer = GroupWriter(database, ingest)
        app.state.live = LiveHub(database)
        # The kernel's libraries load when first used: here, beside the first requests.
        threading.Thread(target=_warm_up, name="warm-up", daemon=True).start()
        yield
        app.state.live.close()
        await run_in_threadpool(app.state.writer.close)
        database.close()

    app = FastAPI(
        title="Coilwright",
        summary="Job manager and production database for a workshop that winds coils",
        version=models.VERSION,
        lifespan=lifespan,
        responses=PROBLEM_RESPONSES,
        docs_url=None,
        redoc_url=None,
        openapi_url="/api/v1/openapi.json",
    )
    app.state.settings = settings
    app.state.identify = identify
    problems.install(app, error_page, wants_page)
    for router in API_ROUTERS:
        app.include_router(router)
    install(app)
    app.add_middleware(
        BodyGuard, limit_bytes=settings.body_limit_bytes, seconds=settings.body_seconds
    )
    app.add_middleware(SecurityHeaders)
    return app


def _warm_up() -> None:
    predict(RecipeBody.model_validate(EXAMPLE))


async def identify(request: Request) -> Actor | None:
    """Who sends the request: a device by its key, a person by token or cookie."""
    scheme, _, credential = request.headers.get("authorization", "").partition(" ")
    token = credential.strip() if scheme.lower() == "bearer" else ""
    token = token or request.cookies.get(cookie_name(request.app.state.settings), "")
    if not token:
        return None
    return await run_in_threadpool(_identify, request.app.state.database, token)


def _identify(database: Database, token: str) -> Actor | None:
    if token.startswith(KEY_PREFIX):
        with database.read() as session:
            return identify_device(session, token)
    return identify_person(database, token, datetime.now(UTC))
