"""The usual cautions, shown where the work they are about is planned."""

CAUTIONS = (
    (
        "Hot wire",
        "It burns at a touch and whips when it breaks. Guard it, keep hands behind the part, wear eye protection.",
    ),
    (
        "Fumes",
        "Molten foam gives off styrene and other vapours. Extract them at the wire; stop when the extraction stops.",
    ),
    (
        "Fire",
        "Foam burns. Never leave a hot wire standing in it; keep an extinguisher at hand, and sparks away from blocks.",
    ),
    (
        "Electricity",
        "Switch the supply off and isolate it before touching the wire or its clamps. Keep water away.",
    ),
    ("Lifting", "Large blocks and moulds catch the wind and tip. Lift with enough hands or a hoist."),
    ("Uplift", "Fresh concrete lifts counter-moulds and floats foam. Hold them down; have the restraint designed."),
)
DEFERENCE = (
    "These are reminders, not instructions. Local rules, the makers' data sheets and a licensed person's judgement "
    "always come first."
)
UNCALIBRATED = (
    "Not calibrated: speeds follow from the foam's density alone and may be wrong by half. "
    "Make coupon cuts in your own foam before the first block."
)
CUTTING_CAUTIONS = CAUTIONS[:4]  # of work at the wire itself
