"""Numbers with an uncertainty: {value, u}, or a bare number where the default u is stated."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler, ValidationInfo
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema, core_schema

from surveykit.intake.params.base import Fault, Strict, fault, key, number_words
from surveykit.intake.params.settings import Settings


class Uncertain(Strict):
    """A number and its standard uncertainty, in one unit."""

    value: float = key("The value.", write="a number")
    u: float = key("Its standard uncertainty (k = 1), same unit.", ge=0,
                   write="the standard uncertainty, a number, 0 or more")


class Amount(Strict):
    """A number whose u may stand beside it under a short key (u_s, u_gain, u_offset, u)."""

    value: float = key("The value.", write="a number")
    u: float | None = key("Its standard uncertainty (k = 1).", default=None, ge=0,
                          write="the standard uncertainty, a number, 0 or more")


def setting_value(info: ValidationInfo | None, path: str) -> float:
    """Return the setting `section.name` of the campaign being read, else the method's default."""
    settings = (info.context or {}).get("settings") if info else None
    section, name = path.split(".")
    return float(getattr(getattr(settings or Settings(), section), name))


@dataclass(frozen=True)
class BareNumber:
    """Annotation: a bare number stands for {value: number}, its u from `setting` if named."""

    setting: str | None = None
    low: float = -1e300
    high: float = 1e300
    unit: str = ""

    def __get_pydantic_core_schema__(
            self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Wrap the model's own validation."""
        wrapped = core_schema.with_info_before_validator_function(self._wrap, handler(source))
        return core_schema.no_info_after_validator_function(self._within, wrapped)

    def __get_pydantic_json_schema__(
            self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> JsonSchemaValue:
        """State both spellings."""
        number: JsonSchemaValue = {"type": "number"}
        if self.low > -1e300:
            number["minimum"] = self.low
        if self.high < 1e300:
            number["maximum"] = self.high
        if self.setting:
            number["description"] = (f"u is then settings.{self.setting} "
                                     f"(default {setting_value(None, self.setting):g})")
        return {"anyOf": [number, handler(schema)]}

    def _wrap(self, data: Any, info: ValidationInfo) -> Any:
        if isinstance(data, Uncertain | Amount | Mapping):
            return data
        return {"value": data} | (
            {"u": setting_value(info, self.setting)} if self.setting else {})

    def _within(self, amount: Any) -> Any:
        if not self.low <= amount.value <= self.high:
            write = number_words(self.unit, ge=self.low, le=self.high)
            raise fault(f"got {amount.value:g}; write {write}")
        return amount


@dataclass(frozen=True)
class FromSettings:
    """Annotation: an absent number is taken from the setting of this name."""

    setting: str

    def __get_pydantic_core_schema__(
            self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Wrap the number's own validation."""
        return core_schema.with_info_before_validator_function(
            lambda data, info: setting_value(info, self.setting) if data is None else data,
            handler(source))


def given_once(name: str, amount: Amount | None, short: str, u: float | None) -> list[Fault]:
    """Return the fault of a u given both as {value, u} and under its short key, if it is."""
    if amount is None or amount.u is None or u is None:
        return []
    return [((short,), f"got {u:g}, and {name} gives u {amount.u:g} as well; write the "
             f"uncertainty once: {name} as {{value, u}}, or {short}")]


def whole(amount: Amount, short_u: float | None) -> Uncertain:
    """Return a number with its u, whether that was written with it or under its short key."""
    u = short_u if amount.u is None else amount.u
    return Uncertain(value=amount.value, u=u or 0.0)
