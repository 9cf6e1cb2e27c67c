"""Who may call a route. Every route carries one of these rules; a test walks them all."""

from enum import StrEnum
from typing import Annotated

from fastapi import Depends, Request

from service.errors import NotAllowed, NotSignedIn, UnknownDevice
from service.storage.records import Actor


class Role(StrEnum):
    """The parts that a person can play; one person may play several."""

    OPERATOR = "operator"
    BENCH = "bench"
    LEAD = "lead"
    OWNER = "owner"
    AUDITOR = "auditor"


class Allow:
    """A dependency that lets through a signed-in person with one of the roles."""

    def __init__(self, *roles: Role) -> None:
        self.roles = frozenset(roles)

    def __call__(self, request: Request) -> Actor:
        actor: Actor | None = request.state.actor
        if actor is None or actor.kind != "person":
            raise NotSignedIn("Nobody is signed in.", mend="Sign in and send the request again.")
        if not self.roles & actor.roles:
            wanted = " or ".join(sorted(self.roles))
            raise NotAllowed(
                f"{actor.name} is signed in as {', '.join(sorted(actor.roles)) or 'nobody'}.",
                mend=f"Ask somebody who may act as {wanted}.",
            )
        return actor


class AllowDevice:
    """A dependency that lets through a counter device with a valid key, and nobody else."""

    def __call__(self, request: Request) -> Actor:
        actor: Actor | None = request.state.actor
        if actor is None or actor.kind != "device":
            raise UnknownDevice(
                "The request carries no device key that is known and in force.",
                pointer="Authorization",
                mend="Send “Authorization: Bearer <device key>”; a lead can issue a new key.",
            )
        return actor


class AllowAnyone:
    """A dependency for the few routes that need no sign-in."""

    def __call__(self, request: Request) -> Actor | None:
        actor: Actor | None = request.state.actor
        return actor


ALL_ROLES = tuple(Role)
Anybody = Annotated[Actor, Depends(Allow(*ALL_ROLES))]
Operator = Annotated[Actor, Depends(Allow(Role.OPERATOR, Role.LEAD))]
Bench = Annotated[Actor, Depends(Allow(Role.BENCH, Role.LEAD))]
FloorStaff = Annotated[Actor, Depends(Allow(Role.OPERATOR, Role.BENCH, Role.LEAD))]
Lead = Annotated[Actor, Depends(Allow(Role.LEAD))]
LeadOrOwner = Annotated[Actor, Depends(Allow(Role.LEAD, Role.OWNER))]
Owner = Annotated[Actor, Depends(Allow(Role.OWNER))]
Inspector = Annotated[Actor, Depends(Allow(Role.OWNER, Role.AUDITOR, Role.LEAD))]
Device = Annotated[Actor, Depends(AllowDevice())]
Open = Annotated[Actor | None, Depends(AllowAnyone())]
