"""A machine unlike the shipped ones: other letters, other words, more words on a line, more digits."""

from cutblock.catalog import load

ODD = """\
title = "An odd one"
travel_mm = 6000
lift_mm = 1500
span_mm = 2800
near_gap_mm = 120
table_offset_mm = 250
table_height_mm = 80
speed_mm_s = 50
acceleration_mm_s2 = 150
air_speed_mm_s = 33
longest_wire_mm = 3900
setup_s = 300
turn_s = 200
axes = ["Z", "X", "C", "A"]
decimals = 5
header = ["%", "G21 G90", "G17 G40 G49", "G61", "M64 P1"]
footer = ["M65 P1", "M30", "%"]
heater_on = "M68 E0 Q{power}"
heater_off = "M67 E0 Q0"
"""


def odd_machine(folder):
    """Return the machine, read from a file written into `folder`."""
    path = folder / "odd.toml"
    path.write_text(ODD)
    return load.machine(str(path))
