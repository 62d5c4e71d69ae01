"""The demonstration book: free of errors and open queries, wide enough, and read alike by a second toolkit."""

import itertools
import operator
from collections import defaultdict
from functools import cache
from pathlib import Path

import pytest
from indigo import Indigo
from indigo.inchi import IndigoInchi

from builder.book import Book, Entry, Verdict, open_book
from builder.checks.case import Case
from builder.checks.kinship import Kin, Relation, families
from builder.checks.standing import Standing, Variable
from builder.chemistry.patterns import load_attack_patterns
from builder.chemistry.perception import (
    attacking_atoms,
    leaving_group_names,
    neighbouring_groups,
    perceive_sites,
    site_class_names,
)
from builder.chemistry.structure import Structure, parse_smiles
from builder.finding import Level
from builder.mechanism.kinds import load_kinds
from builder.mechanism.solvents import find_solvent
from builder.records.vocabulary import Mechanism, NucleophileWord, Result, Status
from tests.specimens import TODAY

ENTRIES = Path(__file__).parents[1] / "entries"


@cache
def _book() -> Book[Case]:
    return open_book(ENTRIES, today=TODAY)


@cache
def _indigo() -> tuple[Indigo, IndigoInchi]:
    indigo = Indigo()
    return indigo, IndigoInchi(indigo)


def _products(entry: Entry[Case]) -> list[Structure]:
    return [
        entry.kept.structures[("outcome", "products", index)] for index in range(len(entry.record.outcome.products))
    ]


def test_it_has_no_error_and_no_open_query() -> None:
    heavy = [f for f in _book().findings if f.accepted is None and f.level in {Level.ERROR, Level.QUERY}]
    assert [(finding.rule, str(finding.place)) for finding in heavy] == []


def test_every_file_is_an_entry() -> None:
    assert len(_book().entries) == len(_book().files) >= 48


def test_it_is_marked_as_invented() -> None:
    settings = _book().settings
    assert settings.invented
    assert settings.notice is not None
    assert "invented" in settings.notice


# --- what it spans: every row of the pattern tables has an entry, or stands here with the reason why not -----------

CLASSES_NOT_SHOWN = {
    "alpha-nitro": "alpha-halo nitro compounds go by electron transfer or attack at halogen, none of our mechanisms",
    "acyl": "acid derivatives react at the carbonyl group, which no record of this kind describes",
}

LEAVING_GROUPS_NOT_SHOWN = {
    "nonaflate": "stands to the triflate as brosylate to tosylate; used where a triflate would be",
    "tresylate": "lies between mesylate and triflate, and serves to bind proteins to columns",
    "fluorosulfonate": "methyl fluorosulfonate is lethal and no longer sold",
    "perchlorate": "esters of perchloric acid detonate",
    "trifluoroacetate": "whatever would displace it takes the acyl carbon",
    "carbonate": "leaves under palladium, or above 150 °C with the carbonate itself as solvent",
    "carbamate": "leaves in deprotection only, where the other half is what is wanted",
    "acyloxonium": "a bridged ion, never charged; it is on the way in the acetolysis of the acetoxy tosylate",
    "phenonium": "a bridged ion, never charged; it is on the way in the acetolysis of the phenylbutyl brosylate",
    "halonium": "a bridged ion, never charged; it is on the way from bromohydrin to meso dibromide",
    "iodonium": "alkyl iodonium ions live for seconds, and the vinyl ones are no bench reagents",
    "amine oxide": "leaves in a pericyclic syn elimination, none of our mechanisms",
    "sulfoxide": "leaves in a pericyclic syn elimination, none of our mechanisms",
    "selenoxide": "leaves in a pericyclic syn elimination, none of our mechanisms",
    "xanthate": "leaves in a pericyclic syn elimination, none of our mechanisms",
    "phosphonium": "leaves when hydroxide attacks phosphorus",
    "azide": "leaves from the best of cations only; nobody plans on it",
    "nitro": "leaves in E1cB just as the sulfone does, which is shown",
    "silyl ether": "is cleaved at silicon",
    "2,4-dinitrophenoxide": "kept to rate studies of glycosides",
    "ether": "leaves as protonated ether, which is shown",
    "sulfide": "leaves as sulfonium, which is shown",
    "thiol": "leaves as sulfonium, which is shown",
    "amine": "leaves as ammonium or diazonium, both shown",
}

