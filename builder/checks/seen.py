"""Seen: the numbers of an outcome as they can be held against those of another entry, product by product."""

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import isinf

from builder.checks.case import Case
from builder.checks.measured import percent_span
from builder.checks.reaction_key import product_key, product_structure
from builder.chemistry.neutral import neutral_form
from builder.records.fields import Ratio
from builder.records.model import Measurement
from builder.records.quantities import Percent
from builder.records.vocabulary import YieldKind
from builder.rule import Path

__all__ = ["Seen", "seen_in"]


@dataclass(frozen=True, slots=True)
class Seen:
    """One number of an outcome, in per cent, as it can be held against that of another entry.

    what: the quantity and the structures it is of; where it is equal, two numbers speak of the same thing.
    label: the same in words. kind: of a yield; None for all else, and for a product that was sought and not found.
    low, high: between which the value lies; equal unless it is a limit. spread: as stated. text: with its kind.
    is_sum: over all products of one formula.
    """

    what: str
    label: str
    kind: YieldKind | None
    low: float
    high: float
    spread: float | None
    text: str
    at: Path
    is_sum: bool = False


def seen_in(case: Case) -> tuple[Seen, ...]:
    """Return every number that can be held against another entry's; sums over a formula come last."""
    return tuple(_Outcome(case).seen())


