"""The cited process data: materials, etchants, methods, rates, and what heat does to a material's state.

Names are forgiving about case, spaces and hyphens. A rate that nobody measured has no value: neither a code of the
published tables nor a missing entry is ever a zero.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

from flowemu.flow.process_entries import ProcessDataError, Tables
from flowemu.flow.process_files import builtin_tables, with_overrides
from flowemu.flow.process_records import CODES, Anneal, Deposit, Etchant, Hazard, Material, Method, RateRow, Source
from flowemu.flow.process_values import UnknownNameError, find, name_key, span

__all__ = ["CODES", "ProcessData", "ProcessDataError", "Rate", "UnknownNameError", "load_process_data"]


@dataclass(frozen=True)
class Rate:
    """What is known of a material's rate in an etchant.

    Attributes
    ----------
    value : float or None, um/s
        The rate to compute with; None where there is no datum, or only a code.
    low, high : float or None, um/s
        The published spread; both the value where none is published.
    code : str or None
        The published tables' code, a key of `CODES`.
    bound : str or None
        `at least` or `at most` where the value is only a limit.
    unit_text : str
        The rate as published, such as `230 nm/min`.
    conditions, source, standing, note : str
        Where the number holds, a key of the sources, and how far to trust it; empty without a datum.
    overridden : bool
        True where the flow's `data:` section gave it.
    """

    etchant: str
    material: str
    state: str | None = None
    value: float | None = None
    low: float | None = None
    high: float | None = None
    code: str | None = None
    bound: str | None = None
    unit_text: str = ""
    conditions: str = ""
    source: str = ""
    standing: str = ""
    note: str = ""
    overridden: bool = False

    @property
    def published(self) -> bool:
        """Whether the data have an entry at all."""
        return bool(self.source)

    @property
    def why_no_value(self) -> str:
        """Why there is no number to compute with; empty where there is one."""
        if self.value is not None:
            return ""
        return f"published only as '{self.code}' ({CODES[self.code]})" if self.code else "no datum"


@dataclass(frozen=True)
class ProcessData:
    """The built-in data with the flow's own on top; look-ups raise UnknownNameError with the near miss."""

    tables: Tables

    def material(self, name: str) -> Material:
        return find("material", self.tables.materials, name)

    def etchant(self, name: str) -> Etchant:
        return find("etchant", self.tables.etchants, name)

    def method(self, name: str) -> Method:
        return find("method", self.tables.methods, name)

    def rate(self, etchant: str, material: str, state: str | None = None) -> Rate:
        """The rate of a material (in its default state unless given) in an etchant.

        An entry for that state goes before one that tells no states apart. Without either, the rate has neither
        value nor code.
        """
        bath, solid = self.etchant(etchant), self.material(material)
        exact = solid.state(state)
        for tried in (exact, None):
            row = self.tables.rates.get((name_key(bath.name), name_key(solid.name), tried))
            if row is not None:
                return replace(_rate(bath, solid, row), state=exact)
        return Rate(bath.name, solid.name, exact)

    def rates(self, etchant: str) -> tuple[Rate, ...]:
        """Every entry of an etchant, in the order of the files; `state` is None where states are not told apart."""
        bath = self.etchant(etchant)
        rows = ((key, row) for key, row in self.tables.rates.items() if key[0] == name_key(bath.name))
        return tuple(replace(_rate(bath, self.material(key[1]), row), state=key[2]) for key, row in rows)

    def anneal(self, material: str, state: str | None, temperature: float, time: float) -> str | None:
        """The state after a time in s at a temperature in degC.

        The published limits are on the temperature alone, so any time above zero does.
        """
        solid = self.material(material)
        now = solid.state(state)
        for rule in self.tables.anneals:
            hot = time > 0.0 and temperature >= rule.at_least.low
            if hot and self.material(rule.material) is solid and solid.state(rule.before) == now:
                now = solid.state(rule.after)
        return now

    def needs_coverage(self, material: str, method: str) -> bool:
        """Whether this film comes out thinner on walls than on flats, so that its coverage must be stated."""
        way, solid = self.method(method), self.material(material)
        return way.growth == "flux" or any(self.method(name) is way for name in solid.needs_coverage_when)

    def deposit(self, material: str, method: str) -> Deposit | None:
        """The method's own temperature and growth rate for a material, where the data have them."""
        solid = self.material(material)
        return next((d for d in self.method(method).deposits if self.material(d.material) is solid), None)

    def citation(self, source: str) -> str:
        """The work behind a source's key; the text itself where the flow gave its own."""
        found = self.tables.sources.get(source)
        return found.citation if found else source

    @property
    def materials(self) -> tuple[Material, ...]:
        return tuple(self.tables.materials.values())

    @property
    def etchants(self) -> tuple[Etchant, ...]:
        return tuple(self.tables.etchants.values())

    @property
    def methods(self) -> tuple[Method, ...]:
        return tuple(self.tables.methods.values())

    @property
    def anneals(self) -> tuple[Anneal, ...]:
        return self.tables.anneals

    @property
    def sources(self) -> Mapping[str, Source]:
        return self.tables.sources

    @property
    def hazards(self) -> Mapping[str, Hazard]:
        return self.tables.hazards


def load_process_data(overrides: Mapping[str, Any] | None = None) -> ProcessData:
    """The process data, with the flow's `data:` section (its values as text) on top.

    Raises
    ------
    ProcessDataError
        With every complaint about the files or the section, each with its keys.
    """
    tables = builtin_tables()
    return ProcessData(with_overrides(tables, overrides) if overrides else tables)


def _rate(bath: Etchant, solid: Material, row: RateRow) -> Rate:
    """The row as a rate. What stays of a film that peels may be published as 0: that is no rate to compute with."""
    value = low = high = None
    if row.rate is not None:
        value, (low, high) = span(row.rate, "rate")[1], span(row.range or row.rate, "rate")
        if row.code == "P" and value == 0.0:
            value = low = high = None
    return Rate(
        bath.name, solid.name, row.state, value, low, high, row.code, row.bound, row.rate or "",
        row.conditions or bath.conditions, row.source, row.standing, row.note, row.overridden,
    )  # fmt: skip
