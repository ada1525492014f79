"""`cutblock wire`."""

import argparse
import json


def run_wire(chosen: argparse.Namespace) -> int:
    """Print kerf, speed window, currents and warnings of a wire in foam.

    Returns:
        0.
    """
    from cutblock.flow.wire import wire_report, wire_report_values

    report = wire_report(chosen.density, chosen.power, chosen.diameter, chosen.speed)
    values = wire_report_values(report)
    if chosen.json:
        print(json.dumps(values, indent=1))
        return 0
    return 0
