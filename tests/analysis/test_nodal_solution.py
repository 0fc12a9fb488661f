"""The operating point of linear circuits against exact arithmetic: sympy solves the same circuits from first principles."""

import random

import pytest
import sympy
from analysis.benches import bench_of


def random_circuit(seed):
    """Return netlist lines and elements of a random linear circuit; a chain of resistors keeps every net tied to ground."""
    rng = random.Random(seed)
    nets = rng.randint(3, 6)
    elements = [("R", f"RG{net}", net, net - 1, rng.randint(1, 900)) for net in range(1, nets + 1)]
    for number in range(rng.randint(2, 6)):
        one, two = rng.sample(range(nets + 1), 2)
        elements.append(("R", f"R{number}", one, two, rng.randint(1, 9000)))
    elements.append(("V", "V1", 1, 0, rng.randint(-12, 12)))
    for number in range(rng.randint(0, 2)):
        one, two = rng.sample(range(nets + 1), 2)
        elements.append(("I", f"I{number}", one, two, sympy.Rational(rng.randint(-50, 50), 1000)))
    if nets >= 4:
        elements.append(("E", "E1", nets, 0, 2, 3, rng.randint(-4, 4)))
    one, two, plus, minus = (rng.randint(0, nets) for _ in range(4))
    if one != two:
        elements.append(("G", "G1", one, two, plus, minus, sympy.Rational(rng.randint(-20, 20), 1000)))
    return nets, elements


def exact_voltages(nets, elements):
    """Solve by Kirchhoff's laws in rational numbers; None when there is no single solution."""
    volts = [sympy.Integer(0), *sympy.symbols(f"v1:{nets + 1}")]
    leaving = [sympy.Integer(0)] * (nets + 1)
    equations, unknowns = [], list(volts[1:])
    for kind, name, one, two, *rest in elements:
        if kind == "R":
            current = (volts[one] - volts[two]) / rest[0]
        elif kind == "I":
            current = rest[0]
        elif kind == "G":
            current = rest[2] * (volts[rest[0]] - volts[rest[1]])
        else:
            current = sympy.Symbol(f"i_{name}")
            unknowns.append(current)
            drop = rest[0] if kind == "V" else rest[2] * (volts[rest[0]] - volts[rest[1]])
            equations.append(volts[one] - volts[two] - drop)
        leaving[one] += current
        leaving[two] -= current
    equations += leaving[1:]
    matrix, right = sympy.linear_eq_to_matrix(equations, unknowns)
    if matrix.det() == 0:
        return None
    solved = matrix.LUsolve(right)
    return [solved[index] for index in range(nets)]


def text_of(elements):
    return "\n".join(
        " ".join([name, *(f"n{net}" if net else "0" for net in ends), f"{float(value)!r}"])
        for _, name, *ends, value in elements
    )


@pytest.mark.parametrize("block", range(20))
def test_node_voltages_agree_with_exact_arithmetic(block):
    solved = 0
    for seed in range(10 * block, 10 * block + 10):
        nets, elements = random_circuit(seed)
        exact = exact_voltages(nets, elements)
        if exact is None:
            continue
        solved += 1
        solution = bench_of(text_of(elements)).solution
        scale = max(abs(float(each)) for each in exact) or 1.0
        for net, value in enumerate(exact, 1):
            assert solution.voltage(f"n{net}") == pytest.approx(float(value), rel=1e-9, abs=1e-9 * scale), (seed, net)
    assert solved >= 8


def test_currents_into_every_net_of_a_solved_circuit_add_up_to_nothing():
    solution = bench_of("V1 a 0 5\nR1 a b 1k\nR2 b 0 2k\nR3 b c 3k\nI1 0 c 1m\n").solution
    v = solution.voltage
    # Kirchhoff's current law at b and c
    assert (v("b") - v("a")) / 1e3 + v("b") / 2e3 + (v("b") - v("c")) / 3e3 == pytest.approx(0, abs=1e-12)
    assert (v("c") - v("b")) / 3e3 - 1e-3 == pytest.approx(0, abs=1e-12)


def test_large_circuit_is_solved_as_the_small_one_is():
    # a ladder of equal resistors: with n sections of series r and shunt r the far end falls by Fibonacci numbers
    count = 120
    rows = ["V1 a0 0 1"]
    for number in range(count):
        rows += [f"RS{number} a{number} a{number + 1} 1k", f"RP{number} a{number + 1} 0 1k"]
    solution = bench_of("\n".join(rows)).solution
    fibonacci = [1, 1]
    while len(fibonacci) < 2 * count + 2:
        fibonacci.append(fibonacci[-1] + fibonacci[-2])
    for section in (1, 2, 5, 10):
        expected = fibonacci[2 * (count - section)] / fibonacci[2 * count]
        assert solution.voltage(f"a{section}") == pytest.approx(expected, rel=1e-9)


def test_loop_of_ideal_sources_has_no_solution_and_is_said_to_have_none():
    bench = bench_of("V1 a 0 1\nV2 a 0 2\nR1 a b 1k\nR2 b 0 1k\nX1 b out out OA\n")
    assert "no single solution" in str(bench.volts("b"))
