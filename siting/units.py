"""Decisions about units, each made once."""

from siting.errors import InputError

METRES = {"metre": 1.0, "foot": 0.3048, "us_survey_foot": 1200.0 / 3937.0, "centimetre": 0.01, "millimetre": 0.001}
"""Metres in one unit of length; the two feet differ by 2 parts in a million."""

_NAMES = {
    "metre": ("m", "meter", "meters", "metre", "metres"),
    "foot": ("ft", "foot", "feet", "international foot"),
    "us_survey_foot": ("us survey foot", "us_survey_foot", "ftus", "us-ft", "foot_us", "us survey feet"),
    "centimetre": ("cm", "centimetre", "centimeter"),
    "millimetre": ("mm", "millimetre", "millimeter"),
}


def unit_from_text(text: str, where: str) -> str:
    """Return the name of a unit of length from the text of a file or setting; refuse unknown ones."""
    wanted = " ".join(text.strip().lower().split())
    for name, spellings in _NAMES.items():
        if wanted in spellings:
            return name
    msg = f"{where} is {text!r}, which is no unit of length known here; use one of {', '.join(METRES)}"
    raise InputError(msg)


def metres_per_unit(unit: str) -> float:
    """Return the metres in one unit of length, named as `unit_from_text` names it."""
    return METRES[unit]
