"""The shape beside each word of state, as an SVG path in a 16 × 16 box.

A state is told by word and shape, so that it is read without colour. Full shapes are verdicts;
the others say where a thing stands.
"""

_DISC = "M8 1a7 7 0 1 1 0 14A7 7 0 0 1 8 1z"
_DIAMOND = "M8 0l8 8-8 8-8-8z"
_SQUARE = "M1 1h14v14H1z"
_TRIANGLE = "M8 1l8 14H0z"
_RING = f"{_DISC}M8 3.5a4.5 4.5 0 1 0 0 9a4.5 4.5 0 0 0 0-9z"
_HALF = "M8 1a7 7 0 1 1 0 14A7 7 0 0 1 8 1zM8 3v10a5 5 0 0 0 0-10z"
_BOBBIN = "M1 1h14v3H1zM4 5.5h8v5H4zM1 12h14v3H1z"
_RULE = "M0 4h16v8h-2V8h-2v4h-2V8H8.9v4H7.1V8H6v4H4V8H2v4H0z"
_TICK = "M1.5 8.5L4 6l3 3L13 2.5 15.5 5 7 14z"
_BARS = "M2 1h4.5v14H2zM9.5 1H14v14H9.5z"
_BACK = "M6 0v3h3a6 6 0 1 1-6 6h2.4A3.6 3.6 0 1 0 9 5.4H6v3L1 4.2z"
_CROSS = "M3.2 1L8 5.8 12.8 1 15 3.2 10.2 8 15 12.8 12.8 15 8 10.2 3.2 15 1 12.8 5.8 8 1 3.2z"
_DASH = "M1 6h14v4H1z"
_CALL = "M8 1a7 7 0 1 1 0 14A7 7 0 0 1 8 1zM7 4v5h2V4zM7 10.4v2h2v-2z"

_SHAPES = {
    "conforms": _DISC,
    "as predicted": _DISC,
    "steady": _DISC,
    "not decided": _DIAMOND,
    "does not conform": _SQUARE,
    "not as predicted": _SQUARE,
    "drift": _TRIANGLE,
    "planned": _RING,
    "learning": _RING,
    "not watched": _RING,
    "free": _RING,
    "draft": _RING,
    "open": _RING,
    "winding": _HALF,
    "wound": _BOBBIN,
    "measured": _RULE,
    "accepted": _TICK,
    "released": _TICK,
    "on the shelf": _TICK,
    "closed": _TICK,
    "on hold": _BARS,
    "quarantined": _BARS,
    "rework": _BACK,
    "scrapped": _CROSS,
    "lost": _CROSS,
    "retired": _DASH,
    "empty": _DASH,
    "out of use": _DASH,
}


def shape_of(word: str) -> str:
    """The path for a word of state; a call sign for a word that has none of its own."""
    return _SHAPES.get(word, _CALL)
