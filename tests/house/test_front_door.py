"""The public names: complete, few, sorted, and loaded on first use."""

import json
import subprocess
import sys
from importlib import import_module

import pytest

import ampwarden

ROOMS = ["text", "circuit", "topology", "analysis", "rulebook", "report"]


def loaded_by(code):
    """Return the modules that a fresh interpreter holds after running ``code``."""
    script = f"{code}\nimport sys, json\nprint(json.dumps(sorted(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return set(json.loads(done.stdout.splitlines()[-1]))


def test_front_door_is_complete_sorted_and_small():
    assert list(ampwarden.__all__) == sorted(ampwarden.__all__)
    assert len(ampwarden.__all__) <= 8
    assert all(getattr(ampwarden, name) is not None for name in ampwarden.__all__)
    assert set(ampwarden.__all__) <= set(dir(ampwarden))


def test_name_that_does_not_exist_is_an_attribute_error():
    with pytest.raises(AttributeError, match="reviews"):
        _ = ampwarden.reviews


@pytest.mark.parametrize("room", ROOMS)
def test_room_keeps_its_promise_of_names(room):
    module = import_module(f"ampwarden.{room}")
    assert list(module.__all__) == sorted(module.__all__)
    assert len(module.__all__) <= 8
    assert all(hasattr(module, name) for name in module.__all__)


def test_importing_the_package_loads_none_of_its_rooms():
    own = {name for name in loaded_by("import ampwarden") if name.startswith("ampwarden")}
    assert own == {"ampwarden", "ampwarden.version"}


@pytest.mark.parametrize("name", ["ampwarden.review", "ampwarden.pipeline.review"])
def test_review_is_a_function_however_it_is_reached(name):
    code = f"import ampwarden, ampwarden.pipeline; assert callable({name}), type({name})"
    subprocess.run([sys.executable, "-c", code], check=True)
