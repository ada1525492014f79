from cutblock.flow.toml_lines import key_lines, line_of

TEXT = '''\
a = 1
[form]
layup = "bed"  # [not.a.table]
[[form.face]]
name = "x = [1"
corners = [
  [0, 0, 0],
]
[[form.face]]
name = """
several = lines
"""
count = 2
[[foam.block]]
"quoted key" = 3
'''


def test_keys_and_tables_are_found_on_their_lines():
    lines = key_lines(TEXT)

    assert lines["a",] == 1
    assert lines["form", "layup"] == 3
    assert lines["form", "face", 0] == 4
    assert lines["form", "face", 0, "corners"] == 6
    assert lines["form", "face", 1, "count"] == 13
    assert lines["foam", "block", 0, "quoted key"] == 15
    assert ("several",) not in {path[-1:] for path in lines}


def test_an_unknown_path_falls_back_to_what_is_around_it():
    lines = key_lines(TEXT)

    assert line_of(lines, ("form", "face", 0, "corners", 2)) == 6
    assert line_of(lines, ("nothing",)) == 1
