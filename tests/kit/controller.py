"""Run as a script: hands programs to the interpreter of a CNC controller and prints what it would do, a JSON for each.

Arguments: the folder the controller's packages are unpacked in, a parameter file that exists, the letters of the axes,
the programs. The interpreter works in inches, and in degrees for A B C; what is printed is in mm and mm/min.
"""

import json
import sys
from pathlib import Path

INCH_MM = 25.4
LETTERS = "XYZABCUVW"


class Canon:
    """Takes the interpreter's canonical calls; whatever is not a move is kept by name."""

    def __init__(self, parameters, axes):
        self.parameter_file = parameters
        self.places = [LETTERS.index(axis) for axis in axes]
        self.calls = []
        self.feed = 0.0
        self.state = None

    def get_axis_mask(self):
        return sum(1 << place for place in self.places)  # X lowest

    def get_external_length_units(self):
        return 1.0

    def get_external_angular_units(self):
        return 1.0

    def get_block_delete(self):
        return False

    def get_tool(self, pocket):
        return (-1, *(0.0,) * 12, 0)

    def check_abort(self):
        return False

    def next_line(self, state):
        # The state before the first line shows a stop that is none.
        if self.state is not None and state.stopping == 0:
            self.calls.append(["pause", state.spindle])
        self.state = state

    def set_feed_rate(self, feed):
        self.feed = feed * INCH_MM

    def straight_feed(self, *position):
        self._move("feed", position)

    def straight_traverse(self, *position):
        self._move("rapid", position)

    def _move(self, kind, position):
        values = [
            value if letter in "ABC" else value * INCH_MM for letter, value in zip(LETTERS, position, strict=True)
        ]
        others = [value for index, value in enumerate(values) if index not in self.places]
        modes = [self.state.spindle, self.state.feed_mode, self.state.path_mode, self.state.units]
        self.calls.append([kind, [values[index] for index in self.places], others, self.feed, modes])

    def __getattr__(self, name):
        if name.startswith("__"):
            raise AttributeError(name)
        return lambda *arguments: self.calls.append([name, [str(argument) for argument in arguments]])


def main():
    folder, parameters, axes, *programs = sys.argv[1:]
    sys.path.insert(0, str(Path(folder) / "usr/lib/python3/dist-packages"))
    import gcode  # type: ignore[import-not-found]

    for program in programs:
        canon = Canon(parameters, axes)
        result, line = gcode.parse(program, canon, "G21", "")
        error = gcode.strerror(result) if result > gcode.MIN_ERROR else ""
        has_ended = result == 1  # left by an end word
        told = {"error": error, "has_ended": has_ended, "line": line, "calls": canon.calls}
        sys.stdout.write(json.dumps(told) + "\n")


if __name__ == "__main__":
    main()
