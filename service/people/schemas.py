"""Edges of people and sign-ins."""

import uuid
from datetime import datetime
from typing import Annotated, Any

from pydantic import ConfigDict, Field, StringConstraints

from service.web.access import Role
from service.web.schemas import Body, Flag, Name, Note, View

Password = Annotated[str, StringConstraints(min_length=1, max_length=1000)]
Roles = Annotated[list[Role], Field(max_length=len(Role))]


class SignInBody(Body):
    model_config = ConfigDict(
        json_schema_extra={"examples": [{"name": "Mira Voss", "password": "an invented password"}]}
    )

    name: Annotated[str, StringConstraints(max_length=120)]
    password: Password


class PersonView(View):
    id: uuid.UUID
    name: str
    roles: list[str]
    active: bool
    version: int


class SignedInView(View):
    person: str
    roles: list[str]
    token: str = Field(description="For programs: send it as “Authorization: Bearer …”.")
    expires_at: datetime


class PersonBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "Tom Aldar",
                    "password": "an invented password",
                    "roles": ["operator", "bench"],
                }
            ]
        }
    )

    name: Name
    password: Password
    roles: Roles


class PersonEdit(Body):
    roles: Roles | None = None
    active: Flag | None = None
    reason: Note


class PasswordBody(Body):
    present_password: Password | None = Field(
        default=None, description="Needed for one's own password; an owner sets another's without."
    )
    new_password: Password


class ActView(View):
    position: int
    at: datetime
    actor_kind: str
    actor_name: str
    verb: str
    subject_kind: str
    subject_id: str
    before: dict[str, Any] | None
    after: dict[str, Any] | None
    reason: str | None
    hash: str
