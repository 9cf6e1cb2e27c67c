"""Recipe bodies for tests: the invented example, with what a test wants otherwise."""

from copy import deepcopy
from typing import Any

from service.recipes.body import EXAMPLE, VOICE_COIL_EXAMPLE, RecipeBody


def example(**changes: Any) -> dict[str, Any]:
    """The example's body; a dict in ``changes`` is merged into the part of that name."""
    return _changed(EXAMPLE, changes)


def voice_coil(**changes: Any) -> dict[str, Any]:
    return _changed(VOICE_COIL_EXAMPLE, changes)


def recipe(**changes: Any) -> RecipeBody:
    return RecipeBody.model_validate(example(**changes))


def _changed(base: dict[str, Any], changes: dict[str, Any]) -> dict[str, Any]:
    body = deepcopy(base)
    for name, change in changes.items():
        merge = isinstance(change, dict) and isinstance(body.get(name), dict)
        body[name] = {**body[name], **change} if merge else change
    return body
