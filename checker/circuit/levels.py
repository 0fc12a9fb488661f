"""Names at one level of the hierarchy: parameters, functions, models and subcircuits, the call before the outer level.

Parameters are evaluated on first use, in order of dependency; a circle is an error that names its members.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from ..text.expressions import ExpressionError, evaluate
from ..text.netlist import Expression, FunctionLine, ModelLine, Scope, Subcircuit, Value


@dataclass(slots=True)
class Level:
    """One open level: the scope that defines names, the values given by the call, the level around it."""

    scope: Scope
    outer: Level | None = None
    given: Mapping[str, float] = field(default_factory=dict)
    defaults: Mapping[str, Value] = field(default_factory=dict)
    _known: dict[str, float | None] = field(default_factory=dict)
    _open: list[str] = field(default_factory=list)

    def parameter(self, name: str) -> float | None:
        """Return the value of a parameter by its lower-case name, or None when nothing defines it.

        Raises
        ------
        ExpressionError
            When parameters refer to each other in a circle, or one has no value.
        """
        if name in self.given:
            return self.given[name]
        if name in self._known:
            return self._known[name]
        written = self.scope.params.get(name, self.defaults.get(name))
        if written is None:
            return self.outer.parameter(name) if self.outer is not None else None
        if name in self._open:
            circle = " -> ".join([*self._open[self._open.index(name) :], name])
            raise ExpressionError(f"parameters refer to each other in a circle: {circle}", kind="circle")
        self._open.append(name)
        try:
            value = self.value(written)
        finally:
            self._open.pop()
        self._known[name] = value
        return value

    def value(self, written: Value) -> float:
        """Evaluate a value in this level."""
        if isinstance(written, Expression):
            return evaluate(written.text, self.parameter, self.functions())
        return written

    def functions(self) -> Mapping[str, FunctionLine]:
        """Return the functions that are seen here."""
        if self.outer is None:
            return self.scope.functions
        return {**self.outer.functions(), **self.scope.functions} if self.scope.functions else self.outer.functions()

    def model(self, name: str) -> ModelLine | None:
        """Return the model of a name, the innermost first."""
        found = self.scope.models.get(name.lower())
        return found if found is not None or self.outer is None else self.outer.model(name)

    def subcircuit(self, name: str) -> tuple[Subcircuit, Level] | None:
        """Return a definition with the level that it stands in, the innermost first."""
        found = self.scope.subcircuits.get(name.lower())
        if found is not None:
            return found, self
        return self.outer.subcircuit(name) if self.outer is not None else None
