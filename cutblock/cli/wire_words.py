"""The words of `cutblock wire` and `cutblock coupons`."""

import argparse


def add_wire_words(wire: argparse.ArgumentParser) -> None:
    """Add the words of `cutblock wire`."""
    wire.add_argument("--density", type=float, metavar="KG_M3", help="density of the foam, kg/m3")
    wire.add_argument("--mass", type=float, metavar="KG", help="instead of the density: the block as weighed, kg")
    wire.add_argument("--size", type=float, nargs=3, metavar=("L", "W", "H"), help="and its sides, mm")
    wire.add_argument("--power", type=float, required=True, metavar="W_M", help="electric power, W per metre of wire")
    wire.add_argument("--diameter", type=float, metavar="MM", help="diameter of the wire, mm (NiCr80)")
    wire.add_argument("--wire", metavar="NAME", help="instead of the diameter: a wire of the catalogue")
    wire.add_argument(
        "--calibration", metavar="NAME", help="kerf and speeds by these test cuts: a stored name or a TOML file"
    )
    wire.add_argument(
        "--speed", type=float, metavar="MM_S", help="wire-normal speed, mm/s; without it the planned speed"
    )
    wire.add_argument("--machine", metavar="NAME", help="machine whose span the wire has (without it 2 m)")
    wire.add_argument("--length", type=float, metavar="MM", help="length of the heated wire, mm")
    wire.add_argument("--tension", type=float, metavar="N", help="its tension, N; without it the most it bears hot")
    wire.add_argument("--json", action="store_true", help="print the numbers as JSON")


def add_coupon_words(coupons: argparse.ArgumentParser) -> None:
    """Add the words of `cutblock coupons plan` and `cutblock coupons fit`."""
    steps = coupons.add_subparsers(dest="step", metavar="STEP", required=True)
    plan = steps.add_parser(
        "plan",
        help="propose the test cuts and write the sheet to fill in",
        description="Propose 11 test cuts and one that finds where the wire begins to touch.",
    )
    plan.add_argument("--wire", required=True, metavar="NAME", help="a wire of the catalogue")
    plan.add_argument("--machine", required=True, metavar="NAME", help="a machine of the catalogue, or a TOML file")
    foam = plan.add_mutually_exclusive_group(required=True)
    foam.add_argument("--density", type=float, metavar="KG_M3", help="density of the foam, kg/m3")
    foam.add_argument("--grade", metavar="NAME", help="foam grade of the catalogue")
    plan.add_argument("--other", type=float, metavar="KG_M3", help="density of the one coupon of other foam")
    plan.add_argument("--power", type=float, default=60.0, metavar="W_M", help="power of the work, W/m (60)")
    plan.add_argument("--out", metavar="DIR", help="write coupons.csv and coupons.html there; without it only print")
    plan.add_argument("--json", action="store_true", help="print the cuts as JSON")

    fit = steps.add_parser(
        "fit",
        help="fit the kerf law to the filled sheet",
        description="Fit w0, H and q0 to test cuts, say how sure they are, and store them under a name for jobs.",
    )
    fit.add_argument("file", metavar="FILE", help="the sheet, a CSV file")
    fit.add_argument("--name", metavar="NAME", help="store the calibration under this name")
    fit.add_argument("--out", metavar="DIR", help="store it and its picture there, not among your own calibrations")
    fit.add_argument("--wire", metavar="NAME", help="wire of the cuts, where the file does not say")
    fit.add_argument("--machine", metavar="NAME", help="machine of the cuts, where the file does not say")
    fit.add_argument("--grade", metavar="NAME", help="foam grade of the cuts, where the file does not say")
    fit.add_argument("--date", metavar="DAY", help="day of the cuts, 2026-03-02; else the file's last, else today")
    fit.add_argument("--json", action="store_true", help="print the fit as JSON")
