"""Signing in and out."""

from datetime import UTC, datetime

from fastapi import APIRouter, Request, Response
from starlette.concurrency import run_in_threadpool

from service.errors import NotSignedIn, TooManyAttempts
from service.pages.forms import Entered, Form
from service.pages.render import page, see_other
from service.people import acts
from service.people.cookies import clear_cookie, set_cookie
from service.people.routes import client_address, token_of
from service.storage.engine import Database
from service.web import access
from service.web.unit import Now, UnitRoute, Work

router = APIRouter(route_class=UnitRoute, include_in_schema=False)

HOME = "/floor"


def local_path(text: str) -> str:
    """The path to go on to after signing in: one of ours, never another site's.

    Browsers read ``//host`` and ``/\\host`` as another site, and drop control characters.
    """
    is_plain = text.startswith("/") and not text.startswith("//")
    if not is_plain or "\\" in text or any(character < " " for character in text):
        return HOME
    return text


@router.get("/")
def home(_actor: access.Open) -> Response:
    return see_other(HOME)


@router.get("/sign-in")
def show_sign_in(request: Request, _actor: access.Open, next: str = HOME) -> Response:
    return _page(request, Form(), next)


def _page(request: Request, form: Form, onward: str, status: int = 200) -> Response:
    return page(request, None, "sign_in.html", status=status, form=form, onward=local_path(onward))


@router.post("/sign-in")
async def sign_in(request: Request, _actor: access.Open, form: Entered) -> Response:
    onward = local_path(form.value("next"))
    name, password = form.text("name"), form.value("password")
    now = datetime.now(UTC)
    database: Database = request.app.state.database
    try:
        _person, token = await run_in_threadpool(
            acts.start_sign_in,
            database,
            name=name,
            password=password,
            address=client_address(request),
            now=now,
        )
    except (NotSignedIn, TooManyAttempts) as problem:
        form.take(problem)
        response = _page(request, form, onward, problem.status)
        response.headers.update(problem.headers)
        return response
    response = see_other(onward)
    set_cookie(response, request.app.state.settings, token)
    return response


@router.post("/sign-out")
def sign_out(request: Request, _actor: access.Open, work: Work, now: Now) -> Response:
    if token := token_of(request):
        acts.end_sign_in(work, token, now)
    response = see_other("/sign-in")
    clear_cookie(response, request.app.state.settings)
    return response
