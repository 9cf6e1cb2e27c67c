"""Puts the screens into the app, and draws problems for people."""

from urllib.parse import quote

from fastapi import FastAPI, Request, Response

from service.errors import KeyReused, NotSignedIn, Problem
from service.pages import (
    assets,
    bench,
    counts,
    floor,
    month,
    orders,
    people,
    recipe_form,
    recipes,
    run,
    run_list,
    shop,
    sign_in,
    stock,
)
from service.pages.render import page, see_other
from service.web.unit import SAFE_METHODS

ROUTERS = (
    sign_in.router,
    floor.router,
    counts.router,
    run_list.router,
    run.router,
    orders.router,
    bench.router,
    recipe_form.router,
    recipes.router,
    stock.router,
    shop.router,
    people.router,
    month.router,
)


def install(app: FastAPI) -> None:
    """Mount the static files and register the pages."""
    assets.mount(app)
    for router in ROUTERS:
        app.include_router(router)


def wants_page(request: Request) -> bool:
    """Whether a person's browser asks: a page's path, and HTML is welcome."""
    return not request.url.path.startswith("/api/") and "text/html" in request.headers.get(
        "accept", ""
    )


def error_page(request: Request, problem: Problem) -> Response:
    """The problem in words; who is not signed in goes to the sign-in and comes back."""
    where = request.url.path + (f"?{request.url.query}" if request.url.query else "")
    asked = request.method in SAFE_METHODS
    if isinstance(problem, NotSignedIn) and asked:
        return see_other(f"/sign-in?next={quote(where, safe='')}")
    return page(
        request,
        None,
        "error.html",
        status=problem.status,
        headers=problem.headers,
        problem=problem,
        sent=not asked,
        not_signed_in=isinstance(problem, NotSignedIn),
        sent_before=isinstance(problem, KeyReused),
    )
