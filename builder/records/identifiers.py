"""Identifiers and their check characters.

Of entries: NS, six random Crockford base-32 characters, one ISO 7064 MOD 37,36 check character. Of people: ORCID, with
one of ISO 7064 MOD 11-2.
"""

import re
import secrets
from collections.abc import Callable

from stdnum.iso7064 import mod_11_2, mod_37_36

__all__ = [
    "CROCKFORD",
    "DRAWN",
    "IDENTIFIER_PATTERN",
    "PREFIX",
    "has_orcid_check_character",
    "is_identifier",
    "mend_identifier",
    "mint_identifier",
]

CROCKFORD = "0123456789ABCDEFGHJKMNPQRSTVWXYZ"
PREFIX = "NS"
DRAWN = 6
"""Characters drawn at random, behind which the check character stands."""
IDENTIFIER_PATTERN = f"^{PREFIX}[{CROCKFORD}]{{{DRAWN + 1}}}$"
_SHAPE = re.compile(IDENTIFIER_PATTERN)
_MISREAD = str.maketrans("ILOU", "110V")  # Crockford's decoding of I, L, O; U has none, V is its look-alike


def mint_identifier(choose: Callable[[str], str] = secrets.choice) -> str:
    """Return a fresh identifier; drawn offline, so uniqueness is checked on the merge result.

    choose: takes one character out of many at random; one with a seed makes identifiers that can be made again.
    Draws again when the check character would be I, L, O or U, which Crockford's alphabet leaves out.
    """
    while True:
        body = PREFIX + "".join(choose(CROCKFORD) for _ in range(DRAWN))
        check = mod_37_36.calc_check_digit(body)
        if check in CROCKFORD:
            return body + check


def is_identifier(text: str) -> bool:
    """Say whether `text` has the shape of an identifier and a right check character."""
    return bool(_SHAPE.match(text)) and bool(mod_37_36.is_valid(text))


def mend_identifier(text: str) -> str | None:
    """Return the one identifier that `text` was plainly meant to be (case, hyphens, look-alikes), or None."""
    tidy = re.sub(r"[\s-]", "", text).upper()
    mended = tidy[:2] + tidy[2:].translate(_MISREAD)
    return mended if mended != text and is_identifier(mended) else None


def has_orcid_check_character(address: str) -> bool:
    """Say whether the sixteenth character of an ORCID address is the ISO 7064 MOD 11-2 one of the fifteen before.

    address: https://orcid.org/ and four groups of four; its shape is checked elsewhere.
    """
    return bool(mod_11_2.is_valid(address.rpartition("/")[2].replace("-", "")))
