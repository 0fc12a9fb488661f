"""The samples as a reader of the README meets them: sound sheets stay silent, each spoiled sheet is named for its defect."""

from pathlib import Path

import pytest

from ampwarden.pipeline import find_netlists, review

SAMPLES = Path(__file__).parents[2] / "samples"

SOUND = (
    "antialias-filter.cir",
    "battery-monitor.cir",
    "hydrophone-preamp.cir",
    "pressure-bridge.cir",
    "water-temperature.cir",
    "wave-peak-hold.cir",
)

# sheet -> (rule, a part or net that the finding must name)
SPOILED = {
    "conductivity-cell.cir": ("follower-gain-below-one", {"R1", "R2"}),
    "converter-limiter.sp": ("output-near-rail", {"U3A", "U3"}),
    "echo-restorer.cir": ("input-unbiased", {"XU4", "XU4A", "ECHO"}),
    "level-scaler.net": ("output-near-rail", {"U6", "U6B"}),
    "logger-front-end.net": ("supply-decoupling-missing", {"-5VA"}),
    "solar-shunt.cir": ("difference-ratio-mismatch", {"R1", "R2", "R3", "R4"}),
}

# what the designer of each sheet would call its stages
TOPOLOGIES = {
    "antialias-filter.cir": ["sallen-key-low-pass", "sallen-key-low-pass"],
    "battery-monitor.cir": ["schmitt-trigger", "schmitt-trigger"],
    "conductivity-cell.cir": ["voltage-follower", "inverting-amplifier"],
    "converter-limiter.sp": ["inverting-amplifier", "virtual-ground"],
    "echo-restorer.cir": ["non-inverting-amplifier", "clamper"],
    "hydrophone-preamp.cir": ["non-inverting-amplifier", "sallen-key-low-pass"],
    "level-scaler.net": ["voltage-follower", "non-inverting-amplifier"],
    "pressure-bridge.cir": ["instrumentation-amplifier", "non-inverting-amplifier"],
    "solar-shunt.cir": ["difference-amplifier", "non-inverting-amplifier"],
    "water-temperature.cir": ["virtual-ground", "non-inverting-amplifier", "non-inverting-amplifier"],
    "wave-peak-hold.cir": ["peak-detector"],
}


@pytest.fixture(scope="module")
def reviewed():
    return {Path(each.path).name: each for each in review(SAMPLES).netlists}


def test_every_sample_is_read(reviewed):
    assert len(reviewed) == len(find_netlists(SAMPLES)) >= 8
    assert [name for name, each in reviewed.items() if each.error] == []


@pytest.mark.parametrize("name", SOUND)
def test_sound_sheet_raises_no_error_and_no_warning(reviewed, name):
    raised = [
        (each.rule, each.message)
        for each in reviewed[name].findings
        if each.level in {"error", "warning"} and not each.waived
    ]
    assert raised == []


@pytest.mark.parametrize("name", sorted(SPOILED))
def test_spoiled_sheet_is_named_for_its_defect(reviewed, name):
    rule, named = SPOILED[name]
    found = [each for each in reviewed[name].findings if each.rule == rule]
    assert found, [each.rule for each in reviewed[name].findings]
    assert any(named & {*each.parts, *each.nets, each.stage} for each in found)
    assert all(each.remedy and each.remedy.text for each in found)


@pytest.mark.parametrize("name", sorted(SPOILED))
def test_spoiled_sheet_raises_nothing_but_its_own_defect(reviewed, name):
    rule, _ = SPOILED[name]
    others = [
        (each.rule, each.message)
        for each in reviewed[name].findings
        if each.level in {"error", "warning"} and each.rule != rule
    ]
    assert others == []


@pytest.mark.parametrize("name", sorted(TOPOLOGIES))
def test_stages_are_called_what_their_designer_would_call_them(reviewed, name):
    assert sorted(each.topology for each in reviewed[name].stages) == sorted(TOPOLOGIES[name])


def test_limiter_that_clips_on_purpose_is_waived(reviewed):
    found = [each for each in reviewed["converter-limiter.sp"].findings if each.rule == "output-near-rail"]
    assert found
    assert all(each.waived for each in found)


def test_the_samples_show_each_core_rule(reviewed):
    shown = {each.rule for netlist in reviewed.values() for each in netlist.findings}
    assert shown >= {
        "supply-decoupling-missing",
        "input-unbiased",
        "follower-gain-below-one",
        "output-near-rail",
        "difference-ratio-mismatch",
    }
