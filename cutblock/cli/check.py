"""`cutblock check`."""

import argparse
import json

from cutblock.cli.progress import terminal_progress


def run_check(chosen: argparse.Namespace) -> int:
    """Check a plan folder and print what disagrees.

    Returns:
        0 when all files agree with the plan, else 1.
    """
    from cutblock.flow.check import check_folder

    findings = check_folder(chosen.folder, terminal_progress())
    if chosen.json:
        rows = [{"severity": f.severity.value, "code": f.code, "subject": f.subject, "text": f.text} for f in findings]
        print(json.dumps({"folder": chosen.folder, "findings": rows}, indent=1))
        return 1 if findings else 0
    for finding in findings:
        print(f"{finding.subject}: {finding.text}")
    print(f"{len(findings)} disagreements found." if findings else "Every file agrees with the plan.")
    return 1 if findings else 0
