"""Records as honest people write them: the entries of the demonstration book on another scale, rounded as one rounds.

Each substance gets cross-checks beside the quantity that the entry holds: mass, amount, equivalents, the volume of a
solution, the concentration, the mass of product. They are worked out here from molar masses of a second toolkit
(epam-indigo) and rounded to two, three or four digits, so that a check that fires on rounding is found out.
"""

import math
import random
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from decimal import Decimal
from functools import cache
from io import StringIO
from pathlib import Path
from typing import Any

from indigo import Indigo
from ruamel.yaml import YAML

from builder.checks.group import GROUP_CHECKS

COUNT = 200
ENTRIES = Path(__file__).parents[1] / "entries"
_OTHERS = ("related", "preceded_by", "superseded", "withdrawn")
"""What names other entries, which a record on its own does not have beside it; nor the house rules of a book."""
_BETWEEN_RECORDS = {check.id for check in GROUP_CHECKS}
_SCALED = {"mass": "mg g kg", "amount": "µmol mmol mol", "volume": "µL mL L", "vessel_volume": "µL mL L"}
_IN_SI = {"mg": 1e-3, "g": 1.0, "kg": 1e3, "µmol": 1e-6, "mmol": 1e-3, "mol": 1.0, "µL": 1e-6, "mL": 1e-3, "L": 1.0}


@dataclass(frozen=True, slots=True)
class Honest:
    """A record: its identifier, its document for changes, round trip."""

    entry: str
    document: Any

    @property
    def text(self) -> str:
        """Return it as YAML."""
        return dump(self.document)


def load(text: str) -> Any:
    """Read a document that can be changed and written again with its quotes and comments."""
    return _yaml().load(text)


def dump(document: Any) -> str:
    """Write a document."""
    stream = StringIO()
    _yaml().dump(document, stream)
    return stream.getvalue()


def _yaml() -> YAML:
    yaml = YAML()
    yaml.preserve_quotes = True
    yaml.width = 4096
    yaml.indent(mapping=2, sequence=4, offset=2)
    return yaml


@cache
def entry_texts() -> dict[str, str]:
    """Return the entries in force of the demonstration book, by identifier, as YAML."""
    texts = {path.stem: path.read_text("utf-8") for path in sorted(ENTRIES.rglob("NS*.yml"))}
    return {entry: text for entry, text in texts.items() if "\nstatus: current\n" in text}


def honest_records(seed: int, numbers: Iterable[int]) -> Iterator[Honest]:
    """Yield records on another scale, with honest cross-checks; each number stands for one of them."""
    entries = sorted(entry_texts())
    for number in numbers:
        yield honest_record(entries[number % len(entries)], random.Random(f"{seed} {number}"))


def honest_record(entry: str, rng: random.Random) -> Honest:
    """Return one entry on a scale between a third of its own and its own, with cross-checks."""
    document = load(entry_texts()[entry])
    for key in _OTHERS:
        document.pop(key, None)
    _accept_only(document, lambda finding: finding not in _BETWEEN_RECORDS and not finding.startswith("house-"))
    scale = rng.uniform(1 / 3, 1.0)
    substances = list(_charged(document))
    for substance in (*substances, *document.get("solvent", [])):
        _rescale(substance, scale, rng)
    for stage in document["stages"]:
        _rescale(stage, scale, rng)
    moles = _moles(document["substrate"])
    for substance in substances:
        _cross_check(substance, moles, rng)
    if moles is not None:
        _concentrate(document, moles, rng)
        _weigh_products(document, moles, rng)
    return Honest(entry, document)


def rounded(value: float, digits: int) -> str:
    """Return a positive number with that many significant digits, without an exponent."""
    places = max(0, digits - 1 - math.floor(math.log10(value)))  # 102 is never written 100, which claims three digits
    return f"{Decimal(repr(value)).quantize(Decimal(1).scaleb(-places)):f}"


def quantity(value_si: float, key: str, digits: int) -> str:
    """Return a mass in g, an amount in mol or a volume in L as people write it: 2.08 g, 9.95 mmol, 380 µL."""
    units = _SCALED[key].split()
    unit = next((unit for unit in reversed(units) if value_si >= _IN_SI[unit]), units[0])
    return f"{rounded(value_si / _IN_SI[unit], digits)} {unit}"


