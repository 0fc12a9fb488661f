"""Shipped data and the lines of TOML keys."""

import pytest

from ampwarden.errors import IntentError, RulePackError
from ampwarden.resources import compiled, parse_toml


def test_each_key_knows_its_line_past_multi_line_text():
    document = parse_toml(
        "a = 1\n[x.y]\nk = { p = 1 }\n[[e]]\nn = '''\n[zz]\nk = 1\n'''\n[[e]]\nt = [1,\n2]\nu = 1\n", "f.toml"
    )
    assert document.line_of("x", "y", "k", "p") == 3
    assert document.line_of("e", 0, "n") == 5
    assert document.line_of("e", 1, "u") == 12
    assert document.line_of("e", 1, "absent") == 9
    assert ("zz", "k") not in document.lines


def test_broken_toml_names_file_line_and_column():
    with pytest.raises(RulePackError) as caught:
        parse_toml("a = 1\nb = = 2\n", "house.toml")
    assert str(caught.value).startswith("house.toml:2:5  not valid TOML")


def test_broken_intent_is_an_intent_error():
    with pytest.raises(IntentError):
        parse_toml("a = ", "review.toml", IntentError)


def test_compiled_knowledge_is_built_once_per_content(tmp_path, monkeypatch):
    monkeypatch.setenv("AMPWARDEN_CACHE", str(tmp_path))
    built = []

    def build():
        built.append(1)
        return {"n": len(built)}

    assert compiled("rules", [("a", b"1")], build) == {"n": 1}
    assert compiled("rules", [("a", b"1")], build) == {"n": 1}
    assert compiled("rules", [("a", b"2")], build) == {"n": 2}


def test_spoiled_cache_is_built_again(tmp_path, monkeypatch):
    monkeypatch.setenv("AMPWARDEN_CACHE", str(tmp_path))
    compiled("rules", [("a", b"1")], lambda: [1])
    for each in tmp_path.iterdir():
        each.write_bytes(b'{"key": "other", "data": [9]}')
    assert compiled("rules", [("a", b"1")], lambda: [2]) == [2]
