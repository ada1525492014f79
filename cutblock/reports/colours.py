"""Colours and hatches of duties and parts of the ledger (Okabe and Ito's palette, told apart by hatch in grey)."""

from cutblock.records.words import Duty

SKY, ORANGE, GREEN, YELLOW, BLUE, VERMILION, PINK = (
    "#56B4E9",
    "#E69F00",
    "#009E73",
    "#F0E442",
    "#0072B2",
    "#D55E00",
    "#CC79A7",
)
PALE, GREY, WHITE = "#F4F4F4", "#BBBBBB", "#FFFFFF"

# What the upper half is for tells the billets of a block apart: the lower half is a mould.
DUTY_LOOK: dict[Duty, tuple[str, str]] = {
    Duty.MOULD: (SKY, ""),
    Duty.COUNTER_MOULD: (ORANGE, "/"),
    Duty.CRADLE: (GREEN, "\\"),
    Duty.FILLER: (PINK, "x"),
    Duty.SURPLUS: (YELLOW, "x"),  # a job has fillers or surplus halves, never both; dots are scrap
}

# (name of the ledger's part, label, colour, hatch) in the order of the bar: used first, then kept, then wasted.
LEDGER_LOOK = (
    ("mould", "Moulds", SKY, ""),
    ("counter_mould", "Counter-moulds", ORANGE, "/"),
    ("cradle", "Cradles", GREEN, "\\"),
    ("filler", "Fillers", PINK, "x"),
    ("offcut", "Offcuts kept", PALE, "/"),
    ("surplus", "Surplus halves", YELLOW, "x"),
    ("thickened", "Thickened backs", BLUE, "\\"),
    ("trim", "Skin trim", GREY, ""),
    ("kerf", "Kerf", VERMILION, ""),
    ("scrap", "Scrap", WHITE, "."),
)
