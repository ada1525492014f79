"""The fixed words of the trade that records carry; the values are what files hold."""

from enum import StrEnum


class Layup(StrEnum):
    """How the moulds lie when the concrete is placed."""

    BED = "bed"
    BENCH = "bench"


class Favour(StrEnum):
    """Whose face the kerf is kept off."""

    LOWER = "lower"
    UPPER = "upper"
    SHARE = "share"


class Half(StrEnum):
    """Which of the two volumes of one sweep."""

    LOWER = "lower"
    UPPER = "upper"


class Duty(StrEnum):
    """What a half is for."""

    MOULD = "mould"
    COUNTER_MOULD = "counter-mould"
    CRADLE = "cradle"
    FILLER = "filler"
    SURPLUS = "surplus"


class Closing(StrEnum):
    """How a panel's counter-mould is cut: its mould's upper half lifted, or a sweep of its own at even thickness."""

    BEST = "best"
    LIFT = "lift"
    OFFSET = "offset"


class Severity(StrEnum):
    """How much a finding matters; an error makes the command end with 1."""

    INFO = "info"
    WARNING = "warning"
    ERROR = "error"


class CutKind(StrEnum):
    """What a pass of the wire is for."""

    TRIM = "trim"
    THROUGH = "through"
    SWEEP = "sweep"
