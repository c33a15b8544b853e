"""Puts entries of the process data into tables and collects all that is wrong with them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any, TypeVar

from pydantic import ValidationError

from flowemu.errors import FlowemuError, hint
from flowemu.flow.process_records import Anneal, Etchant, Hazard, Material, Method, RateRow, Source
from flowemu.flow.process_values import Named, Record, UnknownNameError, find, name_key
from flowemu.flow.quantities import shape

CAUTION_END = "; follow the safety data sheet, local rules and trained staff"
# Filled in here, never stated by an entry.
FILLED = ("name", "overridden", "cautions")

Keys = tuple[str | int, ...]
R = TypeVar("R", bound=Record)
N = TypeVar("N", bound=Named)


class ProcessDataError(FlowemuError):
    """The files or the flow's `data:` section are wrong.

    `problems` pairs the keys that lead to each place, from the file's name or `data` on, with the complaint.
    """

    def __init__(self, problems: list[tuple[Keys, str]]) -> None:
        self.problems = tuple(problems)
        super().__init__("; ".join(self._texts()))

    def _texts(self) -> list[str]:
        return [": ".join([*(str(key) for key in keys), text]) for keys, text in self.problems]

    def lines(self) -> list[str]:
        return [f"flowemu: {text}" for text in self._texts()]


@dataclass
class Tables:
    """All entries, by `name_key` of their names; a rate by etchant, material and state, None for any state."""

    sources: dict[str, Source] = field(default_factory=dict)
    hazards: dict[str, Hazard] = field(default_factory=dict)
    kinds: dict[str, dict[str, Any]] = field(default_factory=dict)
    materials: dict[str, Material] = field(default_factory=dict)
    etchants: dict[str, Etchant] = field(default_factory=dict)
    methods: dict[str, Method] = field(default_factory=dict)
    anneals: tuple[Anneal, ...] = ()
    rates: dict[tuple[str, str, str | None], RateRow] = field(default_factory=dict)

    def copy(self) -> Tables:
        return Tables(
            dict(self.sources), self.hazards, self.kinds, dict(self.materials), dict(self.etchants),
            dict(self.methods), self.anneals, dict(self.rates),
        )  # fmt: skip


class Reader:
    """Puts entries into tables and collects all that is wrong with them."""

    def __init__(self, tables: Tables, from_flow: bool) -> None:
        self.tables, self.from_flow = tables, from_flow
        self.problems: list[tuple[Keys, str]] = []

    def finished(self) -> Tables:
        """The tables, or all complaints at once."""
        if not self.problems:
            self._look_up_names()
        if self.problems:
            raise ProcessDataError(self.problems)
        return self.tables

    def section(self, name: str, keys: Keys, entries: Any) -> None:
        """Read one section; `keys` lead to it."""
        getattr(self, f"_{name}")(keys, entries)

    def items(self, keys: Keys, entries: Any) -> Iterator[tuple[str, Any]]:
        if isinstance(entries, Mapping):
            yield from ((str(name), entry) for name, entry in entries.items())
        else:
            self.problems.append((keys, f"expected a mapping, found {shape(entries)}"))

    def record(self, model: type[R], entry: Any, keys: Keys, base: Mapping[str, Any] | None = None) -> R | None:
        """The entry over `base` as a record; None, with the complaints kept, where it is wrong."""
        own = dict(self.items(keys, entry))
        self.problems += [((*keys, name), f"unknown setting{_hint(name, model)}") for name in FILLED if name in own]
        given = {**(base or {}), **own}
        if self.from_flow and "overridden" in model.model_fields:
            given["overridden"] = True
        try:
            return model.model_validate(given, context=self.from_flow or None)
        except ValidationError as error:
            self.problems += [((*keys, *e["loc"]), _complaint(dict(e), model)) for e in error.errors()]
            return None

    def _sources(self, keys: Keys, entries: Any) -> None:
        for name, entry in self.items(keys, entries):
            source = self.record(Source, entry, (*keys, name))
            if source:
                self.tables.sources[name] = source

    def _hazards(self, keys: Keys, entries: Any) -> None:
        for name, entry in self.items(keys, entries):
            hazard = self.record(Hazard, entry, (*keys, name))
            if hazard:
                self.tables.hazards[name] = hazard

    def _materials(self, keys: Keys, entries: Any) -> None:
        self._named(Material, self.tables.materials, keys, entries)

    def _methods(self, keys: Keys, entries: Any) -> None:
        self._named(Method, self.tables.methods, keys, entries)

    def _etchants(self, keys: Keys, entries: Any) -> None:
        for etchant in self._named(Etchant, self.tables.etchants, keys, entries):
            known = [self.tables.hazards[name] for name in etchant.hazards if name in self.tables.hazards]
            cautions = tuple(f"{hazard.text}{CAUTION_END}" for hazard in known)
            self.tables.etchants[name_key(etchant.name)] = etchant.model_copy(update={"cautions": cautions})

    def _named(self, model: type[N], table: dict[str, N], keys: Keys, entries: Any) -> list[N]:
        read = []
        for name, entry in self.items(keys, entries):
            record = self.record(model, entry, (*keys, name), self._base(table, name, entry))
            if record:
                table[name_key(record.name)] = record
                read.append(record)
        return read

    def _base(self, table: Mapping[str, Named], name: str, entry: Any) -> dict[str, Any]:
        """What an entry starts from: the one it overrides, or what its kind of etchant does."""
        try:
            old = find("entry", table, name)
        except UnknownNameError:
            kind = entry.get("kind") if isinstance(entry, Mapping) else None
            defaults = self.tables.kinds.get(str(kind), {}) if table is self.tables.etchants else {}
            return {**defaults, "name": name}
        return old.model_dump(by_alias=True, exclude_unset=True, exclude={"cautions"})

    def _anneals(self, keys: Keys, entries: Any) -> None:
        for i, entry in enumerate(self._rows(keys, entries)):
            rule = self.record(Anneal, entry, (*keys, i))
            if rule:
                others = (r for r in self.tables.anneals if (r.material, r.before) != (rule.material, rule.before))
                self.tables.anneals = (*others, rule)

    def _rates(self, keys: Keys, entries: Any) -> None:
        for name, block in self.items(keys, entries):
            bath = self._found("etchant", self.tables.etchants, name, (*keys, name))
            for step, entry in self._rate_entries((*keys, name), block):
                row = self.record(RateRow, entry, (*keys, name, step))
                if bath and row:
                    self._add_rates(bath, row, (*keys, name, step))

    def _rate_entries(self, keys: Keys, block: Any) -> Iterator[tuple[str | int, Any]]:
        """Rows of a list, or the pairs of the short form `material: rate`."""
        if not isinstance(block, Mapping):
            yield from enumerate(self._rows(keys, block))
            return
        for name, entry in block.items():
            row = entry if isinstance(entry, Mapping) else {"rate": entry}
            yield str(name), {"material": str(name), **row}

    def _rows(self, keys: Keys, entries: Any) -> list[Any]:
        if isinstance(entries, list | tuple):
            return list(entries)
        self.problems.append((keys, f"expected a list, found {shape(entries)}"))
        return []

    def _add_rates(self, bath: Etchant, row: RateRow, keys: Keys) -> None:
        """Enter the row for each of its materials; one without a state replaces those of all states."""
        for name in row.material:
            solid = self._found("material", self.tables.materials, name, keys)
            try:
                state = solid.state(row.state) if solid and row.state else None
            except UnknownNameError as error:
                self.problems.append((keys, str(error)))
                continue
            pair = (name_key(bath.name), name_key(solid.name if solid else name))
            if self.from_flow:
                self._drop_builtin_rates(pair, state)
            if (*pair, state) in self.tables.rates:
                self.problems.append((keys, f"'{name}' is there twice"))
            self.tables.rates[(*pair, state)] = row

    def _drop_builtin_rates(self, pair: tuple[str, str], state: str | None) -> None:
        rates = self.tables.rates
        for key in [key for key in rates if key[:2] == pair and state in (None, key[2])]:
            if not rates[key].overridden:
                del rates[key]

    def _found(self, what: str, table: Mapping[str, N], name: str, keys: Keys) -> N | None:
        try:
            return find(what, table, name)
        except UnknownNameError as error:
            self.problems.append((keys, str(error)))
            return None

    def _look_up_names(self) -> None:
        """Complain about names within entries that lead nowhere."""
        top: Keys = ("data",) if self.from_flow else ()
        for material in self.tables.materials.values():
            for method in material.needs_coverage_when:
                self._found("method", self.tables.methods, method, (*top, "materials", material.name))
        for way in self.tables.methods.values():
            for deposit in way.deposits:
                self._found("material", self.tables.materials, deposit.material, (*top, "methods", way.name))
        for etchant in self.tables.etchants.values():
            for name in etchant.hazards:
                if name not in self.tables.hazards:
                    text = f"unknown hazard '{name}'{hint(name, self.tables.hazards)}"
                    self.problems.append(((*top, "etchants", etchant.name), text))
        for rule in self.tables.anneals:
            self._look_up_states(rule, (*top, "anneals"))

    def _look_up_states(self, rule: Anneal, keys: Keys) -> None:
        solid = self._found("material", self.tables.materials, rule.material, keys)
        try:
            _ = solid and (solid.state(rule.before), solid.state(rule.after))
        except UnknownNameError as error:
            self.problems.append((keys, str(error)))


def _hint(name: str, model: type[Record]) -> str:
    return hint(name, (known for known in model.names() if known not in FILLED))


def _complaint(error: Mapping[str, Any], model: type[Record]) -> str:
    """pydantic's error in the words of this program."""
    if error["type"] == "extra_forbidden":
        return f"unknown setting{_hint(str(error['loc'][-1]), model)}"
    if error["type"] == "literal_error":
        return f"expected {error['ctx']['expected']}, found {shape(error['input'])}"
    return "is missing" if error["type"] == "missing" else str(error["msg"])