def in_si(text: str) -> float:
    """Return "2.08 g" in g, mol or L."""
    number, unit = str(text).split()
    return float(number) * _IN_SI[unit.replace("μ", "µ")]


def molar_mass(smiles: str) -> float:
    """Return g/mol by epam-indigo, whose atomic weights are IUPAC's."""
    mass: float = _indigo().loadMolecule(smiles).molecularWeight()
    return mass


@cache
def _indigo() -> Indigo:
    return Indigo()


def _charged(document: Any) -> Iterator[Any]:
    """Yield the substances of a document, solvents apart."""
    yield document["substrate"]
    for key in ("nucleophile", "base", "reagents"):
        listed = document.get(key)
        yield from listed if isinstance(listed, list) else [listed] if isinstance(listed, dict) else []


def _accept_only(document: Any, is_asked: Callable[[str], bool]) -> None:
    kept = [each for each in document.pop("accepted", []) if is_asked(each["finding"])]
    if kept:
        document["accepted"] = kept


def _rescale(mapping: Any, scale: float, rng: random.Random) -> None:
    for key in _SCALED.keys() & mapping.keys():
        mapping[key] = quantity(in_si(mapping[key]) * scale, key, rng.choice((3, 4)))


def _moles(substance: Any, substrate_moles: float | None = None) -> float | None:
    """Return mol by the first of mass, amount, volume, equivalents, as the format says."""
    strength, unit = str(substance.get("strength", "100 %")).split()
    is_molar = unit != "%"
    share = percent_of(substance, "purity") * (1.0 if is_molar else float(strength) / 100)
    if "mass" in substance:
        return in_si(substance["mass"]) * share / molar_mass(substance["smiles"]) if "smiles" in substance else None
    if "amount" in substance:
        return in_si(substance["amount"])
    if "volume" in substance:
        if is_molar:
            return in_si(substance["volume"]) * float(strength)
        if "density" in substance and "smiles" in substance:
            grams = in_si(substance["volume"]) * 1e3 * float(substance["density"].split()[0])
            return grams * share / molar_mass(substance["smiles"])
        return None
    if "equivalents" in substance and substrate_moles is not None:
        return float(str(substance["equivalents"]).split()[0]) * substrate_moles
    return None


def _cross_check(substance: Any, substrate_moles: float | None, rng: random.Random) -> None:
    """Add what the entry leaves to be derived, rounded; the quantity that is used stays the one it was."""
    moles = _moles(substance, substrate_moles)
    if moles is None or not moles:
        return
    order = ("mass", "amount", "volume", "equivalents")
    used = next(key for key in order if key in substance)
    later = order[order.index(used) + 1 :]
    if "amount" in later and "amount" not in substance:
        substance["amount"] = quantity(moles, "amount", rng.choice((2, 3, 3, 4)))
    has_equivalents = substrate_moles and "leaving_group" not in substance
    if "equivalents" in later and "equivalents" not in substance and has_equivalents:
        typed = rounded(moles / substrate_moles, rng.choice((2, 3)))
        substance["equivalents"] = float(typed) if "." in typed else int(typed)


def _concentrate(document: Any, moles: float, rng: random.Random) -> None:
    volumes = [solvent.get("volume") for solvent in document.get("solvent", [])]
    if volumes and all(volumes) and "concentration" not in document:
        litres = sum(in_si(volume) for volume in volumes)
        document["concentration"] = f"{rounded(moles / litres, rng.choice((2, 3)))} mol/L"


def _weigh_products(document: Any, moles: float, rng: random.Random) -> None:
    """Give isolated yields the mass they stand for."""
    smiles = {product["label"]: product.get("smiles") for product in document["outcome"].get("products", [])}
    for line in document["outcome"].get("measured", []):
        labels = line["of"] if isinstance(line.get("of"), list) else [line.get("of")]
        if line.get("kind") != "isolated" or not all(smiles.get(label) for label in labels):
            continue
        percent = float(str(line["yield"]).split()[0])
        grams = moles * percent / 100 * molar_mass(smiles[labels[0]]) / percent_of(line, "purity")
        line["mass"] = quantity(grams, "mass", rng.choice((3, 4)))


def percent_of(mapping: Any, key: str) -> float:
    """Return a typed percentage as a fraction; 1 where there is none."""
    return float(str(mapping.get(key, "100 %")).split()[0]) / 100
