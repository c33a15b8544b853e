"""`flowemu explain`: the documentation of a step, a setting, a check or a finding's code, from its own docstring."""

from __future__ import annotations

from collections.abc import Iterator

import click


@click.command(short_help="Explain a step, a setting, a check or a code.")
@click.argument("word", required=False)
def command(word: str | None) -> int:
    """Explain a step, a setting, a section, a check or a finding's code; without WORD, list them."""
    from flowemu.errors import Fault, InputError, hint

    if word is None:
        click.echo("\n".join(_contents()))
        return 0
    texts = list(_explanations(word))
    if not texts:
        raise InputError([Fault(None, None, None, f"nothing is named '{word}'{hint(word, _words(), 'try')}")])
    click.echo("\n\n".join(texts))
    return 0


def _contents() -> Iterator[str]:
    from flowemu.registry import checks, step_kinds

    yield "Steps:"
    yield from (f"  {kind.verb:<12} {_first(kind.doc)}" for kind in step_kinds().values())
    yield "Checks:"
    for check in checks().values():
        yield f"  {check.name:<12} {_first(check.doc)}"
        yield f"  {'':<12} reports {', '.join(check.codes)}"
    yield "Sections of the flow file:"
    yield from (f"  {name:<12} {text}" for name, text in _sections().items())


def _rests_on(sources: tuple[str, ...]) -> str:
    return "Rests on " + "; ".join(sources) + "."


def _first(doc: str) -> str:
    """The first sentence of a docstring."""
    return " ".join(doc.split("\n\n")[0].split())


def _sections() -> dict[str, str]:
    from flowemu.flow.sections import FlowFile

    return {name: field.description or "" for name, field in FlowFile.model_fields.items()}


def _words() -> list[str]:
    from flowemu.registry import checks, finding_codes, step_kinds

    kinds = step_kinds()
    settings = [name for kind in kinds.values() for name in kind.settings.names()]
    return [*kinds, *checks(), *finding_codes(), *_sections(), *settings]


def _explanations(word: str) -> Iterator[str]:
    """Everything of that name: a step, a check or code, a section, a setting of the steps."""
    from flowemu.registry import checks, finding_codes, step_kinds

    kinds = step_kinds()
    if word in kinds:
        yield f"step {word}\n\n{kinds[word].doc}\n\n{_rests_on(kinds[word].sources)}"
    check = checks().get(word) or finding_codes().get(word)
    if check is not None:
        yield f"check {check.name}, reports {', '.join(check.codes)}\n\n{check.doc}\n\n{_rests_on(check.sources)}"
    if word in _sections():
        yield "\n".join(_section(word))
    yield from (text for kind in kinds.values() if (text := _setting(kind.verb, kind.settings, word)))


def _section(name: str) -> Iterator[str]:
    from flowemu.flow.complaints import settings_in
    from flowemu.flow.sections import FlowFile

    yield f"section {name}: {_sections()[name]}"
    model = settings_in(FlowFile.model_fields[name].annotation)
    if model is not None:
        fields = model.model_fields.items()
        yield from (f"  {field.alias or key:<12} {field.description or ''}" for key, field in fields)


def _setting(verb: str, settings: type, word: str) -> str:
    from flowemu import units
    from flowemu.flow.quantities import quantity_in

    for name, field in settings.model_fields.items():  # type: ignore[attr-defined]
        if (field.alias or name) == word:
            quantity = quantity_in(field)
            form = f" ({units.expected(quantity.kind)})" if quantity else ""
            return f"setting {word} of {verb}: {field.description}{form}"
    return ""
