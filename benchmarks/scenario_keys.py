"""What every section of a scenario has in common: known keys, keys that are not available, quantities, rules.

All complaints carry the section they came from; `complaint` turns pydantic's record of one into a line for a person.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, ClassVar, NoReturn

from pydantic import BaseModel, BeforeValidator, ConfigDict, ValidationError, model_validator
from pydantic_core import ErrorDetails, PydanticCustomError

from benchmarks.errors import closest, listed, shown
from benchmarks.quantities import QuantityError, parse_quantity, text_of

UNAVAILABLE = "not available in this version"


def complain(text: str) -> PydanticCustomError:
    """The exception a validator of one value raises: "must be ..., got ..."."""
    return PydanticCustomError("rule", "{text}", {"text": text})


def fail(key: str, text: str) -> NoReturn:
    """Complain about `key` of the section whose validator calls this: "must not be below start, got ..."."""
    raise PydanticCustomError("rule", "{text}", {"key": key, "text": text})


class Section(BaseModel):
    """A table of the scenario file. Unknown keys are refused, with the closest one that exists.

    unavailable: keys that belong to parts this version does not have; refused by name, never ignored.
    """

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)
    unavailable: ClassVar[tuple[str, ...]] = ()

    @model_validator(mode="before")
    @classmethod
    def _known_keys_only(cls, table: Any) -> Any:
        if not isinstance(table, dict):
            return table
        for key in table:
            if key in cls.unavailable:
                fail(key, UNAVAILABLE)
            if key not in cls.model_fields:
                hint = closest(key, cls.model_fields)
                fail(key, f"unknown key{hint or '; known are ' + listed(cls.model_fields)}")
        return table

    def given(self, key: str) -> bool:
        """Whether the key stood in the file (rather than taking its default)."""
        return key in self.model_fields_set


def quantity(unit: str, above: float | None = None, low: float | None = None, high: float | None = None) -> BeforeValidator:
    """Text with a unit to a float in `unit`; `above` exclusive, `low` and `high` inclusive limits in that unit."""

    def convert(value: object) -> float:
        try:
            number = parse_quantity(value, unit)
        except QuantityError as error:
            raise complain(str(error)) from error
        limits = []
        if above is not None and number <= above:
            limits.append(f"must be above {text_of(above, unit)}")
        if low is not None and number < low:
            limits.append(f"must not be below {text_of(low, unit)}")
        if high is not None and number > high:
            limits.append(f"must not be above {text_of(high, unit)}")
        if limits:
            raise complain(f"{limits[0]}, got {shown(value)}")
        return number

    return BeforeValidator(convert)


def one_of(names: tuple[str, ...], unavailable: tuple[str, ...] = ()) -> BeforeValidator:
    """Text that must be one of `names`; those in `unavailable` are refused as such."""

    def check(value: object) -> object:
        if value in unavailable:
            raise complain(f"{shown(value)} is {UNAVAILABLE}; available: {listed(names)}")
        if value not in names:
            hint = closest(value, names) if isinstance(value, str) else ""
            raise complain(f"must be one of {listed(names)}, got {shown(value)}{hint}")
        return value

    return BeforeValidator(check)


Time = Annotated[float, quantity("s", low=0.0)]
PositiveTime = Annotated[float, quantity("s", above=0.0)]
Voltage = Annotated[float, quantity("V", low=0.0)]
PositiveVoltage = Annotated[float, quantity("V", above=0.0)]
PositiveConductance = Annotated[float, quantity("S", above=0.0)]
Fraction = Annotated[float, quantity("%", low=0.0, high=1.0)]
RelativeSpread = Annotated[float, quantity("%", low=0.0, high=10.0)]


def complaint(error: ValidationError) -> str:
    """The first complaint of a failed validation as "[section] key: rule", with the number of further ones."""
    details = error.errors(include_url=False)
    first = _one_complaint(details[0])
    more = len(details) - 1
    return first if more == 0 else f"{first} (and {more} more)"


def _one_complaint(detail: ErrorDetails) -> str:
    location = [part for part in detail["loc"] if isinstance(part, str)]
    context: Mapping[str, Any] = detail.get("ctx", {})
    if "key" in context:
        location.append(str(context["key"]))
    return f"{place(location)}: {_rule(detail)}" if location else _rule(detail)


def place(location: list[str]) -> str:
    """Where a key stands: ["programming", "set", "width"] is "[programming.set] width"."""
    *tables, key = location
    return f"[{'.'.join(tables)}] {key}" if tables else key


_RULES = {
    "missing": "is missing",
    "int_type": "must be a whole number, got {value}",
    "int_from_float": "must be a whole number, got {value}",
    "float_type": "must be a number, got {value}",
    "string_type": "must be text in quotes, got {value}",
    "bool_type": "must be true or false, got {value}",
    "model_type": "must be a table, got {value}",
    "dict_type": "must be a table, got {value}",
    "finite_number": "must be a finite number, got {value}",
    "greater_than_equal": "must be at least {ge}, got {value}",
    "greater_than": "must be above {gt}, got {value}",
    "less_than_equal": "must be at most {le}, got {value}",
}


def _rule(detail: ErrorDetails) -> str:
    context: Mapping[str, Any] = detail.get("ctx", {})
    if "text" in context:
        return str(context["text"])
    pattern = _RULES.get(detail["type"])
    if pattern is None:
        return f"{detail['msg']}, got {shown(detail['input'])}"
    return pattern.format(value=shown(detail["input"]), **context)
