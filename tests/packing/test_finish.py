"""What is best done with the billets of one block."""

from hypothesis import given, settings
from hypothesis import strategies as st

from cutblock.packing.finish import best_of, lay, subtask, ways_to_cut
from cutblock.packing.lattice import make_task
from cutblock.packing.packer import pack_task
from cutblock.packing.tree import Part, all_parts, cut_off

NO_OFFCUT = 10**9


def keeps(least):
    return lambda part, skin: min(part.size) >= least


def two_ways():
    """Return a task and two trees: the rest as one slab, and the same rest in two."""
    task = make_task([(500.0, 500.0, 300.0)], [(1000.0, 500.0, 300.0, None, None)], 0.0, 0.0, True)
    whole = Part((0, 0, 0), (100_000, 50_000, 30_000))
    cut_off(whole, 0, 50_000, 0)
    split = Part((0, 0, 0), (100_000, 50_000, 30_000))
    cut_off(split, 0, 75_000, 0)
    cut_off(split.low, 0, 50_000, 0)
    whole.low.billet = split.low.low.billet = 0
    return task, whole, split


def test_less_scrap_comes_first():
    task, whole, split = two_ways()
    one, two = (lay(task, 0, tree, keeps(30_000)) for tree in (whole, split))

    assert one.rank[0] == 0
    assert two.rank[0] == 2 * 25_000 * 50_000 * 30_000
    assert best_of([two, one], None) is one


def test_of_equal_scrap_the_largest_offcut_comes_first_then_the_least_cut_area():
    task, whole, split = two_ways()
    one, two = (lay(task, 0, tree, keeps(10_000)) for tree in (whole, split))
    assert (one.rank[0], two.rank[0]) == (0, 0)
    assert best_of([two, one], None) is one

    none = [lay(task, 0, tree, keeps(NO_OFFCUT)) for tree in (whole, split)]
    assert none[0].rank[:2] == none[1].rank[:2]
    assert none[0].rank[2] < none[1].rank[2]


def test_a_limit_on_set_ups_comes_before_all():
    task, whole, split = two_ways()
    cheap, dear = lay(task, 0, whole, keeps(10_000)), lay(task, 0, split, keeps(10_000))
    quick = type(dear)(0, dear.tree, dear.passes, (*dear.rank[:3], 1))
    slow = type(cheap)(0, cheap.tree, cheap.passes, (*cheap.rank[:3], 4))

    assert best_of([slow, quick], None) is slow
    assert best_of([slow, quick], 3) is quick
    assert best_of([slow], 3) is slow


@given(
    sizes=st.lists(st.tuples(*[st.sampled_from([150.0, 240.0, 410.0])] * 3), min_size=1, max_size=8),
    skin=st.sampled_from([0.0, 10.0]),
)
@settings(deadline=None)
def test_every_way_to_cut_a_block_holds_the_same_billets_and_the_best_is_no_worse_than_the_packers(sizes, skin):
    task = make_task(sizes, [(1300.0, 900.0, 850.0, None, None)], 1.0, skin, True)
    packing = pack_task(task, 0, 0, None, lambda *_: None)
    members = [row.billet for row in packing.placements if row.block == 0]

    found = list(ways_to_cut(task, members, [0], 72, keeps(10_000)))

    assert all(sorted(laid.billets) == members for laid in found)
    first = lay(task, 0, packing.trees[0], keeps(10_000))
    assert best_of([first, *found], None).rank <= first.rank
    for laid in found:
        leaves = [part for part in all_parts(laid.tree) if part.axis < 0]
        assert all(part.size[axis] > 0 for part in leaves for axis in range(3))


def test_a_subtask_keeps_names_and_locks_of_its_billets():
    task = make_task(
        [(100.0, 50.0, 20.0), (60.0, 80.0, 20.0), (90.0, 30.0, 20.0)], [(500.0, 500.0, 500.0, 2, 9.0)], 1.0, 0.0,
        [True, False, True], ("a", "b", "c"),
    )  # fmt: skip

    small = subtask(task, [2, 1])

    assert small.billet_names == ("c", "b")
    assert small.may_turn.tolist() == [True, False]
    assert small.cells.tolist() == task.cells[[2, 1]].tolist()
    assert small.counts.tolist() == [2]


def test_billets_no_block_holds_together_have_no_way():
    task = make_task([(800.0, 800.0, 800.0)] * 2, [(1000.0, 1000.0, 1000.0, None, None)], 1.0, 0.0, True)

    assert list(ways_to_cut(task, [0, 1], [0], 72, keeps(10_000))) == []
