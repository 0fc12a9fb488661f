"""Published numbers of books and application notes against what the tool computes; sources stand in the cases."""

import tomllib

import pytest
from handbook.casebook import FOLDER, all_checks, measured, read_cases

COMPUTED_WITHIN = 0.15  # percent: the computed column is printed to four digits


def _cases():
    for check in all_checks():
        if check.left_out:
            continue
        marks = [pytest.mark.xfail(strict=True, reason=check.defect)] if check.defect else []
        yield pytest.param(check, id=check.id, marks=marks)


@pytest.mark.parametrize("check", list(_cases()))
def test_figure_agrees_with_the_published_number(check):
    found = measured(check)
    expected = check.data["computed"]
    if isinstance(expected, str):
        assert found == expected
        return
    limit = check.data.get("within", check.case.data.get("within", COMPUTED_WITHIN)) / 100
    absolute = check.data.get("absolute", 0.0)
    assert found == pytest.approx(expected, rel=limit, abs=absolute)
    if "published" in check.data and not check.differs:
        tolerance = check.data.get("tolerance", check.case.data.get("tolerance", 0.1)) / 100
        rounding = check.data.get("within", check.case.data.get("within", COMPUTED_WITHIN)) / 100
        assert found == pytest.approx(check.data["published"], rel=tolerance + rounding, abs=absolute)


def test_each_case_names_its_source_and_how_it_was_got():
    documents = tomllib.loads((FOLDER / "sources.toml").read_text(encoding="utf-8"))["documents"]
    for case in read_cases():
        assert any(case.data["source"].startswith(key) for key in documents), case.id
        assert case.data["got"] in {"verified", "verified*", "memory", "own", "common practice"}, case.id


def test_no_case_is_listed_twice():
    names = [case.id for case in read_cases()]
    assert len(names) == len(set(names))


def test_print_and_computation_differ_only_where_a_reason_is_given():
    for check in all_checks():
        published, computed = check.data.get("published"), check.data["computed"]
        if isinstance(computed, str) or published is None:
            continue
        tolerance = check.data.get("tolerance", check.case.data.get("tolerance", 0.1)) / 100
        agrees = abs(abs(published) - abs(computed)) <= 1.02 * tolerance * abs(computed) + check.data.get(
            "absolute", 0.0
        )
        assert agrees or check.differs, check.id
