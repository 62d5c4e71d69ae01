"""The YAML of a planned record: what is known as values, what is open as gaps with what belongs there."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from decimal import Decimal
from enum import StrEnum
from pathlib import PurePath

from builder.authoring.expectation import Expected
from builder.authoring.plan import Plan, PlannedSolvent, PlannedStage, moles_of
from builder.chemistry.structure import Structure
from builder.mechanism.compounds import Identified, identified
from builder.mechanism.forecast import Forecast
from builder.records.mended_text import quoted
from builder.records.schema import modeline
from builder.records.specimen import GAP
from builder.records.vocabulary import (
    Course,
    Mechanism,
    NucleophileWord,
    ProductUse,
    Result,
    Status,
    StereoKind,
    Thermometer,
    Vessel,
    YieldKind,
)
from builder.records.yaml_writing import text_yaml

__all__ = ["skeleton"]

LABELS = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"


def skeleton(
    plan: Plan,
    expected: Sequence[Expected],
    forecast: Forecast | None,
    *,
    entry: str,
    schema: PurePath,
    warnings: Mapping[int, Sequence[str]] | None = None,
) -> str:
    """Return the YAML of a record that holds a plan, for its writer to complete.

    expected: products to confirm, the wanted one first. schema: path to the JSON Schema from the record's folder.
    warnings: what is to stand above a step of the work-up, by its place.
    """
    blocks = (
        _head(plan, entry, schema),
        _substrate(plan),
        _partners(plan),
        _solvents(plan),
        _stages(plan),
        _work_up(plan, warnings or {}),
        _outcome(expected, forecast),
        _tail(plan),
    )
    return "".join(f"{line}\n" for block in blocks for line in block)


# --- lines ----------------------------------------------------------------------------------------------------


def _text(text: str) -> str:
    """Return a text as a YAML scalar; a gap where it is empty."""
    return text_yaml(text) if text else GAP


def _line(indent: int, key: str, value: str = "", hint: str = "") -> str:
    comment = f"  # {hint}" if hint else ""
    return f"{' ' * indent}{key}:{f' {value}' if value else ''}{comment}"


def _open_only(value: str, hint: str) -> str:
    """Return the hint of a value that is still open; a filled one needs none."""
    return "" if value else hint


def _words(words: type[StrEnum], *, but: Iterable[StrEnum] = ()) -> str:
    left_out = set(but)
    return " | ".join(word for word in words if word not in left_out)


def _grams(grams: float) -> str:
    return f"{_digits(grams)} g" if grams >= 1 else f"{_digits(1000 * grams)} mg"


def _digits(number: float) -> str:
    """Return a number with four significant digits, as a balance gives them."""
    whole = len(str(int(number)))
    return f"{number:.{max(0, 4 - whole)}f}" if number >= 1 else f"{number:.4g}"


# --- blocks ---------------------------------------------------------------------------------------------------


def _head(plan: Plan, entry: str, schema: PurePath) -> Iterator[str]:
    yield modeline(schema)
    yield _line(0, "format", "1")
    yield _line(0, "entry", entry)
    yield _line(0, "revision", "1")
    yield _line(0, "status", Status.DRAFT.value)
    yield _line(0, "title", _text(plan.title), _open_only(plan.title, "one line that tells it from its neighbours"))
    yield _line(0, "performed")
    yield _line(2, "date", plan.date.isoformat(), "the day it was run")
    yield _line(2, "by", _text(plan.person), _open_only(plan.person, "your code, as in handbook.yml"))
    yield _line(2, "runs", "1")
    yield "# notebook: book and page"


def _substrate(plan: Plan) -> Iterator[str]:
    yield _line(0, "substrate")
    yield from _identity(2, plan.substrate)
    words = _words(StereoKind, but=(StereoKind.ACHIRAL,))
    yield _line(2, "stereo", plan.stereo or GAP, "" if plan.stereo else words)
    if plan.stereo is StereoKind.MIXTURE:
        yield _line(2, "ee", GAP, "such as 80 %; or er: '90:10', or dr: '90:10'")
    yield _line(2, "class", f"[{', '.join(plan.classes) or GAP}]", "" if plan.classes else "words of the closed list")
    group = plan.leaving_group
    yield _line(2, "leaving_group", group or GAP, _open_only(group, "none for an addition to a multiple bond"))
    if plan.quantity is None:
        hint = f"g or mg, of {plan.molecule.mass:.2f} g/mol; or amount: in mmol; or volume: in mL with density: in g/mL"
        yield _line(2, "mass", GAP, hint)
    else:
        key, text = plan.quantity
        yield _line(2, key, text, _other_quantity(key, moles_of(plan), plan.molecule))


def _other_quantity(key: str, moles: float | None, structure: Structure) -> str:
    if moles is None:
        return ""
    amount = f"{1000 * moles:.4g} mmol"
    mass = f"{_grams(moles * structure.mass)} of {structure.mass:.2f} g/mol"
    return mass if key == "amount" else f"{amount} of {structure.mass:.2f} g/mol"


def _identity(indent: int, compound: Identified) -> Iterator[str]:
    yield _line(indent, "name", _text(compound.name), _open_only(compound.name, "as your group calls it"))
    if compound.structure is None:
        return
    if compound.structure.charge:
        hint = f"the salt as it was weighed, counter-ion and all; read as {compound.smiles}"
        yield _line(indent, "smiles", quoted(GAP), hint)
    else:
        yield _line(indent, "smiles", quoted(compound.smiles))


def _partners(plan: Plan) -> Iterator[str]:
    if isinstance(plan.nucleophile, NucleophileWord):
        yield _line(0, "nucleophile", plan.nucleophile.value)
    elif plan.nucleophile is not None:
        yield _line(0, "nucleophile")
        yield from _charged(2, plan.nucleophile, plan.equivalents, plan)
    elif plan.base is None:
        yield _line(0, "nucleophile", "", "or one of the words solvent, internal, none; a base goes under base:")
        yield _line(2, "name", GAP)
        yield _line(2, "smiles", quoted(GAP), "with its counter-ion")
        yield _line(2, "equivalents", GAP, _RATIO_HINT)
    if plan.base is not None:
        alone = plan.nucleophile is None or isinstance(plan.nucleophile, NucleophileWord)
        yield _line(0, "base")
        yield from _charged(2, plan.base, plan.base_equivalents or (plan.equivalents if alone else None), plan)
    if plan.reagents:
        yield _line(0, "reagents")
    for reagent in plan.reagents:
        first, *rest = _identity(4, reagent.compound)
        yield f"  - {first.strip()}"
        yield from rest
        yield _line(4, "use", reagent.use.value)
        yield _line(4, "equivalents", GAP, _RATIO_HINT)


_RATIO_HINT = "to one of substrate, such as 1.5; or mass:, amount: or volume: with its unit"


def _charged(indent: int, compound: Identified, equivalents: Decimal | None, plan: Plan) -> Iterator[str]:
    yield from _identity(indent, compound)
    if equivalents is None:
        yield _line(indent, "equivalents", GAP, _RATIO_HINT)
        return
    yield _line(indent, "equivalents", f"{equivalents}", _taken(plan, _weighed(compound, equivalents, plan)))


def _weighed(compound: Identified, equivalents: Decimal, plan: Plan) -> str:
    moles = moles_of(plan)
    if moles is None:
        return ""
    moles *= float(equivalents)
    structure = compound.structure
    mass = "" if structure is None or structure.charge else f" = {_grams(moles * structure.mass)}"
    return f"{1000 * moles:.4g} mmol{mass}"


def _taken(plan: Plan, said: str = "") -> str:
    """Return where a value comes from: an entry, to be checked."""
    origin = f"from {plan.origin}, check" if plan.origin else ""
    return "; ".join(filter(None, (said, origin)))


def _solvents(plan: Plan) -> Iterator[str]:
    if plan.is_neat:
        yield _line(0, "neat", "true")
        return
    yield _line(0, "solvent")
    for solvent in plan.solvents or (PlannedSolvent(name=""),):
        hint = "such as DMF; or neat: true in place of solvent:"
        yield f"  - {_line(0, 'name', _text(solvent.name), _open_only(solvent.name, hint))}"
        if solvent.fraction:
            yield _line(4, "fraction", solvent.fraction)
        else:
            yield _line(4, "volume", solvent.volume or GAP, _taken(plan) if solvent.volume else "mL")
    if any(solvent.fraction for solvent in plan.solvents):
        yield _line(0, "concentration", GAP, "mol/L of substrate in the solvents together, such as 0.5 mol/L")


def _stages(plan: Plan) -> Iterator[str]:
    yield _line(0, "stages", "", _taken(plan))
    for stage in plan.stages:
        first, *rest = _stage(stage, plan)
        yield f"  - {first.lstrip()}"
        yield from rest


def _stage(stage: PlannedStage, plan: Plan) -> Iterator[str]:
    """Yield the lines of a stage; the first is a key, so that the dash of the list may stand before it."""
    if stage.add:
        yield _line(4, "add")
        yield from (f"      - {_text(name)}" for name in stage.add)
    hint = "°C, such as 60 °C, or 0 °C to 25 °C for a ramp"
    yield _line(4, "temperature", stage.temperature or GAP, _open_only(stage.temperature, hint))
    yield _line(4, "time", stage.time or GAP, _open_only(stage.time, "h, min or d, such as 16 h"))
    if not stage.add:
        yield "    # add: [names of the substances above, in the order they went in]"
    if stage.over:
        yield _line(4, "over", stage.over)
    yield _line(4, "measured", stage.measured) if stage.measured else f"    # measured: {_words(Thermometer)}"
    yield _line(4, "vessel", stage.vessel) if stage.vessel else f"    # vessel: {_words(Vessel)}"
    yield _line(4, "atmosphere", _text(stage.atmosphere)) if stage.atmosphere else "    # atmosphere: such as nitrogen"
    if stage.pressure:
        yield _line(4, "pressure", stage.pressure)
    yield "    # end_point: what was measured, and the number at which it was stopped"
    yield from (f"    # {plan.origin}, {was}" for was in stage.was)


def _work_up(plan: Plan, warnings: Mapping[int, Sequence[str]]) -> Iterator[str]:
    if not plan.work_up:
        yield "# work_up:"
        yield "#   - the quench first, with amounts and temperature"
        return
    yield _line(0, "work_up", "", _taken(plan, "amounts are for the scale there"))
    for place, step in enumerate(plan.work_up):
        yield from (f"  # {warning}" for warning in warnings.get(place, ()))
        yield f"  - {_text(step)}"


def _outcome(expected: Sequence[Expected], forecast: Forecast | None) -> Iterator[str]:
    yield _line(0, "outcome")
    yield _line(2, "result", f"[{GAP}]", _words(Result))
    hint = "" if forecast is None else f"forecast {forecast.mechanism}, {forecast.course}; "
    yield f"  # claim:  # {hint}what you hold happened, and the evidence"
    yield f"  #   mechanism: {_words(Mechanism)}"
    yield f"  #   course: {_words(Course)}"
    yield "  #   basis: []"
    yield _line(2, "products", "", f"of {_words(Result, but=_GIVES)}: none, but sought: '…'")
    for label, product in zip(LABELS, expected, strict=False):
        yield from _product(label, product)
    if not expected:
        yield from _open_product()
    yield _line(2, "measured")
    yield f"    - {_line(0, 'yield', GAP, 'such as 88 %; add mass: in g')}"
    yield _line(6, "of", LABELS[0])
    yield _line(6, "kind", GAP, _words(YieldKind))
    yield "    # - {conversion: 99 %, by: GC}"
    if any(product.stereo is None or product.stereo is StereoKind.SINGLE_ENANTIOMER for product in expected[:1]):
        yield "    # - {ee: 97 %, of: A, by: chiral HPLC}"


_GIVES = tuple(result for result in Result if result.gives_products)


def _product(label: str, product: Expected) -> Iterator[str]:
    compound = identified(product.structure)
    yield f"    - {_line(0, 'label', label, product.said)}"
    yield _line(6, "name", _text(compound.name), _open_only(compound.name, "as your group calls it"))
    yield _line(6, "smiles", quoted(compound.smiles))
    yield _line(6, "use", ProductUse.DESIRED if product.is_desired else ProductUse.BY_PRODUCT)
    if product.stereo is not None:
        yield _line(6, "stereo", product.stereo.value)
    elif product.structure.stereocentres.total:
        yield _line(6, "stereo", GAP, _words(StereoKind, but=(StereoKind.ACHIRAL,)))


def _open_product() -> Iterator[str]:
    yield "    - label: A"
    yield _line(6, "name", GAP, "of the product that was wanted")
    yield _line(6, "smiles", quoted(GAP))
    yield _line(6, "use", ProductUse.DESIRED)


def _tail(plan: Plan) -> Iterator[str]:
    yield "# evidence: [1H NMR]"
    yield "# take_away: one sentence a colleague reads in a list"
    if plan.origin or plan.nearest:
        yield _line(0, "related", f"[{plan.origin or plan.nearest}]", "" if plan.origin else "the nearest entry")
