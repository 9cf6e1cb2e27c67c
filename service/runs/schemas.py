"""Edges of the work: orders, runs, and what is done at the machine."""

import uuid
from datetime import date, datetime
from typing import Annotated, Literal

from pydantic import ConfigDict, Field

from service.runs.rules import MOST_TURNS
from service.web.schemas import Body, Flag, Json, Name, Note, Number, View, Whole

Label = Annotated[str, Field(min_length=1, max_length=20, description="As on the label.")]
Cause = Literal[
    "wire break",
    "miscount",
    "resistance",
    "inductance",
    "shorted turns",
    "open coil",
    "insulation",
    "geometry",
    "wrong wire",
    "wrong magnet",
    "handling",
    "not stated",
]
MOST_AT_ONCE = 200


class OrderBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "customer": "Invented Guitars",
                    "revision_id": "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f",
                    "quantity": 12,
                    "promised_on": "2026-12-18",
                    "note": "Matched in pairs, please.",
                }
            ]
        }
    )

    customer: Name
    revision_id: uuid.UUID
    quantity: Annotated[Whole, Field(ge=1, le=100_000)]
    promised_on: date | None = None
    note: Note | None = None


class CloseBody(Body):
    model_config = ConfigDict(json_schema_extra={"examples": [{"reason": "All are shipped."}]})

    reason: Note | None = None


class RecipeOf(View):
    """Which recipe, and which revision of it."""

    recipe: str
    recipe_id: uuid.UUID
    revision: int
    revision_id: uuid.UUID
    state: str


class OrderView(View):
    serial: str
    label: str = Field(description="The serial as printed.")
    customer: str
    recipe: RecipeOf
    quantity: int
    promised_on: date | None
    state: str
    note: str | None
    created_at: datetime
    runs: dict[str, int] = Field(description="Coils of the order, by state.")
    done: int = Field(description="Coils accepted for this recipe; regraded ones are not in it.")
    to_do: int = Field(description="Coils still wanted.")
    version: int


class PlanBody(Body):
    """Coils to be wound, for an order or for a revision by itself."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"order": "J7K2-4HC", "count": 6},
                {"revision_id": "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f", "count": 1},
            ]
        }
    )

    order: Label | None = None
    revision_id: uuid.UUID | None = None
    count: Annotated[Whole, Field(ge=1, le=MOST_AT_ONCE)] = 1
    magnet_lot: Label | None = None
    confirmed: Flag = Field(default=False, description="More coils than the order wants are meant.")


class StartBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "machine_id": "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f",
                    "spool": "S7K2-4HC",
                    "magnet_lot": "M7K2-4HC",
                }
            ]
        }
    )

    machine_id: uuid.UUID
    spool: Label
    magnet_lot: Label | None = None


class FinishBody(Body):
    """The coil is off. Without ``agreed_turns`` the machine's own count holds."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"agreed_turns": 7598, "reason": "Two turns unwound by hand."}]
        }
    )

    agreed_turns: Annotated[Number, Field(gt=0, lt=MOST_TURNS)] | None = None
    reason: Note | None = Field(
        default=None, description="Needed where the machine counted otherwise."
    )
    confirmed: Flag = Field(default=False, description="Turns far from the recipe's are meant.")


class LossBody(Body):
    """The coil is lost on the machine; its bobbin is saved unless ``scrap`` is true."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"cause": "wire break", "scrap": False}]}
    )

    cause: Cause
    reason: Note | None = None
    scrap: Flag = False


class MachineOf(View):
    id: uuid.UUID
    name: str


class SpoolOf(View):
    serial: str
    wire_size: str
    wire_build: str
    conductor: str


class AttemptView(View):
    """One winding of the coil."""

    id: uuid.UUID
    number: int
    machine: MachineOf
    spool: SpoolOf
    outcome: str
    started_at: datetime
    started_by: str
    ended_at: datetime | None
    ended_by: str | None
    machine_turns: float | None
    agreed_turns: float | None
    agreed_reason: str | None
    wire_length_m: float | None = Field(description="Drawn from the spool.")
    lost_cause: str | None


class DispositionView(View):
    id: uuid.UUID
    kind: str
    cause: str | None
    reason: str
    regrade_recipe_id: uuid.UUID | None
    decided_by: str
    decided_at: datetime


class RunLine(View):
    """A run in a list."""

    serial: str
    label: str
    state: str
    recipe: RecipeOf
    order: str | None
    planned_turns: int
    attempt_number: int
    machine: MachineOf | None = Field(description="Of the attempt in hand, or of the last one.")
    agreed_turns: float | None
    created_at: datetime
    changed_at: datetime


class RunView(RunLine):
    customer: str | None
    magnet_lot: str | None
    attempts: list[AttemptView]
    dispositions: list[DispositionView]
    expected: Json = Field(description="As frozen with the revision's release.")
    moves: list[str] = Field(description="What can be done with it in its state.")
    version: int
