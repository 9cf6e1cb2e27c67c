"""Edges of people and sign-ins."""

import uuid
from datetime import datetime
from typing import Annotated, Any

from pydantic import AfterValidator, ConfigDict, Field, StringConstraints

from service.web.access import Role
from service.web.schemas import Body, Flag, Name, Note, View, no_nul

Password = Annotated[str, StringConstraints(min_length=1, max_length=1000)]
Roles = Annotated[list[Role], Field(min_length=1, max_length=len(Role))]


class SignInBody(Body):
    model_config = ConfigDict(
        json_schema_extra={"examples": [{"name": "Mira Voss", "password": "an invented password"}]}
    )

    name: Annotated[str, StringConstraints(max_length=120), AfterValidator(no_nul)]
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
    """What is left out stays."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"roles": ["operator", "lead"], "reason": "Leads from January on."}]
        }
    )

    name: Name | None = None
    roles: Roles | None = None
    active: Flag | None = None
    reason: Note


class PasswordBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"present_password": "an invented password", "new_password": "another invented one"}
            ]
        }
    )

    present_password: Password | None = Field(
        default=None, description="Needed for one's own password; an owner sets another's without."
    )
    new_password: Password


class ActView(View):
    """One change. ``hash`` covers it and the hash of the act before it."""

    position: int
    id: uuid.UUID
    at: datetime
    actor_kind: str
    actor_id: uuid.UUID | None
    actor_name: str
    verb: str
    subject_kind: str
    subject_id: str
    before: dict[str, Any] | None
    after: dict[str, Any] | None
    reason: str | None
    hash: str
