"""Boards drawn as an expert would raise no error and no warning; broken in one place, each is found and named."""

import pytest
from boards.board_files import breaks, good_boards, intent_text

from ampwarden.pipeline import review_text
from ampwarden.rulebook import load_pack
from ampwarden.text import parse_intent

RULES = {rule.name for rule in load_pack().rules}


def _review(text, board):
    return review_text(text, parse_intent(intent_text(board)), name=board.name)


@pytest.mark.parametrize("board", good_boards(), ids=lambda board: board.stem)
def test_good_board_raises_no_error_and_no_warning(board):
    reviewed = _review(board.read_text(encoding="utf-8"), board)
    assert reviewed.error == ()
    raised = [(finding.rule, finding.message) for finding in reviewed.findings if finding.level in {"error", "warning"}]
    assert raised == []


@pytest.mark.parametrize("broken", breaks(), ids=lambda broken: broken.id)
def test_broken_board_is_found_and_named(broken):
    known = [rule for rule in broken.rules if rule in RULES]
    if not known:
        pytest.skip(f"no rule {' or '.join(broken.rules)} in the pack")
    reviewed = _review(broken.text(), broken.board)
    assert reviewed.error == ()
    assert {finding.rule for finding in reviewed.findings} & set(known)


def test_each_board_has_three_ways_to_break_it():
    counts = {board.stem: sum(each.board == board for each in breaks()) for board in good_boards()}
    assert set(counts.values()) == {3}
    assert len(counts) >= 30
