from cutblock.base.progress import part_of


def test_a_part_fills_its_share_of_the_whole():
    seen = []

    report = part_of(part_of(lambda fraction, text: seen.append((fraction, text)), 0.5, 1.0), 0.0, 0.5)
    report(0.0, "a")
    report(1.0, "b")

    assert seen == [(0.5, "a"), (0.75, "b")]