KINDS_NOT_SHOWN = {
    "carbanion, nitrile": "goes as the 1,3-dicarbonyl carbanion does, which is shown",
    "cyclopentadienide": "the products change into one another and dimerise within hours",
    "selenolate": "toxic stench; thiolates show the same",
    "selenide": "toxic stench; sulfides show the same",
    "hydrosulfide": "lethal gas with any acid; thiourea and thioacetate make the thiol without it",
    "hydrogen sulfide": "lethal gas; thiourea and thioacetate make the thiol without it",
    "hydroperoxide": "alkyl peroxides explode",
    "hydrogen peroxide": "alkyl peroxides explode",
    "nitrate": "alkyl nitrates explode",
    "hydroxylamine anion": "goes as the oximate does, which is shown",
    "silanolate": "attacks carbonyl carbon and silicon in practice",
    "silanol": "attacks carbonyl carbon and silicon in practice",
    "cyanamide anion": "goes as the sulfonamide anion does, which is shown",
    "cyanate": "the isocyanate reacts on with whatever is there",
    "phosphite anion": "gives the phosphonate of the phosphite, which is shown",
    "sulfonate": "makes an alkylating agent of another one; the alcohol is the way to it",
    "enamine": "makes the bond of the enolate, which is shown",
    "ketone": "a neighbouring group too weak for a preparation",
    "ether": "a neighbouring group too weak for a preparation",
}

NEIGHBOURS = {
    "ester carbonyl": "NSGNYFAZQ",
    "amide": "NSWM9V6ZH",
    "arene": "NSSVE68C1",
    "alkene": "NSDW3KPCC",
    "organohalide": "NS0QZ38CC",
    "sulfide": "NS91A59ZT",
    "amine, tertiary": "NSWMKVE5F",
    "alcohol": "NSDYV4NVS",
    "carboxylic acid": "NSRYM0SAE",
}
"""A kind of neighbouring group, and the entry in which it helps."""


STRONG_BASES = {"organometallic", "metal amide"}
"""Kinds of base that take the proton of a weak carbon acid as well."""


def _kinds_charged(entry: Entry[Case]) -> set[str]:
    """Return the kinds of nucleophile and base as charged and, of an acid beside a base, as the base leaves it.

    Solvents count where the record names the solvent as nucleophile.
    """
    record, structures = entry.record, entry.kept.structures
    nucleophiles = [structures["nucleophile", place] for place in range(len(record.nucleophiles))]
    if record.nucleophile is NucleophileWord.SOLVENT:
        rows = (find_solvent(solvent.name) for solvent in record.solvents)
        nucleophiles = [parse_smiles(row.smiles) for row in rows if row is not None]
    bases = {kind for place in range(len(record.bases)) for kind in _kinds(structures["base", place])[:1]}
    depth = None if bases & STRONG_BASES else 1
    acids = {kind for species in nucleophiles for kind in _kinds(species)[:depth] if bases and load_kinds()[kind].anion}
    anions = {str(load_kinds()[kind].anion) for kind in acids}
    return {kind for species in nucleophiles for kind in _kinds(species)[:1]} | bases | acids | anions


def _kinds(species: Structure) -> list[str]:
    return [nucleophile.kind for nucleophile in attacking_atoms(species)]


@cache
def _shown() -> dict[str, frozenset[str]]:
    entries = _book().entries
    return {
        "class": frozenset(name for entry in entries for name in entry.record.substrate.classes),
        "leaving group": frozenset(entry.record.substrate.leaving_group for entry in entries),
        "kind": frozenset(kind for entry in entries for kind in _kinds_charged(entry)) | NEIGHBOURS.keys(),
    }


@pytest.mark.parametrize(
    ("what", "named", "not_shown"),
    [
        ("class", site_class_names(), CLASSES_NOT_SHOWN),
        ("leaving group", leaving_group_names(), LEAVING_GROUPS_NOT_SHOWN),
        ("kind", tuple(row.kind for row in load_attack_patterns()), KINDS_NOT_SHOWN),
    ],
)
def test_every_row_of_the_tables_has_an_entry_or_a_reason(
    what: str, named: tuple[str, ...], not_shown: dict[str, str]
) -> None:
    assert sorted(set(named) - _shown()[what] - not_shown.keys()) == []
    assert sorted(not_shown.keys() & _shown()[what]) == [], "shown after all: drop the reason"
    assert sorted(not_shown.keys() - set(named)) == [], "no such row"


