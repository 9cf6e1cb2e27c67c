"""Static files under a path that names their content, so that they may be kept for good."""

import hashlib
from pathlib import Path

from fastapi import FastAPI
from starlette.responses import Response
from starlette.staticfiles import StaticFiles
from starlette.types import Scope

FOLDER = Path(__file__).parent / "static"


def _content_version() -> str:
    digest = hashlib.sha256()
    for file in sorted(FOLDER.rglob("*")):
        if file.is_file():
            digest.update(file.relative_to(FOLDER).as_posix().encode() + b"\n" + file.read_bytes())
    return digest.hexdigest()[:12]


VERSION = _content_version()
PREFIX = f"/static/{VERSION}"


def asset(name: str) -> str:
    """The path of a static file; it changes whenever any of them changes."""
    return f"{PREFIX}/{name}"


class _Kept(StaticFiles):
    """The path holds the content's version, so a browser need never ask again."""

    async def get_response(self, path: str, scope: Scope) -> Response:
        response = await super().get_response(path, scope)
        response.headers["Cache-Control"] = "public, max-age=31536000, immutable"
        return response


def mount(app: FastAPI) -> None:
    app.mount(PREFIX, _Kept(directory=FOLDER), name="static")
