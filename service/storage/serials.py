"""Serials on labels: short, speakable, scannable, with a check character.

A serial is a letter for the kind of thing, five drawn characters and the ISO/IEC 7064
MOD 37,36 check character over all before it. Y and Z are left out, since keyboard layouts
exchange them, and I, O, L, U, since they are misread; a draw whose check character would be one
of these is drawn again. A dash is put in for the eye and ignored when read.
"""

import secrets

from stdnum.iso7064 import mod_37_36

from service.errors import InvalidValue

ALPHABET = "0123456789ABCDEFGHJKMNPQRSTVWX"
KINDS = {"R": "run", "S": "spool", "M": "magnet lot", "J": "order"}
LETTERS = {kind: letter for letter, kind in KINDS.items()}
_DRAWN = 5


def draw_serial(kind: str) -> str:
    """A new serial for a ``kind`` of KINDS; the table's unique index guards against a repeat."""
    letter = LETTERS[kind]
    while True:
        body = letter + "".join(secrets.choice(ALPHABET) for _ in range(_DRAWN))
        check = mod_37_36.calc_check_digit(body)
        if check in ALPHABET:
            return body + check


def shown(serial: str) -> str:
    """The serial as printed: ``R7K2-4HC``."""
    return f"{serial[:4]}-{serial[4:]}"


def read_serial(text: str, kind: str, pointer: str = "") -> str:
    """The serial in a scanned or typed text.

    Raises InvalidValue for a wrong check character, or a label of another kind, which it names.
    """
    serial = "".join(text.split()).replace("-", "").upper()
    if len(serial) != _DRAWN + 2 or not mod_37_36.is_valid(serial):
        raise InvalidValue(
            f"“{text}” is not a whole label: its check character does not fit.",
            pointer=pointer,
            value=text,
            mend="Scan the label again, or type all seven characters.",
        )
    found = KINDS.get(serial[0])
    if found != kind:
        raise InvalidValue(
            f"“{text}” is the label of a {found or 'thing not known here'}, not of a {kind}.",
            pointer=pointer,
            value=text,
            mend=f"Scan the label of the {kind}.",
        )
    return serial
