"""What a prediction warns of: a code for programs and a sentence for people."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Caution:
    """One warning. Codes are lower-case words joined by hyphens and never change their meaning."""

    code: str
    sentence: str
