"""The group-commit writer: what waits is committed together, and answered after its commit.

One thread takes what stands in the queue (up to a limit), carries out each command in a savepoint
of one transaction, commits, and only then sets the results. A command that fails fails alone; a
commit that fails fails every command of that group, and nothing of it is stored.
"""

import queue
import threading
from collections.abc import Callable
from concurrent.futures import Future
from dataclasses import dataclass, field
from typing import Generic, TypeVar

import sqlalchemy.exc
from sqlalchemy.orm import Session

from service.errors import Unavailable
from service.storage.engine import Database

GROUP_LIMIT = 256
QUEUE_LIMIT = 2048

Command = TypeVar("Command")
Outcome = TypeVar("Outcome")


@dataclass(frozen=True)
class _Waiting(Generic[Command, Outcome]):
    command: Command
    future: "Future[Outcome]" = field(default_factory=Future)


class GroupWriter(Generic[Command, Outcome]):
    """Carries out commands on one thread. ``carry_out`` flushes and never commits."""

    def __init__(
        self,
        database: Database,
        carry_out: Callable[[Session, Command], Outcome],
        queue_limit: int = QUEUE_LIMIT,
    ) -> None:
        self._database = database
        self._carry_out = carry_out
        self._queue: queue.Queue[_Waiting[Command, Outcome] | None] = queue.Queue(queue_limit)
        self._thread = threading.Thread(target=self._run, name="group-writer", daemon=True)
        self._closed = threading.Event()
        self._thread.start()

    def submit(self, command: Command) -> "Future[Outcome]":
        """Queue a command. Raises Unavailable (503) when the queue is full or closed."""
        waiting: _Waiting[Command, Outcome] = _Waiting(command)
        if self._closed.is_set():
            raise _busy("The service is stopping.")
        try:
            self._queue.put_nowait(waiting)
        except queue.Full:
            raise _busy("More waits to be stored than can be taken.") from None
        return waiting.future

    def close(self) -> None:
        """Store what waits, then end the thread."""
        if not self._closed.is_set():
            self._closed.set()
            self._queue.put(None)
        self._thread.join()

    def _run(self) -> None:
        while True:
            group, ends = self._next_group()
            if group:
                self._store(group)
            if ends:
                return

    def _next_group(self) -> tuple[list[_Waiting[Command, Outcome]], bool]:
        first = self._queue.get()
        if first is None:
            return [], True
        group = [first]
        while len(group) < GROUP_LIMIT:
            try:
                waiting = self._queue.get_nowait()
            except queue.Empty:
                break
            if waiting is None:
                return group, True
            group.append(waiting)
        return group, False

    def _store(self, group: list[_Waiting[Command, Outcome]]) -> None:
        outcomes: list[tuple[_Waiting[Command, Outcome], Outcome]] = []
        failures: list[tuple[_Waiting[Command, Outcome], Exception]] = []
        try:
            with self._database.write() as session:
                for waiting in group:
                    try:
                        with session.begin_nested():
                            outcomes.append((waiting, self._carry_out(session, waiting.command)))
                    except sqlalchemy.exc.OperationalError:
                        raise
                    except Exception as error:
                        failures.append((waiting, error))
                session.commit()
        except Exception as error:
            for waiting in group:
                waiting.future.set_exception(_not_stored(error))
            return
        for waiting, outcome in outcomes:
            waiting.future.set_result(outcome)
        for waiting, failure in failures:
            waiting.future.set_exception(failure)


def _busy(detail: str) -> Unavailable:
    return Unavailable(detail, mend="Send it again after a moment.", headers={"Retry-After": "1"})


def _not_stored(error: Exception) -> Unavailable:
    unavailable = Unavailable(
        "The database did not take it; nothing of this request was recorded.",
        mend="Send it again with the same sequence numbers.",
        headers={"Retry-After": "2"},
    )
    unavailable.__cause__ = error
    return unavailable
