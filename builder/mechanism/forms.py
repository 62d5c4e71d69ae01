"""Forms: the hydrates and salts a substance may have been weighed as, with their molar masses; loads forms.tsv."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from enum import StrEnum
from functools import cache

from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure, parse_smiles
from builder.table import NOTHING, refuse_twice, rows_of, table_text

__all__ = ["Form", "FormKind", "forms_of", "forms_that_fit", "hydrate_waters", "partner_count"]

_BASIC_NITROGEN = Fragment.from_smarts("[$([NX3;+0;!$(N-[C,S,P]=[O,S,N]);!$(N~[N,O])]),$([nX2;+0]),$([NX2;+0]=C)]")
_ACIDIC = Fragment.from_smarts(
    "[$([OX2;H1]-[C,S,P]=[OX1]),$([OX2;H1]-c),$([SX2;H1]),$([NX2;H1]=[N+]=[N-]),$([CX2;H1]#N),$([F,Cl,Br,I;H1;D0]),"
    "$([nX3;H1]),$([NX3;H1](-[C,S]=O)-[C,S]=O)]"
)
_PROTON_G_MOL = 1.008


class FormKind(StrEnum):
    """What the partner is to the substance."""

    WATER = "water"
    ACID = "acid"
    CATION = "cation"


@dataclass(frozen=True, slots=True)
class Form:
    """One form of a substance; molar_mass in g/mol, with everything that belongs to it."""

    name: str
    molar_mass: float


@dataclass(frozen=True, slots=True)
class _Partner:
    name: str
    kind: FormKind
    structure: Structure
    ion: str
    count: float

    @property
    def mass(self) -> float:
        """Return the molar mass of the partners of one substance."""
        return self.count * self.structure.mass


def forms_that_fit(structure: Structure, molar_mass: float, tolerance: float) -> tuple[Form, ...]:
    """Return the other forms of a substance whose molar mass is within `tolerance` (relative), nearest first."""
    found = [form for form in forms_of(structure) if abs(form.molar_mass / molar_mass - 1.0) <= tolerance]
    return tuple(sorted(found, key=lambda form: abs(form.molar_mass / molar_mass - 1.0)))


def forms_of(structure: Structure) -> tuple[Form, ...]:
    """Return the other forms in which a substance may be on the balance.

    structure: as drawn, a salt or hydrate included. Hydrates of salts and acids, the anhydrous form; hydrochlorides
    and the like of what has basic nitrogen; of a salt the free base, free acid, bare anion and other cations; of an
    acid its salts.
    """
    return tuple(form for form in _all_forms(structure) if abs(form.molar_mass - structure.mass) > 0.05)


def _all_forms(structure: Structure) -> Iterator[Form]:
    waters = partner_count(structure, "monohydrate")
    dry = structure.mass - waters * _partners()["monohydrate"].mass
    if waters:
        yield Form("the anhydrous form", dry)
    if len(structure.fragments) > 1 or not structure.elements.get("C") or _ACIDIC.is_in(structure):
        yield from (Form(f"the {each.name}", dry + each.mass) for each in _of(FormKind.WATER))
    yield from _forms_of_base(structure, dry)
    yield from _forms_of_acid(structure, dry)


def _forms_of_base(structure: Structure, dry: float) -> Iterator[Form]:
    free, held = dry, 0.0
    for each in _of(FormKind.ACID):
        if each.count == 1 and (number := _acids_in(structure, each)):
            free, held = free - number * each.mass, held + number
    if held:
        yield Form("the free base", free)
    if held or _BASIC_NITROGEN.is_in(structure):
        yield from (Form(f"the {each.name}", free + each.mass) for each in _of(FormKind.ACID))


def _forms_of_acid(structure: Structure, dry: float) -> Iterator[Form]:
    cations = {each: partner_count(structure, each.name) for each in _of(FormKind.CATION)}
    number = sum(cations.values())
    if number and not any(_acids_in(structure, each) for each in _of(FormKind.ACID)):
        anion = dry - sum(count * each.mass for each, count in cations.items())
        yield Form("the anion alone", anion)
        yield Form("the free acid", anion + number * _PROTON_G_MOL)
        others = (each for each, count in cations.items() if not count)
        yield from (Form(f"the {each.name}", anion + number * each.mass) for each in others)
    elif not structure.charge and _ACIDIC.is_in(structure):
        yield from (Form(f"the {each.name}", dry - _PROTON_G_MOL + each.mass) for each in cations)


def partner_count(structure: Structure, name: str) -> int:
    """Return how many of the partner of a form (by its name in the table) stand beside the substance as drawn.

    Water, acid and cation are each known by their own piece; an acid also as its anion beside a protonated base.
    """
    partner = _partners()[name]
    if partner.kind is FormKind.ACID:
        return _acids_in(structure, partner)
    alone = len(structure.fragments) == 1
    return 0 if alone else sum(piece.smiles == partner.structure.smiles for piece in structure.fragments)


def hydrate_waters() -> Mapping[str, float]:
    """Return the molecules of water in each hydrate by its name: 2 for the dihydrate."""
    return {each.name: each.count for each in _of(FormKind.WATER)}


def _acids_in(structure: Structure, acid: _Partner) -> int:
    pieces = structure.fragments
    protonated = any(piece.charge > 0 and "H" in piece.smiles for piece in pieces)
    wanted = {acid.structure.smiles} | ({acid.ion} if protonated else set())
    return 0 if len(pieces) == 1 else sum(piece.smiles in wanted for piece in pieces)


@cache
def _of(kind: FormKind) -> tuple[_Partner, ...]:
    return tuple(each for each in _partners().values() if each.kind is kind)


@cache
def _partners() -> dict[str, _Partner]:
    name = "forms.tsv"
    rows = list(
        rows_of(name, table_text("builder.mechanism", name), ("name", "kind", "smiles", "ion", "count", "source"))
    )
    refuse_twice(name, "form", [row["name"] for row in rows])
    return {
        row["name"]: _Partner(
            name=row["name"],
            kind=FormKind(row["kind"]),
            structure=parse_smiles(row["smiles"]),
            ion=row["ion"] if row["ion"] == NOTHING else parse_smiles(row["ion"]).smiles,
            count=float(row["count"]),
        )
        for row in rows
    }
