"""Text on consoles and in pipes that lack characters of the trade, as those of Windows often do."""

import codecs
import io
import sys
import unicodedata

__all__ = ["put_up_with_any_console"]

_HANDLER = "handbook-readable"
_STAND_INS = {
    "°": "deg",
    "μ": "u",
    "\u2212": "-",  # minus
    "\u2010": "-",
    "\u2013": "-",
    "\u2014": "-",
    "\u2044": "/",  # of fractions
    "×": "x",
    "·": ".",
    "→": "->",
    "←": "<-",
    "⇌": "<=>",
    "≤": "<=",
    "≥": ">=",
    "≈": "~",
    "±": "+/-",
    "‘": "'",
    "’": "'",
    "“": '"',
    "”": '"',
    "′": "'",
}
"""For characters as compatibility decomposition (NFKD) leaves them: ⁻¹ has become minus and 1 by then."""
_GREEK = "GREEK SMALL LETTER ", "GREEK CAPITAL LETTER "


def put_up_with_any_console() -> None:
    """Let standard output and error write what their encoding lacks in a readable way instead of failing.

    Characters that the encoding has stay as they are: cp1252 shows °C, and writes -> for an arrow.
    """
    codecs.register_error(_HANDLER, _readable)
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors=_HANDLER)


def _readable(error: UnicodeError) -> tuple[str, int]:
    if not isinstance(error, UnicodeEncodeError):
        raise error
    return "".join(map(_stand_in, error.object[error.start : error.end])), error.end


def _stand_in(character: str) -> str:
    """Return ASCII for one character: a likeness where there is one, else its escape."""
    parts = unicodedata.normalize("NFKD", character)
    plain = "".join(_STAND_INS.get(part, part) for part in parts if not unicodedata.combining(part))
    if plain.isascii():
        return plain
    name = unicodedata.name(character, "")
    for letter in _GREEK:
        if name.startswith(letter):
            return name.removeprefix(letter).lower()
    return character.encode("ascii", "backslashreplace").decode()
