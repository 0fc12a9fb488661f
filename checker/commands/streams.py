"""Where texts go: reports to standard output or a file, diagnostics to standard error."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterable


def tell(text: str) -> None:
    """Write a diagnostic to standard error, in what its encoding can carry."""
    encoding = sys.stderr.encoding or "ascii"
    shown = text.encode(encoding, "backslashreplace").decode(encoding)
    print(f"ampwarden: {shown}", file=sys.stderr)  # noqa: T201 - this is the one voice of the command line


def discard_output() -> None:
    """Point standard output nowhere, so that leaving does not complain about a reader that has gone."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, sys.stdout.fileno())


def deliver(pieces: Iterable[str], output: str | None = None, *, is_for_reading: bool = True) -> None:
    """Write a text piece by piece to a file or to standard output.

    Files and machine formats are UTF-8; text for reading on standard output follows its encoding. A reader that goes
    away early (``| head``) is no failure.

    Raises
    ------
    UsageError
        When the file cannot be written.
    """
    if output is not None:
        _write_file(pieces, output)
        return
    encoding = (sys.stdout.encoding or "ascii") if is_for_reading else "utf-8"
    errors = "replace" if is_for_reading else "backslashreplace"
    try:
        sys.stdout.flush()
        stream = sys.stdout.buffer
        for piece in pieces:
            stream.write(piece.encode(encoding, errors))
        stream.flush()
    except BrokenPipeError:
        discard_output()


def _write_file(pieces: Iterable[str], output: str) -> None:
    """Write a regular file beside its place and move it there, so that a failed run leaves the old report whole."""
    from pathlib import Path

    from ..errors import Problem, UsageError

    place = Path(output)
    is_replaced = place.is_file() or not place.exists()
    target = place.with_name(f"{place.name}.{os.getpid()}.part") if is_replaced else place
    try:
        with target.open("w", encoding="utf-8", errors="backslashreplace", newline="") as stream:
            stream.writelines(pieces)
        if is_replaced:
            target.replace(place)
    except OSError as trouble:
        if is_replaced:
            target.unlink(missing_ok=True)
        reason = (trouble.strerror or str(trouble)).lower()
        raise UsageError(Problem("output-unwritable", f"cannot write {output}: {reason}")) from trouble
