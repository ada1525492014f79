"""The usual cautions; local codes and licensed practice come first."""

CAUTIONS = (
    ("Hot wire", "It burns at a touch and whips when it breaks. Guard it, wear eye protection, no hands near it."),
    ("Fumes", "Melted polystyrene gives off styrene. Extract at the wire and air the room; keep within local limits."),
    ("Fire", "No hot wire standing in or over foam; heater off when the feed stops. Extinguisher at hand, no flames."),
    (
        "Fresh blocks",
        "They vent pentane, which burns: air them before cutting, never store them in closed rooms or vans.",
    ),
    ("Electricity", "Isolated supply, extra-low voltage or a guarded wire. Have a licensed electrician look at it."),
    (
        "Lifting",
        "A whole block takes a cart or several people. Pieces marked 2 PERSONS are too heavy or too long for one.",
    ),
    (
        "Uplift",
        "Fresh concrete lifts a counter-mould with its full head. Hold it down by a restraint that was designed.",
    ),
)
DEFERENCE = (
    "These are reminders, not instructions. Local codes on machines, electricity, fire, lifting and formwork come"
    " first, and licensed people sign for loads."
)
