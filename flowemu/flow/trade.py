"""What the process data tell of a flow: unknown materials, etchants and methods, and rates that nobody measured."""

from __future__ import annotations

from collections.abc import Iterator

from flowemu.errors import Fault, FlowemuError
from flowemu.flow.flow import Flow, Step
from flowemu.flow.order import RESIST, WAFER
from flowemu.flow.process import ProcessData, ProcessDataError, UnknownNameError, load_process_data
from flowemu.flow.removal import OTHERS

NOT_BUILT = ("deep", "crystal")
LEVEL = "level"
Films = dict[str, tuple[str, str | None]]
"""Material and state by the film's name."""


def trade_faults(flow: Flow, complete: bool = True) -> list[Fault]:
    """Every fault that the built-in and the flow's own process data show, without geometry.

    `complete` is False where some step could not be read: then what the steps before a step put down is not judged.
    """
    try:
        data = load_process_data(flow.data)
    except ProcessDataError as error:
        if any(keys[:1] != ("data",) for keys, _ in error.problems):
            raise
        return [flow.fault(keys, f"{'.'.join(map(str, keys))}: {text}") for keys, text in error.problems]
    films: Films = {WAFER: (flow.wafer.material, None)}
    faults = list(_material(flow, ("wafer", "material"), "wafer.material", data, flow.wafer.material))
    for step in flow.steps:
        faults += _step_faults(flow, step, data, films, complete)
    return faults


def _step_faults(flow: Flow, step: Step, data: ProcessData, films: Films, complete: bool) -> Iterator[Fault]:
    if step.verb == "deposit":
        yield from _deposit(flow, step, data)
        films[step.settings.film] = (step.settings.material, step.settings.state)
    elif step.verb == "pattern":
        material = step.settings.resist.material
        where = (*step.where, "resist", "material")
        yield from _material(flow, where, f"{step.title}: resist.material", data, material)
        films[RESIST] = (material, None)
    elif step.verb in ("etch", "release"):
        yield from _etch(flow, step, data, films if complete else {})
    elif step.verb == "anneal":
        _anneal(step, data, films)


def _material(
    flow: Flow, where: tuple[str | int, ...], label: str, data: ProcessData, name: str, state: str | None = None
) -> Iterator[Fault]:
    try:
        data.material(name).state(state)
    except UnknownNameError as error:
        at = where if state is None or "state of" not in str(error) else (*where[:-1], "state")
        yield flow.fault(at, f"{label}: {error}")


def _deposit(flow: Flow, step: Step, data: ProcessData) -> Iterator[Fault]:
    settings = step.settings
    where, label = (*step.where, "material"), f"{step.title}: material"
    yield from _material(flow, where, label, data, settings.material, settings.state)
    try:
        method = data.method(settings.method)
    except UnknownNameError as error:
        yield flow.step_fault(step, "method", f"method: {error}")
        return
    if settings.planarisation is not None and method.growth != LEVEL:
        yield flow.step_fault(step, "planarisation", f"planarisation: a film by '{method.name}' does not level")


def _etch(flow: Flow, step: Step, data: ProcessData, films: Films) -> Iterator[Fault]:
    settings = step.settings
    for name in settings.rates:
        if name not in films and name != OTHERS and films:
            yield from _material(flow, (*step.where, "rates", name), f"{step.title}: rates", data, name)
    try:
        etchant = data.etchant(settings.etchant)
    except UnknownNameError as error:
        yield flow.step_fault(step, "with", f"with: {error}")
        return
    profile = settings.profile or etchant.profile
    if profile in NOT_BUILT:
        setting = "profile" if settings.profile else "with"
        yield flow.step_fault(step, setting, f"{setting}: the {profile} etch of '{settings.etchant}' is not built yet")
        return
    for film in dict.fromkeys(settings.clears or ()):
        if film in films:
            yield from _cleared(flow, step, data, film, films[film])


def _cleared(flow: Flow, step: Step, data: ProcessData, film: str, made_of: tuple[str, str | None]) -> Iterator[Fault]:
    """A fault where the film that an etch is to clear has no rate in it."""
    material, state = made_of
    own = step.settings.stated_rate(film, material)
    try:
        rate = data.rate(step.settings.etchant, material, state)
    except FlowemuError:
        return
    value = next((v for v in (own, rate.value, step.settings.rate_of_others) if v is not None), None)
    if value is None:
        solid = f"film '{film}' ({material}{f', {rate.state}' if rate.state else ''})"
        text = f"no rate for {solid} in '{step.settings.etchant}': {rate.why_no_value}; give one under rates"
        yield flow.step_fault(step, "with", f"clears: {text}")
    elif value == 0.0:
        yield flow.step_fault(step, "clears", f"clears: '{step.settings.etchant}' does not etch film '{film}'")


def _anneal(step: Step, data: ProcessData, films: Films) -> None:
    for film, (material, state) in films.items():
        try:
            films[film] = (material, data.anneal(material, state, step.settings.temperature, step.settings.time))
        except FlowemuError:
            continue
