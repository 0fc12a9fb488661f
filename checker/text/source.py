"""Files as bytes and text: encodings, line ends, the bounds that keep reading finite."""

from __future__ import annotations

import codecs
import hashlib
from dataclasses import dataclass
from pathlib import Path

from ..errors import Location, NetlistError, Problem


@dataclass(frozen=True, slots=True)
class Limits:
    """Bounds of reading; an input beyond one is refused with an error that names it.

    ``total_bytes`` covers the netlist and everything it includes; ``elements_after_flattening`` is counted before
    any subcircuit is expanded.
    """

    line_length: int = 20_000
    total_bytes: int = 256_000_000
    elements_after_flattening: int = 2_000_000
    include_depth: int = 20
    subcircuit_depth: int = 50
    expression_depth: int = 60
    errors: int = 50


@dataclass(frozen=True, slots=True)
class SourceText:
    """One file as text: ``lines`` without their ends."""

    name: str
    lines: tuple[str, ...]
    sha256: str
    size: int


def read_source(path: Path, name: str, limits: Limits, spent: int = 0) -> SourceText:
    """Read one file as text.

    Raises
    ------
    NetlistError
        When it cannot be opened, is too large, or holds NUL bytes.
    """
    try:
        size = path.stat().st_size
        if spent + size > limits.total_bytes:
            raise NetlistError(
                Problem(
                    "too-large",
                    f"{name} brings the text read to {spent + size} bytes, more than the bound of {limits.total_bytes}",
                    Location(name, 1),
                    cure="split the netlist, or raise total_bytes in the call of read_netlist",
                )
            )
        content = path.read_bytes()
    except OSError as trouble:
        raise NetlistError(
            Problem(
                "file-unreadable",
                f"cannot read {name}: {(trouble.strerror or str(trouble)).lower()}",
                Location(name, 1),
            )
        ) from trouble
    return decode_source(content, name)


def decode_source(content: bytes, name: str) -> SourceText:
    """Turn bytes into lines: UTF-8 with or without mark, UTF-16 with mark, else one of the 8-bit code pages.

    The DOS end-of-file byte ends the text; CR, LF and CRLF end lines.
    """
    digest = hashlib.sha256(content).hexdigest()
    if content.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        text = content.decode("utf-16", errors="replace")
    else:
        if b"\0" in content:
            line = content[: content.index(b"\0")].count(b"\n") + 1
            raise NetlistError(
                Problem(
                    "nul-byte",
                    f"{name} holds a NUL byte: it is not a text file",
                    Location(name, line),
                    cure="export the netlist as text; a UTF-16 file needs its byte-order mark",
                )
            )
        content = content.split(b"\x1a", 1)[0] if b"\x1a" in content else content
        try:
            text = content.decode("utf-8-sig")
        except UnicodeDecodeError:
            text = _decode_8_bit(content)
    return text_source(text, name, digest, len(content))


def _decode_8_bit(content: bytes) -> str:
    """Tell Latin-1 from the DOS code pages by where micro and ohm signs stand."""
    dos = sum(content.count(byte) for byte in (b"\xe6", b"\xea"))
    latin = sum(content.count(byte) for byte in (b"\xb5", b"\xb0", b"\xb1"))
    return content.decode("cp437" if dos > latin else "latin-1")


def text_source(text: str, name: str, digest: str | None = None, size: int | None = None) -> SourceText:
    """Split text into lines; see :func:`decode_source`."""
    content = text.encode("utf-8", errors="surrogatepass")
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    lines = text.split("\n")
    if lines and not lines[-1]:
        lines.pop()
    return SourceText(
        name, tuple(lines), digest or hashlib.sha256(content).hexdigest(), len(content) if size is None else size
    )
