"""The usual cautions; local codes and licensed practice come first."""

CAUTIONS = (
    "Hot wire: it burns and, when it breaks, whips. Guards and eye protection; no hands near it under power.",
    "Fumes: melted polystyrene gives off styrene. Extract at the wire and air the room; keep within local limits.",
    "Fire: no hot wire standing in or over foam, heater off when the feed stops. Extinguisher at hand, no flames.",
    "Fresh blocks vent pentane: let them air before cutting and do not store them in closed rooms or vans.",
    "Electricity: isolated supply, extra-low voltage or guarded wire; have a licensed electrician look at it.",
    "Lifting: a whole block takes a cart or several people; pieces marked 2 PERSONS are too heavy or too long for one.",
    "Uplift: in a closed pour a counter-mould floats with the full head of concrete; clamp or ballast it as designed.",
    "Local codes on machines, electricity, fire, lifting and formwork come first; licensed people sign for loads.",
)