@dataclass(frozen=True)
class _Outcome:
    """The outcome of a case, read product by product."""

    case: Case

    def seen(self) -> Iterator[Seen]:
        """Yield every number that can be held against another entry's; sums over a formula come last."""
        yields = [each for index, line in enumerate(self._lines) for each in self._yields(line, index)]
        yield from (each for _, each in yields)
        yield from (each for index, line in enumerate(self._lines) for each in self._others(line, index))
        yield from self._not_found({label for label, _ in yields})
        yield from self._sums([(label, each) for label, each in yields if label])

    @property
    def _lines(self) -> tuple[Measurement, ...]:
        return self.case.record.outcome.measured

    def _key(self, label: str) -> str:
        for product in self.case.record.outcome.products:
            structure = product_structure(self.case, product) if product.label == label else None
            if structure is not None:
                return product_key(self.case, structure, product)
        return label

    def _name(self, label: str) -> str:
        return next((p.name for p in self.case.record.outcome.products if p.label == label), label)

    def _yields(self, line: Measurement, index: int) -> Iterator[tuple[str, Seen]]:
        """Yield a yield with the label of its product; a joint one is shared out where a ratio says how."""
        if line.what != "yield" or line.of is None or not isinstance(line.value, Percent):
            return
        if len(line.of) == 1:
            yield line.of[0], self._yield(line, index, line.of[0], *_bounds(line.value), f"{line.value}")
            return
        shares = self._shares(line.of)
        for label, share in shares.items() if not line.value.is_limit else ():
            part = line.value.magnitude * share
            yield label, self._yield(line, index, label, part, part, f"{part:.3g} %", " (by the ratio)")
        if not shares:
            what, label = "+".join(sorted(map(self._key, line.of))), " + ".join(map(self._name, line.of))
            low, high = _bounds(line.value)
            text = f"{line.value} {line.kind} yield"
            at: Path = ("outcome", "measured", index)
            yield "", Seen(f"yield {what}", f"yield of {label}", line.kind, low, high, _spread(line), text, at)

    def _yield(
        self, line: Measurement, index: int, label: str, low: float, high: float, value: str, note: str = ""
    ) -> Seen:
        kind = "area share" if line.kind is YieldKind.AREA else f"{line.kind} yield"
        return Seen(
            f"yield {self._key(label)}",
            f"yield of {self._name(label)}",
            line.kind,
            low,
            high,
            _spread(line),
            f"{value} {kind}{note}",
            ("outcome", "measured", index),
        )

    def _shares(self, labels: Sequence[str]) -> dict[str, float]:
        """Return how a ratio of single products shares out the sum of these; empty where none does."""
        for line in self._lines:
            if isinstance(line.value, Ratio) and line.what == "ratio":
                parts = dict(zip(line.value.parts, line.value.percentages, strict=True))
                if all((label,) in parts for label in labels):
                    total = sum(parts[(label,)] for label in labels)
                    return {label: parts[(label,)] / total for label in labels} if total else {}
        return {}

    def _others(self, line: Measurement, index: int) -> Iterator[Seen]:
        """Yield what is measured beside yields: conversion, ee or er, dr, and the parts of a ratio."""
        at: Path = ("outcome", "measured", index)
        of = " + ".join(map(self._name, line.of or ()))
        keys = "+".join(sorted(map(self._key, line.of or ())))
        spread = _spread(line)
        match line.what, line.value:
            case "conversion", Percent() as value:
                yield Seen("conversion", "conversion", None, *_bounds(value), spread, f"{value} conversion", at)
            case "ee", Percent() as value if line.of != ("substrate",):
                yield Seen(f"ee {keys}", f"ee of {of}", None, *_bounds(value), spread, f"{value} ee", at)
            case "er", Ratio() as value if line.of != ("substrate",) and len(value.numbers) == 2:
                excess = value.excess_percent
                yield Seen(f"ee {keys}", f"ee of {of}", None, excess, excess, spread, f"er {value}", at)
            case "dr", Ratio() as value:
                share = max(value.percentages)
                yield Seen(f"dr {keys}", f"dr of {of}", None, share, share, spread, f"dr {value}", at)
            case "ratio", Ratio() as value:
                parts = ["+".join(sorted(map(self._key, part))) for part in value.parts]
                names = [" + ".join(map(self._name, part)) for part in value.parts]
                for key, name, share in zip(parts, names, value.percentages, strict=True):
                    what, label = f"ratio {key} of {':'.join(sorted(parts))}", f"share of {name} in the ratio"
                    yield Seen(what, label, None, share, share, spread, f"{share:.3g} % ({value})", at)

    def _not_found(self, measured: set[str]) -> Iterator[Seen]:
        """Yield a yield of nothing for a product that was sought and is not among those measured."""
        sought = self.case.record.outcome.sought
        structure = self.case.structures.get(("outcome", "sought"))
        if sought is None or structure is None:
            return
        key = product_key(self.case, structure, None)
        if key not in {self._key(label) for label in measured}:
            text = f"no {sought.name} found"
            yield Seen(f"yield {key}", f"yield of {sought.name}", None, 0, 0, None, text, ("outcome", "sought"))

    def _sums(self, yields: Sequence[tuple[str, Seen]]) -> Iterator[Seen]:
        """Yield the sum over all products of one formula, so that one list of alkenes can be held against another."""
        by_label = dict(yields)
        families: defaultdict[str, list[str]] = defaultdict(list)
        for product in self.case.record.outcome.products:
            structure = product_structure(self.case, product)
            if structure is not None:
                families[neutral_form(structure).formula].append(product.label)
        for formula, labels in families.items():
            members = [by_label[label] for label in labels if label in by_label]
            kinds = {member.kind for member in members}
            if len(members) < len(labels) or len(kinds) > 1:
                continue
            low, high = sum(member.low for member in members), sum(member.high for member in members)
            kind = "area share" if kinds == {YieldKind.AREA} else f"{members[0].kind} yield"
            text = f"{high:.3g} % {kind} in all"
            yield Seen(
                f"yield {formula}",
                f"yield of all {formula}",
                members[0].kind,
                low,
                high,
                None,
                text,
                members[0].at,
                is_sum=True,
            )


def _bounds(value: Percent) -> tuple[float, float]:
    """Return between which percentages a measured value lies."""
    span = percent_span(value)
    return span.low, 100.0 if isinf(span.high) else span.high


def _spread(line: Measurement) -> float | None:
    return line.spread.magnitude if line.spread is not None else None
