"""Parameter scopes: what a name means inside one subcircuit instance.

A value given in the call beats the default on the ``.subckt`` line, which beats ``.param`` inside the definition,
which beats what the surrounding definition knows. Parameters may stand in any order; a circle is named as one.
"""

from __future__ import annotations

from collections.abc import Mapping

from ..text.expressions import ExpressionError, evaluate
from ..text.netlist import FunctionLine, ModelLine, Scope, Subcircuit, Value
from .parts import DeviceModel


class Frame:
    """The scope of the top level or of one instance: parameters, models and subcircuits that it sees."""

    __slots__ = ("_busy", "_models", "_texts", "_values", "functions", "given", "parent", "scope", "written")

    def __init__(
        self,
        scope: Scope,
        parent: Frame | None = None,
        defaults: Mapping[str, Value] | None = None,
        given: Mapping[str, float] | None = None,
    ) -> None:
        self.scope = scope
        self.parent = parent
        self.given: Mapping[str, float] = given or {}
        self.written: Mapping[str, Value] = {**scope.params, **defaults} if defaults else scope.params
        outer: Mapping[str, FunctionLine] = parent.functions if parent is not None else {}
        self.functions: Mapping[str, FunctionLine] = {**outer, **scope.functions} if scope.functions else outer
        self._values: dict[str, float] = {}
        self._texts: dict[str, float] = {}
        self._models: dict[str, DeviceModel] = {}
        self._busy: list[str] = []

    def find(self, name: str) -> float | None:
        """Return the value of a parameter (lower-case name); None when no scope defines it."""
        if name in self._values:
            return self._values[name]
        if name in self.given:
            return self.given[name]
        written = self.written.get(name)
        if written is None:
            return self.parent.find(name) if self.parent is not None else None
        if isinstance(written, float):
            return written
        if name in self._busy:
            # A default such as {r} for a parameter r means the r of the surrounding scope.
            if self._busy[-1] == name and self.parent is not None:
                outer = self.parent.find(name)
                if outer is not None:
                    return outer
            circle = " -> ".join([*self._busy[self._busy.index(name) :], name])
            raise ExpressionError(f"parameters define each other in a circle: {circle}", kind="parameter-circle")
        self._busy.append(name)
        try:
            value = evaluate(written.text, self.find, self.functions)
        finally:
            self._busy.pop()
        self._values[name] = value
        return value

    def value(self, value: Value) -> float:
        """Evaluate a value in this scope.

        Raises
        ------
        ExpressionError
            When the expression has no value here.
        """
        if isinstance(value, float):
            return value
        if isinstance(value, int):
            return float(value)
        known = self._texts.get(value.text)
        if known is None:
            known = self._texts[value.text] = evaluate(value.text, self.find, self.functions)
        return known

    def subcircuit(self, name: str) -> tuple[Subcircuit, Frame] | None:
        """Return the definition that a name means here, with the scope that holds it."""
        key = name.lower()
        frame: Frame | None = self
        while frame is not None:
            found = frame.scope.subcircuits.get(key)
            if found is not None:
                return found, frame
            frame = frame.parent
        return None

    def model_line(self, name: str) -> tuple[ModelLine, Frame] | None:
        """Return the ``.model`` line that a name means here, with the scope that holds it."""
        key = name.lower()
        frame: Frame | None = self
        while frame is not None:
            found = frame.scope.models.get(key)
            if found is not None:
                return found, frame
            frame = frame.parent
        return None

    def model(self, name: str) -> DeviceModel | None:
        """Return the evaluated model of a name with the parameters of its ``ako:`` bases; None when not defined.

        Raises
        ------
        ExpressionError
            When a parameter of the model has no value.
        """
        found = self.model_line(name)
        if found is None:
            return None
        line, frame = found
        key = line.name.lower()
        known = frame._models.get(key)
        if known is not None:
            return known
        chain = [line]
        while chain[-1].base is not None and len(chain) < 20:
            below = frame.model_line(chain[-1].base)
            if below is None or below[0] in chain:
                break
            chain.append(below[0])
        params: dict[str, float] = {}
        for each in reversed(chain):
            for parameter, value in each.params.items():
                try:
                    params[parameter] = frame.value(value)
                except ExpressionError:
                    # Words such as mfg=… are no numbers; a model keeps what it can say in figures.
                    continue
        kind = next((each.kind for each in chain if each.kind), "")
        model = frame._models[key] = DeviceModel(line.name, kind.upper(), params)
        return model