def test_it_spans_mechanisms_and_results() -> None:
    outcomes = [entry.record.outcome for entry in _book().entries]
    assert {outcome.claim.mechanism for outcome in outcomes if outcome.claim} == set(Mechanism)
    assert {result for outcome in outcomes for result in outcome.result} == set(Result) - {Result.DECOMPOSITION}


# --- the cases a reader looks for ---------------------------------------------------------------------------------


@pytest.mark.parametrize(("kind", "id_"), NEIGHBOURS.items())
def test_a_neighbouring_group_is_shown_at_work(kind: str, id_: str) -> None:
    entry = _book().by_id[id_]
    assert entry.record.outcome.claim is not None
    assert entry.record.outcome.claim.mechanism is Mechanism.NGP
    assert kind in {neighbour.kind for neighbour in neighbouring_groups(entry.kept.substrate)}


@pytest.mark.parametrize("kind", ["nitrite", "phenoxide", "thiocyanate", "sulfinate", "azolide", "pyridone"])
def test_an_ambident_nucleophile_is_shown_with_both_products(kind: str) -> None:
    entries = [entry for entry in _book().entries if kind in _kinds_charged(entry)]
    assert any(_has_isomers(entry) for entry in entries)


def _has_isomers(entry: Entry[Case]) -> bool:
    formulas = [product.formula for product in _products(entry)]
    return len(set(formulas)) < len(formulas)


@pytest.mark.parametrize("kind", ["water", "alcohol", "carboxylic acid", "nitrile", "sulfoxide"])
def test_a_solvent_is_shown_as_nucleophile(kind: str) -> None:
    solvolyses = [entry for entry in _book().entries if entry.record.nucleophile is NucleophileWord.SOLVENT]
    assert any(kind in _kinds_charged(entry) for entry in solvolyses)


def test_solvolysis_rates_are_there() -> None:
    outcomes = [e.record.outcome for e in _book().entries if e.record.nucleophile is NucleophileWord.SOLVENT]
    assert sum(outcome.rate_constant is not None and outcome.time_course is not None for outcome in outcomes) >= 2


def test_epoxides_are_opened_by_base_and_by_acid() -> None:
    records = [entry.record for entry in _book().entries if entry.record.substrate.leaving_group == "epoxide"]
    assert {r.outcome.claim.mechanism for r in records if r.outcome.claim} >= {Mechanism.SN1, Mechanism.SN2}


def test_failures_are_there() -> None:
    failed = [entry for entry in _book().entries if entry.record.outcome.result == (Result.NO_REACTION,)]
    assert len(failed) >= 4
    assert all(entry.record.outcome.failure for entry in failed)


# --- links --------------------------------------------------------------------------------------------------------


def _lead_up(entry: Entry[Case]) -> list[Entry[Case]]:
    """Return the entries that lead to one, itself last, along the first of each `preceded_by`."""
    before = entry.record.preceded_by
    return [*(_lead_up(_book().by_id[before[0]]) if before else []), entry]


@pytest.mark.parametrize("entry", [e for e in _book().entries if e.record.preceded_by], ids=lambda entry: entry.id)
def test_a_step_takes_up_what_the_one_before_gave(entry: Entry[Case]) -> None:
    before, after = _lead_up(entry)[-2:]
    assert before.kept.structures["outcome", "products", 0] == after.kept.substrate
    assert before.record.performed.date <= after.record.performed.date


def test_a_sequence_runs_from_haloalkane_to_geminal_dihalide() -> None:
    wanted = ["primary", "alkene", "vicinal", "alkyne", "geminal"]
    assert any(_is_sequence(_lead_up(entry), wanted) for entry in _book().entries)


def _is_sequence(steps: list[Entry[Case]], wanted: list[str]) -> bool:
    stations = [*(step.kept.substrate for step in steps), _products(steps[-1])[0]] if _products(steps[-1]) else []
    classes = [{name for site in perceive_sites(station) for name in site.classes} for station in stations]
    return len(stations) == len(wanted) and all(map(operator.contains, classes, wanted))


