"""What net names say: rails with their voltage, grounds, references, signal entries."""

from __future__ import annotations

import re
from functools import lru_cache

_NUMBER = r"(\d{1,3})(?:[.p](\d{1,2}))?"
_VOLTS = (
    re.compile(rf"^([+-])\s*{_NUMBER}\s*V?(?:DC)?[A-Z]?$", re.IGNORECASE),
    re.compile(
        rf"^([+-]?)\s*{_NUMBER}\s*V(?:DC)?[_-]?(?:[A-Z]|REF|ANA|DIG|ISO|FILT|SW|STBY|AUX|OUT|IN)?$", re.IGNORECASE
    ),
    re.compile(r"^([+-]?)()(\d{1,2})V(\d{1,2})[_-]?[A-Z]?$", re.IGNORECASE),
)
_PREFIXED = re.compile(
    rf"^(?:(V?[PNM])|V(?:CC|DD|EE|SS)?|AV(?:CC|DD)|DV(?:CC|DD)|PWR|SUPPLY|RAIL)[_-]?([+-]?){_NUMBER}V?(\d{{0,2}})[A-Z]?$",
    re.IGNORECASE,
)
_SHORT = re.compile(r"^V(\d{1,2})([PNAD]?)$", re.IGNORECASE)
_WORDS = re.compile(
    r"^(?:[AD]?VCC|[AD]?VDD|VEE|[AD]?VSS|V\+|V-|\+V|-V|\+VS|-VS|VS\+|VS-|\+VCC|-VCC|VCC\+|VCC-|\+VDD|-VEE|-VSS|VPOS|VNEG|"
    r"VPP|VNN|VSUP|VSUPPLY|V?BAT|V?BATT|V?BATTERY|V?BAT\+|BATP|\+BATT?|V_?POS|V_?NEG|VAA|VANA|VDDA|VCCA|VSSA|VP\+|VN-|PVCC|PVDD|VMINUS|VPLUS|SUPPLY\+?|"
    r"SUPPLY-|B\+|HV|VDIG|VIO|VLOGIC|VEXC?|EXC|V_?EXC\w*|VPWR|VMAIN|VRAW|VUNREG|VREG|VBUS|VUSB|VLED|VREL\w*)[_-]?\d{0,2}$",
    re.IGNORECASE,
)
_GROUNDS = re.compile(
    r"^(?:[ADPS]_?GND\d?|GND_?(?:[ADPS]|ANA|DIG|PWR|ISO|SIG|ANALOG|DIGITAL|POWER|SIGNAL|CHASSIS|EARTH|REF)\d?|VSSA?GND|EARTH|CHASSIS|0V|COM_?GND|GND\d)$",
    re.IGNORECASE,
)
_REFERENCES = re.compile(
    r"^(?:[AV]?_?REF\w*|V?_?(?:BIAS|MID|HALF|CM|COM|OFFSET|OFS|BG|TH|THR|THRESH\w*|SET\w*|LIM\w*)\w{0,4}|VGND|V_?GND|VB\d?|BB\d?|"
    r"\w*REF\d?|\w*BIAS\d?|VHALF|HALF\w*|MID\w*|VCM|VTH\w*|VMID)$",
    re.IGNORECASE,
)
_ENTRIES = re.compile(
    r"^(?:V?_?(?:IN|INP|INN|INPUT|SIG|SIGNAL|SENS|SENSE|SENSOR|SRC|SOURCE|GEN|AUDIO|MIC|LINE|AC|S)[\w+-]{0,8}|[IVEABUX]\d?|VI|VS\d?|"
    r"\w+[_-]?IN\d?|\w*SIG\d?|\w*SENS\w*)$",
    re.IGNORECASE,
)


def _bare(net: str) -> str:
    return net.rsplit("/", 1)[-1].strip().strip("\"'")


@lru_cache(maxsize=8192)
def volts_in_name(net: str) -> float | None:
    """Return the voltage that a net name states (``+12V``, ``3V3``, ``-15``, ``VCC_5V``); None when it states none."""
    name = _bare(net)
    for pattern in _VOLTS:
        match = pattern.match(name)
        if match:
            groups = match.groups()
            if len(groups) == 4:
                return _signed(groups[0] == "-", groups[2], groups[3])
            return _signed(groups[0] == "-", groups[1], groups[2])
    match = _SHORT.match(name)
    if match and match[2]:
        return _signed(match[2].upper() == "N", match[1], None)
    match = _PREFIXED.match(name)
    if match and ("V" in name.upper()):
        side, sign, whole, part, tail = match.groups()
        is_negative = sign == "-" or (side or "")[-1:].upper() in {"N", "M"}
        if name.upper().startswith(("VEE", "VSS")) and sign != "+":
            is_negative = True
        if re.fullmatch(r"V\d{1,2}", name, re.IGNORECASE) or re.fullmatch(r"V?[PNM]\d{1,2}", name, re.IGNORECASE):
            return None
        if re.fullmatch(r"[A-Z]{2,5}[12]", name, re.IGNORECASE):
            return None
        return _signed(is_negative, whole, part or tail)
    return None


def _signed(is_negative: bool, whole: str, part: str | None) -> float:
    value = float(f"{whole}.{part}" if part else whole)
    return -value if is_negative else value


@lru_cache(maxsize=8192)
def is_rail_name(net: str) -> bool:
    """True for names that the trade gives to supply rails."""
    return volts_in_name(net) not in (None, 0.0) or _WORDS.match(_bare(net)) is not None


def agrees_with_name(net: str, volts: float) -> bool:
    """True when the digits of a name such as ``V12`` or ``V33`` say the voltage that the net stands at."""
    match = _SHORT.match(_bare(net))
    return match is not None and abs(volts) > 2.4 and abs(volts) in (float(match[1]), float(match[1]) / 10)


def is_negative_rail_name(net: str) -> bool:
    """True for names of the more negative supply."""
    name = _bare(net).upper()
    volts = volts_in_name(net)
    return (volts is not None and volts < 0) or name.startswith(("VEE", "VSS", "V-", "-V", "VNEG", "V_NEG", "VMINUS")) or name in {
        "VS-", "VCC-", "VNN", "SUPPLY-"
    }  # fmt: skip


@lru_cache(maxsize=8192)
def is_ground_name(net: str) -> bool:
    """True for names of separate grounds such as AGND, PGND, GND_ISO."""
    return _GROUNDS.match(_bare(net)) is not None


@lru_cache(maxsize=8192)
def is_reference_name(net: str) -> bool:
    """True for names that the trade gives to references and bias points."""
    return _REFERENCES.match(_bare(net)) is not None


@lru_cache(maxsize=8192)
def is_entry_name(net: str) -> bool:
    """True for names that the trade gives to signal entries."""
    return _ENTRIES.match(_bare(net)) is not None
