"""Reads the handbook's cases and asks the tool for each published quantity.

A case is one worked example of a book or application note; each number that it prints is one check. The keys:

case
    ``id``, ``source`` (a document of ``sources.toml`` and the place in it), ``got`` (``verified`` in the document,
    ``verified*`` in the public recalculation, ``memory``, ``own``), ``netlist``, ``intent``, ``part`` (data of the
    amplifier ``OAS``), ``tolerance`` (percent, rounding in print), ``note``, and ``differs`` where print and
    computation disagree: then the computed figure is tested and the text says why.
check
    ``quantity`` (a measure, ``voltage`` of a net, ``total_gain``, ``read_value`` …), ``published``, ``computed``,
    ``with`` (parameters of the netlist), ``stage``, ``input``, ``index``, ``net``, ``hz`` (signal frequency),
    ``resistor`` (declared tolerance), ``as`` (``dB``, ``abs``), ``times``, ``within`` (percent against the computed
    figure), ``absolute`` (limit in the unit itself), ``left_out`` (why no measure reaches the number).
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path
from typing import Any

FOLDER = Path(__file__).parent

AMPLIFIERS = """
.subckt OA p m o A=1e9
E1 o 0 p m {A}
.ends OA
.subckt OAR p m o A=1e9 rd=1e15 ro=1u
R1 p m {rd}
E1 x 0 p m {A}
R2 x o {ro}
.ends OAR
.subckt OAF p m o A=1e7 ft=1Meg
E1 x 0 p m {A}
R1 x y 1k
C1 y 0 {A/(6.283185307179586*ft*1k)}
E2 o 0 y 0 1
.ends OAF
.subckt OAFR p m o A=1e7 ft=1Meg ro=100
E1 x 0 p m {A}
R1 x y 1k
C1 y 0 {A/(6.283185307179586*ft*1k)}
E2 z 0 y 0 1
R2 z o {ro}
.ends OAFR
.subckt OA3 p m o A=1e5 f1=1 f2=1e9 f3=1e12
E1 x 0 p m {A}
R1 x y 1k
C1 y 0 {1/(6.283185307179586*f1*1k)}
E2 u 0 y 0 1
R2 u v 1k
C2 v 0 {1/(6.283185307179586*f2*1k)}
E3 r 0 v 0 1
R3 r s 1k
C3 s 0 {1/(6.283185307179586*f3*1k)}
E4 o 0 s 0 1
.ends OA3
.subckt OAS p m vcc vee o A=1e9
E1 o 0 p m {A}
.ends OAS
"""


class Unreached(Exception):
    """The tool gives no figure, and says why."""


@dataclass(frozen=True)
class Case:
    """One worked example."""

    section: str
    data: Mapping[str, Any]

    @property
    def id(self) -> str:
        return self.data["id"]


@dataclass(frozen=True)
class Check:
    """One number of a worked example."""

    case: Case
    data: Mapping[str, Any]
    number: int

    @property
    def id(self) -> str:
        given = ",".join(f"{key}={value:g}" for key, value in self.data.get("with", {}).items())
        return f"{self.case.id}-{self.data['quantity']}-{self.number}" + (f"[{given}]" if given else "")

    @property
    def left_out(self) -> str | None:
        return self.data.get("left_out", self.case.data.get("left_out"))

    @property
    def defect(self) -> str | None:
        """A known defect of the tool: the check is expected to fail until it is mended."""
        return self.data.get("defect", self.case.data.get("defect"))

    @property
    def differs(self) -> str | None:
        return self.data.get("differs", self.case.data.get("differs"))


@dataclass
class Workbench:
    """Circuit, stages and figures of one case with one set of parameters."""

    circuit: Any
    stages: tuple[Any, ...]
    bench: Any
    subjects: dict[str, Any] = field(default_factory=dict)

    def figure(self, quantity: str, kind: str, name: str | None) -> Any:
        from ampwarden.analysis.figures import Unknown

        subjects = self.bench.subjects(kind)
        if name is None and kind == "stage":
            subject = subjects[-1]
        else:
            found = [each for each in subjects if each.name.casefold() == str(name).casefold()]
            if not found:
                raise Unreached(f"no {kind} {name!r}; there are {[each.name for each in subjects]}")
            subject = found[0]
        figure = self.bench.figure(quantity, subject)
        if isinstance(figure, Unknown):
            raise Unreached(figure.reason)
        return figure.value


@lru_cache(maxsize=1)
def read_cases() -> tuple[Case, ...]:
    """All cases, in the order of the sections."""
    found = []
    for path in sorted((FOLDER / "cases").glob("*.toml")):
        document = tomllib.loads(path.read_text(encoding="utf-8"))
        found += [Case(document["title"], case) for case in document["cases"]]
    return tuple(found)


def all_checks() -> Iterator[Check]:
    """Every published or own number."""
    for case in read_cases():
        for number, data in enumerate(case.data["checks"], 1):
            yield Check(case, data, number)


def _intent_text(check: Check) -> str:
    text = check.case.data.get("intent", "")
    part = {**check.case.data.get("part", {}), **check.data.get("part", {})}
    if part:
        text += "\n[parts.OAS]\n" + "".join(
            f"{key} = {value!r}\n" if not isinstance(value, str) else f'{key} = "{value}"\n'
            for key, value in part.items()
        )
    if "resistor" in check.data:
        text += f"\n[tolerance]\nresistor = {check.data['resistor']!r}\n"
    if "hz" in check.data:
        net = check.data.get("signal", "in")
        text += f"\n[signals.{net}]\nlow = -1e-3\nhigh = 1e-3\nfrequency = [{check.data['hz']!r}]\n"
    return text


@lru_cache(maxsize=64)
def _workbench(text: str, intent_text: str) -> Workbench:
    from ampwarden.analysis.bench import Bench
    from ampwarden.circuit import build_circuit
    from ampwarden.text import parse_intent, parse_netlist
    from ampwarden.topology import find_stages

    intent = parse_intent(intent_text)
    circuit = build_circuit(parse_netlist(text), intent)
    stages = find_stages(circuit)
    return Workbench(circuit, stages, Bench(circuit, stages, intent))


def workbench_of(check: Check) -> Workbench:
    """The circuit of a check, ready to be measured."""
    netlist = check.case.data["netlist"]
    params = "".join(f".param {name}={value!r}\n" for name, value in check.data.get("with", {}).items())
    if not any(name in netlist for name in ("OA ", "OA\n", "OAR", "OAF", "OA3", "OAS")):
        text = f"{check.case.id}\n{params}{netlist}"
    else:
        text = f"{check.case.id}\n{params}{netlist}{AMPLIFIERS}"
    return _workbench(text + ".end\n", _intent_text(check))


def measured(check: Check) -> float | str:
    """What the tool says. Raises :class:`Unreached` when it gives no figure."""
    data = check.data
    quantity = data["quantity"]
    if quantity == "read_value":
        from ampwarden.text import read_value

        return _plain(read_value(data["text"], data.get("kind")), quantity)
    if quantity == "nearest_preferred":
        from ampwarden.quantities import nearest_preferred

        return nearest_preferred(data["value"], data["series"])
    bench = workbench_of(check)
    if quantity == "topology":
        return _stage(bench, data).topology
    if quantity == "voltage":
        value = (
            bench.bench.solution.voltage(data["net"])
            if "minus" not in data
            else (bench.bench.solution.voltage(data["net"]) - bench.bench.solution.voltage(data["minus"]))
        )
    elif quantity in {"total_gain", "signal_chain_gain"}:
        value = _product(bench, "dc_gain" if quantity == "total_gain" else "signal_gain")
    else:
        value = bench.figure(quantity, data.get("subject", "stage"), data.get("stage") or data.get("of"))
        if isinstance(value, Mapping):
            folded = {key.casefold(): each for key, each in value.items()}
            if data["input"].casefold() not in folded:
                raise Unreached(f"no entry for {data['input']!r} among {list(value)}")
            value = folded[data["input"].casefold()]
        elif isinstance(value, tuple | list):
            if len(value) <= data.get("index", 0):
                raise Unreached(f"{quantity} has {len(value)} entries")
            value = value[data.get("index", 0)]
    return _converted(_plain(value, quantity), data)


def _product(bench: Workbench, quantity: str) -> float:
    names = [subject.name for subject in bench.bench.subjects("stage")]
    return math.prod(_plain(bench.figure(quantity, "stage", name), quantity) for name in names)


def _stage(bench: Workbench, data: Mapping[str, Any]) -> Any:
    wanted = data.get("stage")
    for stage in reversed(bench.stages):
        if wanted is None or stage.name.casefold() == wanted.casefold():
            return stage
    raise Unreached(f"no stage {wanted!r}")


def _plain(value: Any, quantity: str) -> float:
    if value is None:
        raise Unreached(f"{quantity} is null")
    return float(value)


def _converted(value: float, data: Mapping[str, Any]) -> float:
    if data.get("as") == "dB":
        value = 20 * math.log10(abs(value))
    elif data.get("as") == "abs":
        value = abs(value)
    return value * data.get("times", 1.0)
