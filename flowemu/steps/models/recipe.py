"""An etch with its data looked up: how fast it takes each film of a stack, and in what direction."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from flowemu.errors import StepError
from flowemu.flow.removal import OTHERS, RemovalSettings
from flowemu.stack.stack import FilmStack


@dataclass(frozen=True, eq=False)
class Etch:
    """One etch on one stack: settings with their data looked up.

    Attributes
    ----------
    rates : film number to um/s, 0 where the rate is known to be nothing or not known
    unknown : film number to why there is no rate
    """

    stack: FilmStack
    settings: RemovalSettings
    directional: bool
    wall: float
    lateral: float
    rates: dict[int, float]
    unknown: dict[int, str]

    @classmethod
    def of(cls, stack: FilmStack, settings: RemovalSettings, tools: Any) -> Etch:
        etchant = tools.etchant(settings.etchant)
        profile = settings.profile or etchant.profile
        if profile not in ("isotropic", "directional"):
            raise StepError(f"profile '{profile}' is not built yet; state profile: isotropic or directional")
        rates: dict[int, float] = {}
        unknown: dict[int, str] = {}
        for k, film in enumerate(stack.films):
            value, why = film_rate(film.name, film.material, film.state, settings, tools)
            rates[k] = value or 0.0
            if value is None:
                unknown[k] = why
        return cls(
            stack=stack,
            settings=settings,
            directional=profile == "directional",
            wall=settings.wall if settings.wall is not None else etchant.wall_angle,
            lateral=settings.lateral if settings.lateral is not None else etchant.lateral_share,
            rates=rates,
            unknown=unknown,
        )

    def numbers(self, names: tuple[str, ...]) -> list[int]:
        """Film numbers of named films, each of which must be there."""
        out = []
        for name in names:
            k = self.stack.index(name)
            if k is None:
                raise StepError(f"there is no film '{name}' on the wafer any more")
            out.append(k)
        return out


def film_rate(
    name: str, material: str, state: str | None, settings: RemovalSettings, tools: Any
) -> tuple[float | None, str]:
    """Rate of a film, um/s, and why there is none: the step's own, the data's, then the step's `others`."""
    for key in (name, material):
        if key in settings.rates:
            return settings.rates[key], ""
    datum = tools.rate(settings.etchant, material, state)
    if datum.value is not None:
        return float(datum.value), ""
    if OTHERS in settings.rates:
        return settings.rates[OTHERS], ""
    return None, datum.why_no_value
