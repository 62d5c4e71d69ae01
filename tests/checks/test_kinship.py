"""Which entries belong together: derived, whatever the order of the records, and only within one reaction."""

from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from builder.checks import kinship
from builder.checks.comparison import are_near_same
from builder.checks.kinship import Kin, Relation, families, near_same_kin
from builder.checks.standing import Standing, Variable, standing_of
from builder.records.specimen import with_example
from tests.publish.handmade import case_of

ELIMINATED = """\
performed: {date: 2026-03-18, by: [bench-3]}
base: {name: potassium carbonate, smiles: '[K+].[K+].[O-]C([O-])=O', equivalents: 2.0}
outcome:
  result: [substitution]
  products: [{label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]', use: desired, stereo: racemate}]
  measured: [{yield: 52 %, of: A, kind: assay}]
"""
AGAIN = "performed: {date: 2026-03-18, by: [bench-3]}\n"
SUBSTRATE = "substrate: {{name: a, smiles: '{}', stereo: racemate, class: secondary, leaving_group: {}, amount: {}}}\n"
RELATIONS = {
    "itself": ("", Relation.DUPLICATES, ()),
    "once more": (AGAIN, Relation.REPEATS, ()),
    "with carbonate, and half of it eliminated": (ELIMINATED, Relation.CONTRADICTS, (Variable.BASE,)),
    "in DMSO": ("solvent: [{name: DMSO, volume: 20 mL}]\n", Relation.VARIANT, (Variable.SOLVENT,)),
    "two hours": (
        AGAIN + "stages: [{temperature: 60 °C, time: 2 h, vessel: open}]\n",
        Relation.VARIANT,
        (Variable.TIME,),
    ),
    "in two hours and hotter": (
        "stages: [{temperature: 80 °C, time: 2 h}]\n",
        Relation.VARIANT,
        (Variable.TEMPERATURE,),
    ),
    "hotter": ("stages: [{temperature: 80 °C, time: 16 h}]\n", Relation.VARIANT, (Variable.TEMPERATURE,)),
    "the chloride": (
        SUBSTRATE.format("CCC(C)Cl", "chloride", "10 mmol"),
        Relation.VARIANT,
        (Variable.LEAVING_GROUP,),
    ),
    "potassium azide": (
        AGAIN + "nucleophile: {name: potassium azide, smiles: '[K+].[N-]=[N+]=[N-]', equivalents: 1.5}\n",
        Relation.VARIANT,
        (Variable.NUCLEOPHILE,),
    ),
    "a mole": (
        AGAIN + SUBSTRATE.format("CCC(C)Br", "bromide", "1 mol") + "solvent: [{name: DMF, volume: 2 L}]\n",
        Relation.VARIANT,
        (Variable.SCALE,),
    ),
}


def _standing(example: str = "") -> Standing:
    return standing_of(case_of(with_example(example)))


def _kin(one: Standing, other: Standing) -> Kin:
    """Return what the second is to the first, both of one transformation."""
    near = near_same_kin([("one", one), ("other", other)])
    return next((kin for _, _, kin in near), Kin(Relation.VARIANT, one, other))


@pytest.mark.parametrize(
    ("example", "relation", "varied"), [pytest.param(*row, id=name) for name, row in RELATIONS.items()]
)
def test_what_an_entry_is_to_another(example: str, relation: Relation, varied: tuple[Variable, ...]) -> None:
    one, other = _standing(), _standing(example)
    for kin in (_kin(one, other), _kin(other, one)):
        assert (kin.relation, kin.varied) == (relation, varied)
    assert _kin(one, other).mirrored == _kin(other, one)


BOOK = {name: _standing(example) for name, (example, _, _) in RELATIONS.items()}
ELIMINATES = "with carbonate, and half of it eliminated"


@given(st.permutations(list(BOOK)))
def test_the_order_of_the_records_does_not_matter(order: list[str]) -> None:
    near = near_same_kin((name, BOOK[name]) for name in order)
    pairs = {frozenset((one, other)) for one, other, kin in near if kin.relation is Relation.CONTRADICTS}
    assert pairs == {frozenset((ELIMINATES, name)) for name in ("itself", "once more", "potassium azide", "a mole")}


def test_a_family_is_one_transformation() -> None:
    book = {"A": _standing(), "B": _standing(AGAIN), "C": replace(_standing(), transformation=""), "D": _standing()}
    assert families(book.items()) == {"A": ("B", "D"), "B": ("A", "D"), "D": ("A", "B")}


def test_only_entries_of_one_reaction_are_compared(monkeypatch: pytest.MonkeyPatch) -> None:
    compared = []

    def counting(one: Standing, other: Standing) -> bool:
        compared.append((one.key, other.key))
        return are_near_same(one, other)

    monkeypatch.setattr(kinship, "are_near_same", counting)
    standing = _standing()
    book = [(str(n), replace(standing, key=f"reaction {n // 2}")) for n in range(1000)]
    assert len(list(near_same_kin(book))) == len(compared) == 500
