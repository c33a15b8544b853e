"""Typed quantities of the flow file: text with a unit in, a number in the program's own unit out.

Each type also states its JSON Schema, so that an editor completes and checks it. A value that is a number already
(settings built in Python) is taken to be in the program's own unit.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any, get_args

from pydantic_core import PydanticCustomError, core_schema

from flowemu import units


def complaint(text: str) -> PydanticCustomError:
    """The error that carries `text`, as it is, to the user."""
    return PydanticCustomError("flowemu", "{text}", {"text": text})


def shape(value: Any) -> str:
    """What a YAML value is, in the words of a complaint."""
    if value is None:
        return "nothing"
    if isinstance(value, dict):
        return "a mapping"
    return "a list" if isinstance(value, list | tuple) else f"'{value}'"


@dataclass(frozen=True)
class Quantity:
    """What a number of the flow file may be; stands as metadata in an `Annotated` type.

    Attributes
    ----------
    kind : str
        One of `units.KINDS`.
    least, above, most, below : float or None
        Bounds in the program's own unit; `least` and `most` are allowed values, `above` and `below` are not.
    """

    kind: str
    least: float | None = None
    above: float | None = None
    most: float | None = None
    below: float | None = None

    def read(self, value: Any) -> float:
        """The number, or a complaint."""
        number = self._number(value)
        if self.least is not None and number < self.least:
            raise complaint(f"'{value}' is below {self._bound(self.least)}")
        if self.above is not None and number <= self.above:
            raise complaint(f"'{value}' is not above {self._bound(self.above)}")
        if self.most is not None and number > self.most:
            raise complaint(f"'{value}' is above {self._bound(self.most)}")
        if self.below is not None and number >= self.below:
            raise complaint(f"'{value}' is not below {self._bound(self.below)}")
        return number

    def _number(self, value: Any) -> float:
        if isinstance(value, int | float) and not isinstance(value, bool):
            return float(value)
        if not isinstance(value, str):
            raise complaint(f"expected {units.expected(self.kind)}, found {shape(value)}")
        try:
            return units.parse(value, self.kind)
        except ValueError as error:
            raise complaint(str(error)) from None

    def _bound(self, value: float) -> str:
        return "zero" if value == 0.0 else units.show(value, self.kind)

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        low = self.least if self.least is not None else self.above
        return {
            "type": "string",
            "pattern": units.pattern(self.kind, signed=low is None or low < 0.0),
            "description": units.expected(self.kind),
            "examples": [units.example(self.kind)],
        }


def quantity_in(field: Any) -> Quantity | None:
    """The quantity that a model's field stands for, inside an optional type too; None for another kind of field."""
    nested = [part for option in get_args(field.annotation) for part in getattr(option, "__metadata__", ())]
    return next((part for part in (*field.metadata, *nested) if isinstance(part, Quantity)), None)


Length = Annotated[float, Quantity("length")]
PositiveLength = Annotated[float, Quantity("length", above=0.0)]
LEAST_CELL = 1e-4  # um: nothing is finer than the spacing of atoms
CellLength = Annotated[float, Quantity("length", least=LEAST_CELL)]
LengthFromZero = Annotated[float, Quantity("length", least=0.0)]
Duration = Annotated[float, Quantity("time", above=0.0)]
Rate = Annotated[float, Quantity("rate", least=0.0)]
Fraction = Annotated[float, Quantity("fraction", least=0.0, most=1.0)]
PositiveFraction = Annotated[float, Quantity("fraction", above=0.0, most=1.0)]
Share = Annotated[float, Quantity("fraction", least=0.0)]
WallAngle = Annotated[float, Quantity("angle", above=10.0, below=170.0)]
Temperature = Annotated[float, Quantity("temperature", least=-273.15)]
Concentration = Annotated[float, Quantity("concentration", above=0.0, most=100.0)]
