"""Hierarchy to flat parts: names, scopes, bounds. Meaning of the lines: netlist reference, SPICE3 3f3 manual."""

import pytest
from circuit.decks import IDEAL, circuit_of, deck
from hypothesis import given, settings
from hypothesis import strategies as st

from ampwarden.circuit import build_circuit
from ampwarden.errors import NetlistError
from ampwarden.text import parse_netlist
from ampwarden.text.source import Limits

DIVIDER = [".subckt DIV top tap r=10k", "R1 top tap {r}", "R2 tap 0 {r}", "C1 tap inner 1n", "R3 inner 0 1k", ".ends"]


def test_part_and_net_of_an_instance_carry_its_name():
    circuit = circuit_of(deck("V1 a 0 1", "X1 a b DIV", DIVIDER))
    assert circuit.parts["X1/R1"].nets == ("a", "b")
    assert circuit.parts["X1/R3"].nets == ("X1/inner", "0")


def test_two_levels_join_their_names_with_slashes():
    outer = [".subckt PAIR p q", "X1 p m DIV", "X2 m q DIV r=1k", ".ends"]
    circuit = circuit_of(deck("V1 a 0 1", "X9 a b PAIR", DIVIDER, outer))
    assert circuit.parts["X9/X2/R1"].nets == ("X9/m", "b")
    assert circuit.parts["X9/X2/R1"].value == 1000.0


def test_parts_keep_the_order_of_the_netlist():
    circuit = circuit_of(deck("R9 a 0 1", "X1 a b DIV", "R8 b 0 1", DIVIDER))
    assert list(circuit.parts) == ["R9", "X1/R1", "X1/R2", "X1/C1", "X1/R3", "R8"]


@pytest.mark.parametrize(
    ("call", "default", "outer", "expected"),
    [("r=1k", "r=2k", "r=3k", 1e3), ("", "r=2k", "r=3k", 2e3), ("", "", "r=3k", 3e3)],
)
def test_call_beats_default_beats_surrounding_parameter(call, default, outer, expected):
    text = deck(f".param {outer}", f"X1 a 0 BOX {call}", f".subckt BOX p q {default}", "R1 p q {r}", ".ends")
    assert circuit_of(text).parts["X1/R1"].value == expected


def test_parameters_may_stand_in_any_order():
    circuit = circuit_of(deck("R1 a 0 {c}", ".param c={b*2}", ".param b={a+1}", ".param a=4"))
    assert circuit.parts["R1"].value == 10.0


def test_default_of_the_same_name_reads_the_surrounding_parameter():
    text = deck(".param r=5k", "X1 a 0 BOX", ".subckt BOX p q r={r}", "R1 p q {r}", ".ends")
    assert circuit_of(text).parts["X1/R1"].value == 5000.0


def test_circle_of_parameters_is_named_and_leaves_the_part_in_place():
    circuit = circuit_of(deck("R1 a 0 {x}", ".param x={y}", ".param y={x}"))
    assert circuit.parts["R1"].value is None
    assert any("circle" in problem.what and "R1" in problem.what for problem in circuit.problems)


def test_value_that_cannot_be_computed_is_told_with_its_line():
    circuit = circuit_of(deck("R1 a 0 {nowhere}", "R2 a 0 1k"))
    (problem,) = circuit.problems
    assert circuit.parts["R1"].value is None
    assert "R1" in problem.what
    assert problem.location is not None
    assert problem.location.line == 2


def test_global_net_is_the_same_everywhere():
    text = deck(".global vdd", "V1 vdd 0 5", "X1 a BOX", ".subckt BOX p", "R1 vdd p 1k", ".ends")
    assert circuit_of(text).parts["X1/R1"].nets == ("vdd", "a")


def test_ground_and_zero_are_one_net_at_every_level():
    circuit = circuit_of(deck("R1 a gnd 1k", "R2 a 0 1k", "X1 a BOX", ".subckt BOX p", "R1 p GND 1k", ".ends"))
    assert {circuit.parts[name].nets[1] for name in ("R1", "R2", "X1/R1")} == {circuit.ground}


def test_first_spelling_of_a_net_stands_for_all():
    circuit = circuit_of(deck("R1 In 0 1k", "R2 IN 0 1k"))
    assert circuit.parts["R2"].nets[0] == "In"


def test_local_model_hides_the_outer_one():
    text = deck(
        ".model DX D(is=1e-14)", "D1 a 0 DX", "X1 a BOX", ".subckt BOX p", "D1 p 0 DX", ".model DX D(is=2e-9)", ".ends"
    )
    circuit = circuit_of(text)
    assert circuit.parts["D1"].model.params["is"] == 1e-14
    assert circuit.parts["X1/D1"].model.params["is"] == 2e-9


def test_model_takes_over_what_its_base_says():
    circuit = circuit_of(deck("D1 a 0 FAST", ".model SLOW D(is=1e-14 n=1.8)", ".model FAST ako:SLOW D(n=1.1)"))
    assert circuit.parts["D1"].model.params == {"is": 1e-14, "n": 1.1}


def test_undefined_model_is_told_and_the_part_kept():
    circuit = circuit_of(deck("D1 a 0 NOWHERE"))
    assert circuit.parts["D1"].model is None
    assert circuit.parts["D1"].part_name == "NOWHERE"
    assert [problem.kind for problem in circuit.problems] == ["model-undefined"]


def test_multiplier_of_an_instance_reaches_its_parts():
    circuit = circuit_of(deck("X1 a b DIV m=2", DIVIDER))
    assert circuit.parts["X1/R1"].value == 5000.0
    assert circuit.parts["X1/C1"].value == 2e-9


