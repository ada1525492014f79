"""Where every half is a mould, a billet loses nothing but the kerf."""

import json

import pytest


@pytest.mark.parametrize("name", ["tide-wall", "weir-baffles"])
def test_of_a_billet_whose_halves_are_both_moulds_only_the_kerf_is_lost(scenario_folder, name):
    plan = json.loads((scenario_folder(name) / "plan.json").read_text())

    assert plan["ledger"]["surplus_litres"] == 0.0
    assert {piece["duty"] for piece in plan["pieces"]} == {"mould"}
    billets = 0.0
    for sweep in plan["sweeps"]:
        size = sweep["length_mm"] * sweep["width_mm"] * sweep["height_mm"] * 1e-6
        assert sweep["lower_litres"] + sweep["upper_litres"] + sweep["kerf_litres"] == pytest.approx(size, rel=1e-8)
        billets += size
    # Beside the billets there is only skin, and the kerf of the cuts between them.
    ledger = plan["ledger"]
    beside = ledger["bought_litres"] - billets
    cuts_between = ledger["kerf_litres"] - sum(sweep["kerf_litres"] for sweep in plan["sweeps"])
    assert ledger["scrap_litres"] == ledger["offcut_litres"] == 0.0
    assert ledger["trim_litres"] + cuts_between == pytest.approx(beside, abs=1e-3)
