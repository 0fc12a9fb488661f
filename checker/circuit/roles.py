"""Pin roles by words: what the port names of a ``.subckt`` and the comments at its head say.

Roles are ``IN+ IN- OUT V+ V-`` and the further ones of a package (``REF RG NULL COMP SHDN GND SENSE``). A word that
different makers use for different pins (``VS`` is an output in one family and a supply elsewhere) counts only when
the whole set of names fits in one way.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from itertools import product

Roles = Mapping[str, int]
"""Role to position of the port (from 0)."""

CORE = ("IN+", "IN-", "OUT")
SUPPLIES = ("V+", "V-")
EXTRAS = ("REF", "RG", "NULL", "COMP", "SHDN", "GND", "SENSE", "NC", "BW", "FB")


def _table(rows: Mapping[str, str]) -> dict[str, tuple[tuple[str, int], ...]]:
    found: dict[str, list[tuple[str, int]]] = {}
    for head, words in rows.items():
        role, _, cost = head.partition(" ")
        for word in words.split():
            found.setdefault(word, []).append((role, int(cost or 0)))
    return {word: tuple(each) for word, each in found.items()}


# Words in lower case without blanks and underscores; a cost marks a reading that gives way to a better one.
_WORDS = _table(
    {
        "IN+": "in+ +in inp inplus in_p ip vinp vin+ +vin noninv noninverting ninv ni nin+ pos_in inpos posin plus + pin "
        "inputp inputplus pinput v_inp vip nonin nonincv nipos ip+ +input input+",
        "IN+ 1": "p pos np vp v+",
        "IN-": "in- -in inn inm inminus in_n in_m inv inverting im vinn vinm vin- -vin neg_in inneg negin minus - "
        "nin inputn inputminus ninput v_inn vim vi- im- -input input-",
        "IN- 1": "n m neg nn vn vm v-",
        "OUT": "out output vout o vo outp outa voutp out1 op opout",
        "OUT 1": "vs",
        "V+": "v+ vcc vdd vccp vpos vs+ +vs +v +vcc vplus pvcc avdd avcc 99 vsp vccplus vsupp vsup+ vp+ vpp v_pos ps+ pwr+ "
        "vhi vdda vcca vc hv+ +ve",
        "V+ 1": "vp vs pos p 100 50p cc dd top",
        "V-": "v- vee vss vccn vneg vs- -vs -v -vcc vminus nvcc avss 50 vsn vccminus vsup- vn- vnn v_neg ps- pwr- vlo ve "
        "vssa hv- -ve -vee",
        "V- 1": "vn vm neg n m 101 ee ss bottom vg",
        "GND": "gnd com comm common vgnd agnd ground",
        "REF": "ref vref reference refin",
        "RG": "rg rg1 rg2 rg+ rg- rgp rgn rgain gain1 gain2 g1 g2",
        "NULL": "null null1 null2 nul bal bal1 bal2 balance offset off1 off2 os1 os2 vos1 vos2 trim trim1 trim2",
        "COMP": "comp comp1 comp2 cmp cc1 cc2",
        "SHDN": "shdn sd shutdown shdnb en enable dis disable pd pdn stby standby xshdn sleep",
        "SENSE": "sense sns",
        "FB": "fb feedback",
        "NC": "nc nc1 nc2 nc3 nc4",
    }
)


def words_of(name: str) -> tuple[tuple[str, int], ...]:
    """Return the roles that a port name may stand for, each with its cost."""
    plain = name.strip().lower().replace(" ", "").strip("\"'")
    return _WORDS.get(plain) or _WORDS.get(plain.replace("_", "")) or ()


def roles_by_names(ports: Sequence[str]) -> Roles | None:
    """Return the roles of amplifier ports by their names when they fit in exactly one best way; None otherwise."""
    if not 3 <= len(ports) <= 10:
        return None
    choices = [words_of(each) for each in ports]
    if any(not each for each in choices):
        return None
    best: list[tuple[str, ...]] = []
    least = 10**9
    for combination in product(*choices):
        roles = tuple(role for role, _ in combination)
        if not _is_amplifier(roles):
            continue
        cost = sum(each for _, each in combination)
        if cost < least:
            best, least = [roles], cost
        elif cost == least:
            best.append(roles)
    return numbered(best[0]) if len(best) == 1 else None


def _is_amplifier(roles: Sequence[str]) -> bool:
    core = [roles.count(each) for each in CORE]
    supplies = [roles.count(each) for each in SUPPLIES]
    if core != [1, 1, 1]:
        return False
    if supplies == [1, 1]:
        return True
    # One supply and ground: the single-supply form. No supply at all: the ideal amplifier, which has nothing else.
    if supplies == [1, 0]:
        return roles.count("GND") == 1
    return supplies == [0, 0] and len(roles) == 3


def numbered(roles: Sequence[str]) -> dict[str, int]:
    """Map roles to positions; a role that repeats gets a number from the second on (``RG``, ``RG2``)."""
    found: dict[str, int] = {}
    for position, role in enumerate(roles):
        name, count = role, 1
        while name in found:
            count += 1
            name = f"{role}{count}"
        found[name] = position
    if "V-" not in found and "V+" in found and "GND" in found:
        found["V-"] = found.pop("GND")
    return found


_PHRASES: tuple[tuple[str, re.Pattern[str]], ...] = tuple(
    (role, re.compile(pattern, re.IGNORECASE))
    for role, pattern in (
        ("IN+", r"non[\s-]*inv|\bnon\b.*input|positive\s+input|\+\s*in\b|\bin\s*\+|^\s*plus\b|\+\s*input|input\s*\+"),
        ("IN-", r"\binvert|\binv\b|negative\s+input|(?<!\w)-\s*in\b|\bin\s*-|^\s*minus\b|-\s*input|input\s*-"),
        ("NULL", r"\bnull|offset|\btrim|balance"),
        ("SHDN", r"shut\s*-?\s*down|disable|enable|stand-?by|power\s*-?\s*down"),
        ("V+", r"pos\w*\s+(?:power|supply|rail|volt)|\+\s*v\w*|\bv\w*\s*\+|\bvcc\b|\bvdd\b|supply\s*\+|\+\s*supply"),
        ("V-", r"neg\w*\s+(?:power|supply|rail|volt)|(?<!\w)-\s*v\w*|\bv\w*\s*-|\bvee\b|\bvss\b|supply\s*-|-\s*supply"),
        ("SENSE", r"\bsense"),
        ("RG", r"\brg\d?\b|gain\s*(?:set|resist|sense|adj)"),
        ("REF", r"\bref"),
        ("COMP", r"\bcomp"),
        ("OUT", r"\bout|^\s*o\s*$"),
        ("GND", r"\bgnd\b|ground|emitter"),
        ("NC", r"\bn\.?c\.?\b|no connect"),
    )
)

_BAR_LINE = re.compile(r"^[\s*|:.]*$")
_HEAD = re.compile(
    r"^.*?(?:connections?|pin\s*(?:out)?\s*(?:order)?|node\s*assignments?|terminals?)\s*[:=]?\s*", re.IGNORECASE
)
_LISTED = re.compile(r"^\s*(?:pin|node)?\s*(\w+)\s*[-=:.)]*\s+(.+)$", re.IGNORECASE)
_TERSE = re.compile(
    r"[+-]\s*(?:in|vin|input)\b|(?:in|vin|input)\s*[+-]|[+-]\s*v(?:cc|ee|dd|ss|s)?\b|v(?:cc|ee|dd|ss|s)?\s*[+-]"
    r"|\bv(?:cc|dd|ee|ss)\b|non[\s-]*inv\w*(?:\s+input)?|inv\w*(?:\s+input)?|\bout\w*|\bvout\b|\bref\b|\brg\b|\bcomp\b"
    r"|\bnull\b|\bgnd\b|[+-](?=\s|$|v)|\bo\b",
    re.IGNORECASE,
)


def role_of_phrase(text: str) -> str | None:
    """Return the role that a comment phrase such as ``POSITIVE POWER SUPPLY`` names; None when it names none."""
    for role, pattern in _PHRASES:
        if pattern.search(text):
            return role
    return None


def roles_by_remarks(remarks: Sequence[str], ports: Sequence[str]) -> Roles | None:
    """Return the roles that comment lines at the head of a definition give to its ports.

    Three customs are read: a staircase of bars, one line of roles in the order of the ports, and a list keyed by the
    node. The number of roles must agree with the number of ports.
    """
    lines = [each.strip().lstrip("*").rstrip() for each in remarks]
    for reader in (_staircase, _list, _one_line):
        roles = reader(lines, ports)
        if roles is not None and _is_amplifier(roles):
            return numbered(roles)
    return None


def _staircase(lines: Sequence[str], ports: Sequence[str]) -> list[str] | None:
    found: list[str] = []
    last = -1
    for line in lines:
        if _BAR_LINE.match(line):
            continue
        body = _HEAD.sub("", line) if not found and "|" not in line.split(":")[0] else line
        bars = body.count("|")
        text = body.replace("|", " ").strip()
        if found and bars == 0:
            break
        role = role_of_phrase(text)
        if role is None or (bars and bars <= last):
            if found:
                return None
            continue
        if bars != len(found):
            if bars == 0:
                found, last = [], -1
            else:
                return None
        found.append(role)
        last = bars
    return found if len(found) == len(ports) else None


def _list(lines: Sequence[str], ports: Sequence[str]) -> list[str] | None:
    known = {each.lower(): index for index, each in enumerate(ports)}
    found: dict[int, str] = {}
    for line in lines:
        match = _LISTED.match(line)
        if match is None or match[1].lower() not in known:
            continue
        role = role_of_phrase(match[2])
        if role is None or known[match[1].lower()] in found:
            return None
        found[known[match[1].lower()]] = role
    return [found[index] for index in range(len(ports))] if len(found) == len(ports) else None


def _one_line(lines: Sequence[str], ports: Sequence[str]) -> list[str] | None:
    for line in lines:
        text = _HEAD.sub("", line) if _HEAD.match(line) else line
        phrases = _TERSE.findall(text)
        if len(phrases) != len(ports):
            continue
        roles = [_terse_role(each) for each in phrases]
        if None not in roles:
            return [each for each in roles if each is not None]
    return None


def _terse_role(phrase: str) -> str | None:
    plain = phrase.replace(" ", "").lower()
    if plain in {"+", "-"}:
        return f"IN{plain}"
    if plain in {"o", "vout"}:
        return "OUT"
    if plain in {"-vcc", "vcc-"}:
        return "V-"
    return role_of_phrase(phrase)