def test_definition_inside_a_definition_is_found_there_only():
    text = deck("X1 a OUTER", ".subckt OUTER p", ".subckt INNER q", "R1 q 0 7", ".ends", "X1 p INNER", ".ends")
    assert circuit_of(text).parts["X1/X1/R1"].value == 7.0


def test_controls_of_sources_follow_the_hierarchy():
    text = deck("X1 a b BOX", ".subckt BOX p q", "V1 p x 0", "F1 q 0 V1 2", "E1 q 0 x p 3", "R1 x 0 1", ".ends")
    parts = circuit_of(text).parts
    assert parts["X1/F1"].control == ("X1/V1",)
    assert parts["X1/E1"].control == ("X1/x", "a")


def test_expression_of_a_source_names_flat_nets_and_figures():
    text = deck("X1 a BOX k=3", ".subckt BOX p k=1", "B1 p 0 V={k*V(inner)}", "R1 inner 0 1", ".ends")
    part = circuit_of(text).parts["X1/B1"]
    assert part.expression == "(3.0)*V(X1/inner)"
    assert part.control == ("X1/inner",)


@pytest.mark.parametrize(
    ("lines", "kind", "line"),
    [
        (["R1 a 0 1k", "R1 b 0 1k"], "designator-twice", 3),
        (["X1 a b c DIV", *DIVIDER], "pin-count-differs", 2),
        ([".subckt LOOP a", "X1 a LOOP", ".ends", "X1 n LOOP"], "subcircuit-circle", 3),
    ],
)
def test_wrong_structure_is_an_error_with_its_line(lines, kind, line):
    with pytest.raises(NetlistError) as caught:
        circuit_of(deck(*lines))
    problem = next(each for each in caught.value.problems if each.kind == kind)
    assert problem.location is not None
    assert problem.location.line == line


def test_all_errors_of_a_netlist_are_told_at_once():
    with pytest.raises(NetlistError) as caught:
        circuit_of(deck("R1 a 0 1k", "R1 b 0 1k", "X1 a b c DIV", "R2 a 0 1", "R2 a 0 1", DIVIDER))
    assert [problem.kind for problem in caught.value.problems] == [
        "designator-twice",
        "pin-count-differs",
        "designator-twice",
    ]


def test_undefined_subcircuit_stays_as_a_part_and_is_told():
    circuit = circuit_of(deck("X1 a b NOPE", ".subckt NOPA p q", "R1 p q 1", ".ends"))
    assert circuit.parts["X1"].nets == ("a", "b")
    (problem,) = circuit.problems
    assert problem.kind == "subcircuit-undefined"
    assert problem.nearest == ("NOPA",)


def bomb(levels: int, width: int) -> str:
    lines = [".subckt L0 a", "R1 a 0 1", ".ends"]
    for level in range(1, levels + 1):
        lines += [f".subckt L{level} a", *(f"X{each} a L{level - 1}" for each in range(width)), ".ends"]
    return deck("X1 n L" + str(levels), *lines)


def test_bomb_of_ten_levels_is_refused_before_it_expands():
    with pytest.raises(NetlistError, match="elements_after_flattening"):
        circuit_of(bomb(10, 10))


def test_bound_on_elements_is_that_of_the_call():
    netlist = parse_netlist(bomb(2, 3))
    # 1 + 3 + 9 instances and 9 resistors.
    assert len(build_circuit(netlist, limits=Limits(elements_after_flattening=22)).parts) == 9
    with pytest.raises(NetlistError):
        build_circuit(netlist, limits=Limits(elements_after_flattening=21))


def test_bound_on_depth_is_that_of_the_call():
    netlist = parse_netlist(bomb(5, 1))
    assert build_circuit(netlist, limits=Limits(subcircuit_depth=6)).parts
    with pytest.raises(NetlistError, match="subcircuit_depth"):
        build_circuit(netlist, limits=Limits(subcircuit_depth=5))


NETS = st.sampled_from(["a", "b", "c", "d", "0"])
LINES = st.lists(
    st.one_of(
        st.tuples(st.sampled_from("RCL"), NETS, NETS, st.integers(1, 9999)).map(
            lambda each: (each[0], f"{each[1]} {each[2]} {each[3]}")
        ),
        st.tuples(NETS, NETS).map(lambda each: ("D", f"{each[0]} {each[1]} DX")),
        st.tuples(NETS, NETS, NETS, NETS).map(lambda each: ("G", f"{' '.join(each)} 1m")),
        st.tuples(NETS, NETS, NETS).map(lambda each: ("X", f"{' '.join(each)} OA")),
    ),
    min_size=1,
    max_size=12,
)


def shape(circuit, prefix=""):
    """Parts without the prefix of their instance."""

    def bare(name):
        return name.removeprefix(prefix)

    return [
        (bare(part.designator), part.kind, part.value, tuple((pin.name, bare(pin.net)) for pin in part.pins))
        + (tuple(bare(each) for each in part.control),)
        for part in circuit.parts.values()
    ]


@settings(max_examples=60, deadline=None)
@given(LINES)
def test_wrapped_circuit_has_the_parts_of_the_flat_one(elements):
    lines = [f"{letter}{index} {rest}" for index, (letter, rest) in enumerate(elements)]
    model = ".model DX D(is=1e-14)"
    flat = circuit_of(deck(lines, model, IDEAL))
    wrapped = circuit_of(deck("XW a b BOX", ".subckt BOX a b", lines, ".ends", model, IDEAL))
    assert shape(wrapped, "XW/") == shape(flat)
