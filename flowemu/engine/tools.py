"""What a step is handed beside the wafer: data, masks, names, and where it stands in the flow."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from flowemu.errors import StepError
from flowemu.flow.flow import Flow
from flowemu.flow.process import ProcessData, Rate, UnknownNameError
from flowemu.flow.process_records import Etchant, Material, Method
from flowemu.layout import Layout
from flowemu.stack.bodies import Place
from flowemu.stack.grid import Grid
from flowemu.stack.wafer import Coat, Laid, Unresolved

NARROW = 2.0  # cells: drawn lines and spaces below this cannot be told by the grid


@dataclass(frozen=True, eq=False)
class Tools:
    """The tools of one step.

    Attributes
    ----------
    step, verb : the step's number and verb
    places : named parts by their film (None: the topmost) and place
    """

    flow: Flow
    data: ProcessData
    layout: Layout
    places: Mapping[str, Place]
    grid: Grid | None = None
    step: int = 0
    verb: str = ""

    def at(self, step: int, verb: str) -> Tools:
        """The same tools for another step."""
        return replace(self, step=step, verb=verb)

    def _named(self, find: Any, name: str) -> Any:
        try:
            return find(name)
        except UnknownNameError as error:
            raise StepError(str(error)) from None

    def material(self, name: str) -> Material:
        return self._named(self.data.material, name)

    def etchant(self, name: str) -> Etchant:
        return self._named(self.data.etchant, name)

    def method(self, name: str) -> Method:
        return self._named(self.data.method, name)

    def rate(self, etchant: str, material: str, state: str | None) -> Rate:
        """What is known of a material's rate; see `ProcessData.rate`."""
        try:
            return self.data.rate(etchant, material, state)
        except UnknownNameError as error:
            raise StepError(str(error)) from None

    def wafer_rate(self, settings: Any) -> float:
        """Rate of the wafer's own material in an etch, um/s, 0 where there is none."""
        wafer = self.flow.wafer.material
        for key in ("wafer", wafer):
            if key in settings.rates:
                return float(settings.rates[key])
        value = self.rate(settings.etchant, wafer, None).value
        return float(value) if value is not None else float(settings.rates.get("others", 0.0))

    def slowest_rate(self, settings: Any) -> float:
        """Least rate of the films that an etch clears or stops at, um/s; 0 where it is not known."""
        names = settings.clears or ((settings.until,) if settings.until else ())
        films = {s.settings.film: s.settings for s in self.flow.steps if s.verb == "deposit"}
        rates = []
        for name in names:
            if name in films:
                film = films[name]
                rate = settings.rates.get(name, settings.rates.get(film.material))
                if rate is None:
                    rate = self.rate(settings.etchant, film.material, film.state).value
                rates.append(rate)
        known = [rate for rate in rates if rate]
        return min(known) if known else 0.0

    def wets_back(self, settings: Any) -> bool:
        """Whether an etch reaches the wafer's back."""
        return (settings.side or self.etchant(settings.etchant).sides) in ("back", "both")

    def coat(self, film: Any, thickness: float) -> Coat:
        return Coat(film.name, film.material, film.state, thickness, self.step)

    def laid(self, stack: Any, film: str) -> Laid:
        """What the film that comes next will rest on, column by column."""
        from flowemu.stack.columns import topmost

        return Laid(self.step, film, topmost(stack), tuple(f.name for f in stack.films))

    def opened(self, settings: Any) -> np.ndarray:
        """Planar distance to the printed edge of a pattern step, `(ny, nx)` um, positive where it is opened."""
        from flowemu.layout.masks import mask_distance

        assert self.grid is not None
        layer, datatype = self.flow.masks[settings.mask]
        loops = self.layout.polygons(layer, datatype)
        grow = settings.bias if settings.keeps_drawn else -settings.bias
        try:
            outside = mask_distance(loops, self.grid.x, self.grid.y, grow, settings.shift, settings.rounding)
        except Exception as error:
            raise StepError(f"mask {settings.mask}: {error}") from None
        return outside if settings.keeps_drawn else -outside

    def narrow(self, settings: Any) -> list[Unresolved]:
        """Places where a mask is drawn too narrow for the grid."""
        from flowemu.layout.offsets import thin_places

        assert self.grid is not None
        layer, datatype = self.flow.masks[settings.mask]
        width = NARROW * self.grid.cell
        x0, y0, x1, y1 = self.grid.box
        two_d = min(self.grid.nx, self.grid.ny) == 1
        found = [
            place for place in thin_places(self.layout.polygons(layer, datatype), width)
            if two_d or (x0 <= place.x <= x1 and y0 <= place.y <= y1)
        ]  # fmt: skip
        if not found or two_d:
            return []
        worst = min(found, key=lambda place: place.width)
        drawn = f"mask {settings.mask} has a {worst.kind} of {worst.width:.3g} um"
        text = f"{drawn}, less than two cells of {self.grid.cell:g} um"
        return [Unresolved(self.step, None, text, (worst.x, worst.y, 0.0), worst.width)]