def _related(status: Status = Status.CURRENT) -> list[tuple[Entry[Case], Entry[Case]]]:
    """Return the pairs of entries that name each other."""
    entries = [entry for entry in _book().entries if entry.record.status is status]
    pairs = itertools.combinations(entries, 2)
    return [(a, b) for a, b in pairs if b.id in (a.record.related or ()) and a.id in (b.record.related or ())]


def _in_force() -> dict[str, Standing]:
    return {entry.id: entry.standing for entry in _book().entries if not entry.record.status.is_retired}


def test_pairs_contradict_each_other_and_both_sides_say_why() -> None:
    near = _book().near_same
    pairs = {frozenset((one, other)): kin for one, other, kin in near if kin.relation is Relation.CONTRADICTS}
    assert frozenset(("NSE9RPEB2", "NSPZFX5QX")) in pairs  # peroxide in the alkene
    assert frozenset(("NSFZPQCJ2", "NSZ5DDC5X")) in pairs  # two equivalents of carbonate
    accepting = {e.id for e in _book().entries if "outcomes-contradict" in {a.finding for a in e.record.accepted}}
    assert accepting == frozenset().union(*pairs)
    assert all(kin.telling is not None for kin in pairs.values())


@pytest.mark.parametrize("variable", [Variable.SOLVENT, Variable.LEAVING_GROUP, Variable.SCALE])
def test_a_series_varies_one_thing_alone(variable: Variable) -> None:
    assert (variable,) in {kin.varied for kin in _kin() if kin.relation is Relation.VARIANT}


def test_a_run_is_repeated_by_other_hands() -> None:
    assert Relation.REPEATS in {kin.relation for kin in _kin()}


def _kin() -> list[Kin]:
    """Return what each is to each of its family, one way round."""
    standings = _in_force()
    near = {(one, other): kin for one, other, kin in _book().near_same}
    pairs = [(one, other) for one, others in families(standings.items()).items() for other in others if one < other]
    return [near.get(pair, Kin(Relation.VARIANT, standings[pair[0]], standings[pair[1]])) for pair in pairs]


def test_a_series_runs_through_leaving_groups() -> None:
    groups: defaultdict[Structure, set[str]] = defaultdict(set)
    for pair in _related():
        if _aim(pair[0]) == _aim(pair[1]):
            groups[_aim(pair[0])] |= {entry.record.substrate.leaving_group for entry in pair}
    assert max(map(len, groups.values())) >= 3


def _aim(entry: Entry[Case]) -> Structure:
    sought = entry.kept.structures.get(("outcome", "sought"))
    return sought or _products(entry)[0]


def test_one_entry_is_superseded_by_a_current_one_on_the_same_substrate() -> None:
    superseded = [entry for entry in _book().entries if entry.record.superseded]
    successors = [_book().by_id[e.record.superseded.by] for e in superseded if e.record.superseded]
    assert superseded
    assert all(entry.record.status is Status.CURRENT for entry in successors)
    assert [entry.kept.substrate for entry in superseded] == [entry.kept.substrate for entry in successors]


def test_one_entry_is_withdrawn_with_its_reason() -> None:
    assert any(entry.record.withdrawn for entry in _book().entries)


def test_an_explained_contrary_entry_shows_that_observation_outranks_theory() -> None:
    assert [entry.verdict for entry in _book().entries].count(Verdict.EXPLAINED) >= 1
    assert [entry.verdict for entry in _book().entries].count(Verdict.CONTRARY) == 0


# Outside reference: epam-indigo (PyPI), an independent toolkit with its own stereo perception and InChI binding.
@pytest.mark.parametrize("entry", _book().entries, ids=lambda entry: entry.id)
def test_a_second_toolkit_reads_every_product_alike(entry: Entry[Case]) -> None:
    indigo, inchi = _indigo()
    for product in _products(entry):
        read = indigo.loadMolecule(product.typed)
        assert inchi.getInchi(read) == product.inchi
        assert indigo.loadMolecule(product.typed).countStereocenters() == product.stereocentres.specified
