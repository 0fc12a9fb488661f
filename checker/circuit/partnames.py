"""Part numbers as schematics write them, matched to the numbers of families.

A number is matched by the longest family number that it begins with, when what follows is a package, grade or
temperature suffix: never a digit that would make it another part, never a word of a designer's own naming.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from functools import lru_cache

_MAKERS = (
    "(?:TI|ADI|AD|LT|LTC|NS|NSC|NAT|BB|ON|ONSEMI|ST|STM|MC|MICROCHIP|MAXIM|MAX|RENESAS|INTERSIL|NJR|ROHM|NXP|DIODES|"
    "PHILIPS|FAIRCHILD|FSC)"
)
_MAKER_HEAD = re.compile(rf"^{_MAKERS}[_:./-](?=[A-Z])")
_PACKAGES = (
    "(?:P?DIP|SOIC|SO|SOP|TSSOP|SSOP|VSSOP|MSOP|SOT|SC|TO|DFN|QFN|LFCSP|WSON|SON|BGA|CERDIP|CDIP|PLCC|LCC|REEL|RL|PBF|"
    "NOPB|TR|EP|Q1|E3|LF|T|R)"
)
_TAIL = re.compile(
    rf"""^[A-Z]{{0,6}}\d{{0,2}}[A-Z]{{0,3}}\d?                       # package, grade and temperature letters
        (?:[-_/.\#+\ ](?:{_MAKERS}|{_PACKAGES}[-_]?\d{{0,4}}[A-Z]?     # maker, package
        |[A-Z]{{0,3}}\d{{1,4}}[A-Z]{{0,2}}\d?|[A-Z]{{1,3}}))*$          # grade, tape, voltage""",
    re.VERBOSE,
)


@lru_cache(maxsize=4096)
def plain_number(text: str) -> str:
    """Return a part number in capitals without maker prefix and blanks."""
    upper = text.strip().strip("\"'").upper()
    return _MAKER_HEAD.sub("", upper)


@lru_cache(maxsize=8192)
def is_suffix(tail: str) -> bool:
    """True for what may follow a family number: letters of package and grade, or a maker's tail."""
    if not tail:
        return True
    if tail[0].isdigit() or len(tail) > 16:
        return False
    return _TAIL.match(tail) is not None


def longest_prefix(name: str, known: Iterable[str]) -> str | None:
    """Return the longest of the known numbers that ``name`` begins with, its suffix aside; None when none fits."""
    plain = plain_number(name)
    best: str | None = None
    for each in known:
        if (best is None or len(each) > len(best)) and plain.startswith(each.upper()) and is_suffix(plain[len(each) :]):
            best = each
    return best
