"""What the keys of a plan may hold, and the form that all of its tables have."""

from __future__ import annotations

from typing import Annotated, Final, Literal
from zoneinfo import ZoneInfo

from pydantic import AfterValidator, BaseModel, ConfigDict, Field
from pydantic_core import PydanticCustomError

Side = Literal["sea", "basin"]
SIDES: tuple[Side, Side] = ("sea", "basin")
TideRule = Literal["integral", "flow-mean", "cycle-mean"]
TIDE_RULES: tuple[TideRule, TideRule, TideRule] = ("integral", "flow-mean", "cycle-mean")

Finite = Annotated[float, Field(allow_inf_nan=False)]
Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]
NotNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]
Filled = Annotated[str, Field(pattern=r"\S")]

# Control characters, line breaks and signs that turn the direction of writing: a text with one of them breaks tables
# and messages, or shows another text than the one that is compared. In a form that every reader of a schema knows.
_UNPRINTABLE: Final = r"\u0000-\u001f\u007f-\u009f\u2028\u2029\u202a-\u202e\u2066-\u2069"

# A leading = or @ would make a live formula of a name in a spreadsheet; + and - begin fair names such as "-6 m".
NAME_PATTERN: Final = rf"^[^\s=@{_UNPRINTABLE}](?:[^{_UNPRINTABLE}]*[^\s{_UNPRINTABLE}])?$"
NAME_LENGTH: Final = 80
NAME_NEEDS: Final = 'one line of printable text: not blank, no blanks at its ends, no "=" or "@" in front'
"""The pattern in words, for messages."""
Name = Annotated[str, Field(pattern=NAME_PATTERN, max_length=NAME_LENGTH)]

SENTENCE_PATTERN: Final = rf"^[^{_UNPRINTABLE}]*[^\s{_UNPRINTABLE}][^{_UNPRINTABLE}]*$"
Sentence = Annotated[str, Field(pattern=SENTENCE_PATTERN, max_length=500)]

OFFSET_PATTERN: Final = r"^[+-](?:(?:0[0-9]|1[0-3]):[0-5][0-9]|14:00)$"
TIME_FORMAT_PATTERN: Final = r"^(?:iso|excel)$|%"


def _known_zone(name: str) -> str:
    try:
        ZoneInfo(name)
    except (KeyError, ValueError, OSError):
        raise PydanticCustomError("time_zone", "is no time zone") from None
    return name


Offset = Annotated[str, Field(pattern=OFFSET_PATTERN)]
TimeZone = Annotated[Filled, AfterValidator(_known_zone)]

# Far beyond any true shift: ten years, a kilometre, an hour a day and half a day between places on one coast; what is
# larger is a slip of the pen.
ClockShift = Annotated[float, Field(ge=-315_576_000, le=315_576_000, allow_inf_nan=False)]
LevelShift = Annotated[float, Field(ge=-1000, le=1000, allow_inf_nan=False)]
ClockDrift = Annotated[float, Field(ge=-3600, le=3600, allow_inf_nan=False)]
SeaLag = Annotated[float, Field(ge=-43200, le=43200, allow_inf_nan=False)]

# Beyond what any place has shown, and well inside what a slip of the pen gives; the line under each key says what is
# in use.
Alpha = Annotated[float, Field(ge=0.5, le=10, allow_inf_nan=False)]
GrowthFactor = Annotated[float, Field(ge=0.05, le=20, allow_inf_nan=False)]
SlideSlope = Annotated[float, Field(ge=0.5, le=200, allow_inf_nan=False)]
HoleSlope = Annotated[float, Field(ge=0.5, le=100, allow_inf_nan=False)]
UpToFive = Annotated[float, Field(gt=0, le=5, allow_inf_nan=False)]


class PlanModel(BaseModel):
    """A table of the plan: closed and frozen. The loader reads it strictly, so that text never becomes a number."""

    model_config = ConfigDict(extra="forbid", frozen=True, populate_by_name=True, use_attribute_docstrings=True)
