"""Passwords: Argon2id by argon2-cffi, at most two hashes at a time."""

import threading
import unicodedata

from argon2 import PasswordHasher
from argon2.exceptions import InvalidHashError, VerificationError

_hasher = PasswordHasher()
# Each hash takes 64 MiB while it runs; a flood of sign-ins must not take all memory.
_at_once = threading.BoundedSemaphore(2)
# Verified for names that are not known, so that the time taken does not tell which names are.
_NOBODY = (
    "$argon2id$v=19$m=65536,t=3,p=4$d+anXw91LDkrRfeEdHBvWw"
    "$zh6u9ZffKRevmxRE4VmwU0f+ygg4JjW83/el6ldyLPc"
)


def _typed(password: str) -> bytes:
    """One Unicode form, so that an accented letter is the same from every keyboard."""
    return unicodedata.normalize("NFC", password).encode("utf-8", "surrogatepass")


def hash_password(password: str) -> str:
    with _at_once:
        return _hasher.hash(_typed(password))


def verify(password_hash: str | None, password: str) -> bool:
    """Whether the password fits; as slow for a name that is not known."""
    with _at_once:
        try:
            fits = _hasher.verify(password_hash or _NOBODY, _typed(password))
        except (VerificationError, InvalidHashError):
            return False
    return fits and password_hash is not None


def needs_new_hash(password_hash: str) -> bool:
    """Whether the hash was made with other parameters than those of today."""
    return _hasher.check_needs_rehash(password_hash)
