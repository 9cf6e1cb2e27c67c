"""What can be wrong with a request: one base class, and the catalogue of its kinds.

Free of framework and storage, so that the rules of every floor may raise. The web floor turns a
``Problem`` into problem details (RFC 9457); the command line prints its sentences.
"""

PROBLEM_NAMESPACE = "urn:coilwright:problem:"
_LONGEST_VALUE = 120


class Problem(Exception):
    """Something the caller can mend.

    ``detail`` says what is wrong, ``pointer`` names the field (JSON Pointer, RFC 6901), ``value``
    is what was given, ``mend`` says what to do instead.
    """

    kind = "bad-request"
    title = "The request cannot be carried out"
    status = 400

    def __init__(
        self,
        detail: str,
        *,
        pointer: str | None = None,
        value: object = None,
        mend: str | None = None,
        extra: dict[str, object] | None = None,
        headers: dict[str, str] | None = None,
    ) -> None:
        super().__init__(detail)
        self.detail = detail
        self.pointer = pointer
        self.value = value
        self.mend = mend
        self.extra = extra or {}
        self.headers = headers or {}

    @property
    def type(self) -> str:
        return PROBLEM_NAMESPACE + self.kind

    def body(self) -> dict[str, object]:
        """The problem details of RFC 9457, with our members ``pointer``, ``value``, ``mend``."""
        members: dict[str, object] = {
            "type": self.type,
            "title": self.title,
            "status": self.status,
            "detail": self.detail,
        }
        if self.pointer is not None:
            members["pointer"] = self.pointer
        if self.value is not None:
            members["value"] = shown_value(self.value)
        if self.mend is not None:
            members["mend"] = self.mend
        return {**members, **self.extra}


def shown_value(value: object) -> object:
    """The value as it may stand in an answer: short, and only what JSON can carry."""
    if value is None or isinstance(value, bool | int):
        return value
    text = value if isinstance(value, str) else repr(value)
    return text if len(text) <= _LONGEST_VALUE else text[: _LONGEST_VALUE - 1] + "…"


class InvalidValue(Problem):
    kind = "invalid-value"
    title = "A value cannot be accepted"
    status = 422


class ConfirmationNeeded(Problem):
    """A value that is possible but far from what was expected: asked back once."""

    kind = "confirmation-needed"
    title = "Is this value meant?"
    status = 422


class NotSignedIn(Problem):
    kind = "not-signed-in"
    title = "Sign in first"
    status = 401


class UnknownDevice(Problem):
    kind = "unknown-device"
    title = "This device key is not known, or was revoked"
    status = 401


class NotAllowed(Problem):
    kind = "not-allowed"
    title = "Your role does not allow this"
    status = 403


class NotFound(Problem):
    kind = "not-found"
    title = "There is no such thing"
    status = 404


class WrongState(Problem):
    kind = "wrong-state"
    title = "That is not possible in its present state"
    status = 409


class AlreadyThere(Problem):
    kind = "already-there"
    title = "That exists already"
    status = 409


class StaleEdit(Problem):
    kind = "stale-edit"
    title = "Somebody changed this after you had read it"
    status = 412


class PreconditionMissing(Problem):
    kind = "precondition-missing"
    title = "Say which version you have seen"
    status = 428


class TooLarge(Problem):
    kind = "too-large"
    title = "The request body is too large"
    status = 413


class TooSlow(Problem):
    kind = "too-slow"
    title = "The request body came too slowly"
    status = 408


class UnsupportedMedia(Problem):
    kind = "unsupported-media"
    title = "The body is not in a form that is read here"
    status = 415


class TooManyAttempts(Problem):
    kind = "too-many-attempts"
    title = "Too many attempts"
    status = 429


class KeyReused(Problem):
    kind = "idempotency-key-reused"
    title = "This idempotency key was used for another request"
    status = 422


class Unavailable(Problem):
    kind = "unavailable"
    title = "Nothing was recorded; try again"
    status = 503


class SetupError(Problem):
    """The service cannot start as it is set up; told at the command line."""

    kind = "setup"
    title = "The service cannot start as it is set up"
    status = 500
