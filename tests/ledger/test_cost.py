from dataclasses import replace

import pytest
from kit.sample import sample_block, sample_job

from cutblock.ledger.cost import count_cost
from cutblock.records.account import Hours

HOURS = Hours(cutting_s=5400.0, setup_s=1800.0, by_block_s=())


def test_foam_is_the_sum_of_the_prices_and_machine_time_the_hours():
    blocks = [sample_block(), replace(sample_block(), price=99.5)]

    cost = count_cost(sample_job(hour_rate=45.0), blocks, HOURS, 150.0)

    assert cost.foam == pytest.approx(249.5)
    assert cost.machine == pytest.approx(90.0)
    assert cost.total == pytest.approx(339.5)
    assert cost.foam_bound == 150.0
    assert cost.currency == "EUR"


def test_one_block_without_a_price_leaves_the_foam_unpriced():
    cost = count_cost(sample_job(), [sample_block(), replace(sample_block(), price=None)], HOURS, 150.0)

    assert (cost.foam, cost.machine, cost.total, cost.foam_bound) == (None, None, None, None)


def test_an_offcut_of_the_shop_costs_nothing_unless_it_has_a_price():
    offcut = replace(sample_block(), price=None, from_offcut=True)

    assert count_cost(sample_job(), [sample_block(), offcut], HOURS, None).foam == pytest.approx(150.0)
    assert count_cost(sample_job(), [replace(offcut, price=20.0)], HOURS, None).foam == pytest.approx(20.0)
