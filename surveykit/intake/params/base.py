"""What every parameter model shares: strictness, key metadata, plain text and fault sentences."""

from __future__ import annotations

import difflib
import re
import unicodedata
from collections import Counter
from collections.abc import Iterable, Mapping
from datetime import UTC, date, datetime
from typing import Annotated, Any, Self

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, model_validator
from pydantic_core import InitErrorDetails, PydanticCustomError, ValidationError

NAME_PATTERN = r"^[A-Za-z0-9][A-Za-z0-9_-]{0,63}$"
NAME_WRITE = "letters, digits, - and _, beginning with a letter or digit, at most 64"
_BIDI = re.compile("[\u202a-\u202e\u2066-\u2069]")

Loc = tuple[str | int, ...]
Fault = tuple[Loc, str]


def fault(text: str) -> PydanticCustomError:
    """Return the error whose sentence is `text` as it stands (braces are not a template)."""
    return PydanticCustomError("fault", "{text}", {"text": text})


def nearest(name: Any, known: Iterable[str]) -> str | None:
    """Return the known name that comes close to `name`, None if none does."""
    return next(iter(difflib.get_close_matches(str(name), known, 1, 0.6)), None)


def meant(name: Any, known: Iterable[str]) -> str:
    """Return the part of a sentence that asks for the known name close to `name`, "" if none is."""
    close = nearest(name, known)
    return f"did you mean {close}? " if close else ""


def twice(where: Loc, names: Iterable[str], what: str) -> list[Fault]:
    """Return the fault of a list that names something twice, if it does."""
    again = [name for name, count in Counter(names).items() if count > 1]
    return [(where, f"names {again[0]!r} twice; write each {what} once")] if again else []


class Strict(BaseModel):
    """Unknown keys are errors, nothing is converted, nothing can be changed afterwards.

    A key whose value is left empty counts as absent. `faults` of a subclass yields what one field
    cannot see alone; all of them are reported together.
    """

    model_config = ConfigDict(extra="forbid", frozen=True, strict=True, allow_inf_nan=False)

    def faults(self) -> Iterable[Fault]:
        """Yield (location below this model, sentence) for each fault between fields."""
        return ()

    @model_validator(mode="before")
    @classmethod
    def _drop_empty(cls, data: Any) -> Any:
        if not isinstance(data, Mapping):
            return data
        return {key: value for key, value in data.items()
                if value is not None or key not in cls.model_fields}

    @model_validator(mode="after")
    def _no_faults(self) -> Self:
        found = list(self.faults())
        if found:
            raise ValidationError.from_exception_data(type(self).__name__, [
                InitErrorDetails(type=fault(text), loc=loc, input=None) for loc, text in found])
        return self


def key(description: str, *, write: str = "", unit: str | None = None, whole: bool = False,
        **field: Any) -> Any:
    """Return a pydantic field: what the key means, and what to write when it is wrong.

    A number states its `unit` ("" where it has none); its limits then say what to write.
    """
    if unit is not None:
        limits = {name: field[name] for name in ("ge", "gt", "le", "lt") if name in field}
        write = number_words(unit, whole=whole, **limits)
    extra = {"write": write, **field.pop("extra", {})}
    return Field(description=description, json_schema_extra=extra, **field)


def number_words(unit: str, *, whole: bool = False, ge: float | None = None,
                 gt: float | None = None, le: float | None = None, lt: float | None = None) -> str:
    """Return what to write for a number with these limits.

    Examples
    --------
    >>> number_words("s", ge=0)
    'a number, 0 or more, in s'
    >>> number_words("1", gt=0, le=1)
    'a number above 0, at most 1'
    """
    words = "a whole number" if whole else "a number"
    if ge is not None and le is not None:
        words += f" from {ge:.12g} to {le:.12g}"
    else:
        parts = [f", {ge:.12g} or more" if ge is not None else "",
                 f" above {gt:.12g}" if gt is not None else "",
                 f", at most {le:.12g}" if le is not None else "",
                 f", below {lt:.12g}" if lt is not None else ""]
        words += "".join(parts)
    return words if unit in ("", "1") else f"{words}, in {unit}"


def since_epoch_ns(moment: datetime) -> int:
    """Return a time with its offset as ns since 1970 UTC, to the microsecond."""
    step = moment - datetime(1970, 1, 1, tzinfo=UTC)
    return ((step.days * 86400 + step.seconds) * 1_000_000 + step.microseconds) * 1000


def _plain_text(text: str) -> str:
    if any(unicodedata.category(c) in ("Cc", "Cs", "Zl", "Zp") for c in text):
        raise fault(f"got {text[:40]!r}; write plain text on one line, without control characters")
    if _BIDI.search(text):
        raise fault(f"got {text[:40]!r}; write plain text without direction-changing characters")
    if not text.strip():
        raise fault(f"got {text!r}; write some text")
    return text


def _notes(text: str) -> str:
    return "\n".join(_plain_text(line.rstrip()) for line in text.splitlines() if line.strip())


def _date(text: str) -> str:
    try:
        if not re.fullmatch(r"\d{4}-\d\d-\d\d", text, re.ASCII):
            raise ValueError
        year = date.fromisoformat(text).year
    except ValueError:
        raise fault(f'got {text[:40]!r}; write a date as "YYYY-MM-DD", in quotes') from None
    if not 1950 <= year <= 2199:
        raise fault(f"got {text!r}; write a date from 1950 to 2199")
    return text


Text = Annotated[str, Field(max_length=120), AfterValidator(_plain_text)]
Initials = Annotated[str, Field(max_length=12), AfterValidator(_plain_text)]
Notes = Annotated[str, Field(max_length=2000), AfterValidator(_notes)]
Name = Annotated[str, Field(pattern=NAME_PATTERN)]
DateText = Annotated[str, Field(json_schema_extra={"format": "date"}), AfterValidator(_date)]
TEXT_WRITE = "plain text, up to 120 characters"
DATE_WRITE = 'a date as "YYYY-MM-DD", in quotes'
