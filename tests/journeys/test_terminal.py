"""The command on terminals and pipes of every kind: colour, width, encodings, readers that go away, completion."""

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

COMMANDS = ["review", "stages", "rules", "parts"]


@pytest.mark.parametrize("command", ["", *COMMANDS])
def test_help_fits_a_screen_and_has_an_example(ampwarden, command):
    done = ampwarden(*command.split(), "--help", COLUMNS="80")
    assert done.returncode == 0
    lines = done.stdout.splitlines()
    assert len(lines) <= 26
    assert max(map(len, lines)) <= 80
    assert "Example" in done.stdout


def test_version_is_one_line(ampwarden):
    import ampwarden as package

    assert ampwarden("--version").stdout == f"ampwarden {package.__version__}\n"


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("revue",), "unknown command revue; nearest: review"),
        (("review", "--formt", "x", "a"), "unknown option --formt; nearest: --format"),
        (("review",), "missing argument"),
        (("review", "x", "--format", "pdf"), "'pdf' is not one of"),
        (("parts", "NOSUCHPART99"), "no part data for `NOSUCHPART99`"),
        (("rules", "output-near-rial"), "output-near-rail"),
    ],
    ids=lambda value: " ".join(value) if isinstance(value, tuple) else "words",
)
def test_wrong_call_is_told_in_a_few_lines_with_status_2(ampwarden, arguments, words):
    done = ampwarden(*arguments)
    assert done.returncode == 2
    assert words in done.stderr
    assert done.stdout == ""
    assert len(done.stderr.splitlines()) <= 4
    assert not re.search("please|illegal|oops|did you mean|!", done.stderr, re.IGNORECASE)


def on_terminal(boards, *arguments, **variables):
    """Run the command on a pseudo-terminal and return what it shows."""
    pty = pytest.importorskip("pty")
    kept = {key: value for key, value in os.environ.items() if key != "NO_COLOR"}
    environment = kept | {"PYTHONUTF8": "1", "TERM": "xterm", "COLUMNS": "100"} | variables
    near, far = pty.openpty()
    command = [sys.executable, "-m", "ampwarden", *arguments]
    with subprocess.Popen(command, cwd=boards, env=environment, stdout=far, stdin=far) as process:
        os.close(far)
        shown = b""
        while True:
            try:
                piece = os.read(near, 65536)
            except OSError:
                break
            if not piece:
                break
            shown += piece
        os.close(near)
        process.wait()
    return shown.decode()


def test_report_is_coloured_on_a_terminal(boards):
    shown = on_terminal(boards, "review", "bad")
    assert "\x1b[" in shown
    assert "supply-decoupling-missing" in re.sub(r"\x1b\[[0-9;]*m", "", shown)


@pytest.mark.parametrize("variables", [{"NO_COLOR": "1"}, {"TERM": "dumb"}])
def test_wish_for_no_colour_is_obeyed_on_a_terminal(boards, variables):
    assert "\x1b" not in on_terminal(boards, "review", "bad", **variables)


def test_report_on_a_pipe_has_no_colour_and_follows_the_columns(ampwarden, boards):
    narrow = ampwarden("review", "bad", COLUMNS="60").stdout
    assert "\x1b" not in narrow
    assert max(map(len, narrow.splitlines()[:-1])) <= 60


@pytest.mark.parametrize("encoding", ["ascii", "latin-1", "cp437", "utf-8"])
def test_report_survives_the_encoding_of_any_terminal(boards, encoding):
    environment = os.environ | {"PYTHONIOENCODING": encoding, "PYTHONUTF8": "0"}
    command = [sys.executable, "-m", "ampwarden", "stages", "good", "bad"]
    done = subprocess.run(command, cwd=boards, env=environment, capture_output=True)
    assert done.returncode == 0, done.stderr
    text = done.stdout.decode(encoding)
    assert "voltage-follower" in text
    assert "\ufffd" not in text


def test_reader_that_goes_away_is_no_failure(boards):
    command = f'"{sys.executable}" -m ampwarden review good good bad | head -n 1'
    done = subprocess.run(["bash", "-c", command], cwd=boards, capture_output=True, text=True)
    assert done.stderr == ""
    assert done.stdout.startswith("good/good.cir")


def test_completion_offers_commands_and_rules(ampwarden):
    def offered(words, index):
        variables = {"_AMPWARDEN_COMPLETE": "bash_complete", "COMP_WORDS": words, "COMP_CWORD": str(index)}
        return ampwarden(**variables).stdout

    assert "plain,review" in offered("ampwarden rev", 1)
    assert "plain,output-near-rail" in offered("ampwarden review --only output-ne", 3)


def test_completion_script_is_written_for_bash_zsh_and_fish(ampwarden):
    for shell in ("zsh", "fish"):
        assert "_AMPWARDEN_COMPLETE" in ampwarden(_AMPWARDEN_COMPLETE=f"{shell}_source").stdout


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no full device here")
def test_full_disk_is_told_in_one_line(ampwarden, boards):
    done = ampwarden("review", "good", "--output", "/dev/full")
    assert done.returncode == 2
    assert "cannot write /dev/full" in done.stderr
