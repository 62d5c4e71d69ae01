"""What must hold for every forecast, over the open outcome cases."""

import math
import random
from collections import Counter
from collections.abc import Iterator
from dataclasses import replace
from functools import cache

import pytest
from rdkit import Chem

from builder.chemistry.perception import perceive_sites
from builder.chemistry.structure import Structure, parse_smiles
from builder.mechanism.answer import answer_of
from builder.mechanism.asking import question_from_line
from builder.mechanism.engine import open_pathways, predict
from builder.mechanism.flask import fill_flask
from builder.mechanism.forecast import Forecast
from builder.mechanism.observations.tables import Channel, Mixture, load_rates
from builder.mechanism.observing import SilentError, see_channel
from builder.mechanism.pathways.pathway import Pathway
from builder.mechanism.question import Question
from builder.mechanism.rate_terms import Parameters, fitted_parameters, load_rate_terms
from builder.records.vocabulary import Mechanism
from tests.outcomes import Case, CaseSet, load_cases

PARAMETERS = fitted_parameters()
ELIMINATIONS = frozenset({Mechanism.E2, Mechanism.E1, Mechanism.E1CB})
ROUNDING = 1e-9


@cache
def asked(which: CaseSet = CaseSet.OPEN) -> tuple[tuple[Case, Question], ...]:
    """Return the cases of a set as questions."""
    return tuple((case, question_from_line(case).question) for case in load_cases(which))


@cache
def forecasts() -> tuple[tuple[Question, Forecast], ...]:
    return tuple((question, predict(question)) for _, question in asked())


def answered() -> Iterator[tuple[Question, Forecast]]:
    yield from ((q, f) for q, f in forecasts() if f.shares)


def test_almost_every_case_is_covered() -> None:
    assert sum(1 for _ in answered()) > 100


# --- how a question is written does not matter ----------------------------------------------------------------


def rewritten(smiles: str, seed: int) -> str:
    (text,) = Chem.MolToRandomSmilesVect(Chem.MolFromSmiles(smiles), 1, seed)
    return str(text)


def test_renumbering_and_rewriting_the_smiles_changes_nothing() -> None:
    draw = random.Random(7)
    changed = 0
    for case, question in asked():
        written = {key: case[key] for key in ("substrate", "nucleophile_smiles") if case.get(key)}
        again = {key: rewritten(smiles, draw.randrange(1 << 30)) for key, smiles in written.items()}
        changed += again != written
        other = question_from_line(dict(case) | again).question
        assert answer_of(predict(other)) == answer_of(predict(question)), (case["id"], again)
    assert changed > 80


def test_the_order_of_solvents_and_additives_changes_nothing() -> None:
    several = [c for c, _ in asked() if len(c["solvent"]) > 1 or len(c["additives"]) > 1]
    assert len(several) > 10
    for case in several:
        turned = dict(case) | {"solvent": case["solvent"][::-1], "additives": case["additives"][::-1]}
        one, other = (answer_of(predict(question_from_line(c).question)) for c in (case, turned))
        assert one["mechanism"] == other["mechanism"], case["id"]
        assert one["shares"] == pytest.approx(other["shares"], abs=1e-3), case["id"]
        assert [p["smiles"] for p in one["products"]] == [p["smiles"] for p in other["products"]], case["id"]


# --- the mirror image -----------------------------------------------------------------------------------------


def mirrored(question: Question) -> Question:
    def turned(structure: Structure) -> Structure:
        return structure.mirror_image

    changes = {
        name: replace(each, structure=turned(each.structure))
        for name in ("nucleophile", "base")
        if (each := getattr(question, name)) is not None
    }
    return replace(question, substrate=turned(question.substrate), **changes)


def test_the_mirror_image_gives_the_mirror_image() -> None:
    chiral = [q for which in CaseSet for _, q in asked(which) if q.substrate.mirror_image != q.substrate]
    assert len(chiral) > 50
    for question in chiral:
        forecast, image = predict(question), predict(mirrored(question))
        assert image.mechanism is forecast.mechanism
        assert image.shares == pytest.approx(forecast.shares, abs=ROUNDING)
        assert image.log_k == pytest.approx(forecast.log_k, abs=ROUNDING)
        here = {(p.structure.mirror_image, p.mechanism): p.share for p in forecast.products}
        there = {(p.structure, p.mechanism): p.share for p in image.products}
        assert there == pytest.approx(here, abs=ROUNDING), question.substrate.smiles
        assert image.course is forecast.course


def test_an_achiral_flask_gives_no_enantiomer_alone() -> None:
    # One stereocentre is drawn flat; of two or more either mirror image stands for the racemate, but not both.
    for question, forecast in answered():
        if not question.substrate.is_achiral:
            continue
        products = [p.structure for p in forecast.products]
        assert all(p.stereocentres.total != 1 or not p.stereocentres.specified for p in products)
        chiral = [p for p in products if p.mirror_image != p]
        assert not {p.mirror_image for p in chiral} & set(chiral)


# --- shares ---------------------------------------------------------------------------------------------------


def test_shares_add_up_to_one_and_lie_in_their_intervals() -> None:
    for question, forecast in answered():
        assert math.fsum(forecast.shares.values()) == pytest.approx(1, abs=1e-5), question.substrate.smiles
        assert forecast.intervals.keys() == forecast.shares.keys()
        for mechanism, share in forecast.shares.items():
            low, high = forecast.intervals[mechanism]
            assert 0 <= low <= share + ROUNDING
            assert share - ROUNDING <= high <= 1


def test_an_interval_is_open_wherever_two_mechanisms_compete() -> None:
    for question, forecast in answered():
        for mechanism, share in forecast.shares.items():
            low, high = forecast.intervals[mechanism]
            if 0.01 < share < 0.99:
                assert low < share < high, (question.substrate.smiles, mechanism)


def test_conversion_lies_in_its_interval_and_times_follow_each_other() -> None:
    for _, forecast in answered():
        low, high = forecast.conversion_interval
        assert 0 <= low <= forecast.conversion + ROUNDING
        assert forecast.conversion - ROUNDING <= high <= 1
        assert forecast.half_life_s is not None
        assert forecast.half_life_s <= (forecast.t95_s or math.inf) <= (forecast.t99_s or math.inf)


def test_none_means_that_less_than_one_in_twenty_would_react() -> None:
    for _, forecast in answered():
        assert (forecast.mechanism is Mechanism.NONE) == (forecast.conversion < 0.05)
        assert bool(forecast.products) == (forecast.mechanism is not Mechanism.NONE)


def test_products_share_what_their_mechanism_has() -> None:
    for question, forecast in answered():
        if not forecast.products:
            continue
        found: Counter[Mechanism] = Counter()
        for product in forecast.products:
            found[product.mechanism] += product.share
        for mechanism, share in found.items():
            assert share <= forecast.shares[mechanism] + 1e-6
        assert math.fsum(found.values()) == pytest.approx(1, abs=0.03), question.substrate.smiles
        assert forecast.products[0].mechanism is forecast.mechanism
        keys = [(p.structure, p.mechanism) for p in forecast.products]
        assert len(set(keys)) == len(keys)


# --- products -------------------------------------------------------------------------------------------------


def all_products() -> Iterator[tuple[Question, Mechanism, Structure]]:
    for question, forecast in answered():
        yield from ((question, p.mechanism, p.structure) for p in forecast.products)


def test_products_are_canonical() -> None:
    for _, _, product in all_products():
        assert parse_smiles(product.smiles).smiles == product.smiles
        assert Chem.CanonSmiles(product.smiles) == product.smiles
        assert not product.radical_electrons
        assert "." not in product.smiles


def elements(structure: Structure) -> Counter[str]:
    count = Counter(atom.symbol for atom in structure.atoms)
    count["H"] += sum(atom.hydrogens for atom in structure.atoms)
    return count


def test_products_hold_no_atom_that_was_not_charged() -> None:
    for question, mechanism, product in all_products():
        flask = fill_flask(question, PARAMETERS)
        mine = elements(product)
        if mechanism in ELIMINATIONS:
            assert mine <= elements(question.substrate), product.smiles
            continue
        # at most two partners: a second addition, or a bridged ion opened by what closed it
        partners = [elements(a.nucleophile.species) + Counter({"H": 2}) for a in flask.attackers]
        partners += [one + other for one in partners for other in partners]
        assert any(mine <= elements(question.substrate) + partner for partner in [Counter[str](), *partners]), (
            question.substrate.smiles,
            product.smiles,
        )


def test_eliminations_lose_hydrogen_and_the_group() -> None:
    for question, mechanism, product in all_products():
        opens = any(site.in_strained_ring for site in perceive_sites(question.substrate))  # then the group stays on
        if mechanism in ELIMINATIONS and not opens:
            lost = elements(question.substrate) - elements(product)
            assert sum(lost.values()) >= 2, product.smiles
            assert set(lost) - {"H"}, product.smiles


def test_charges_are_those_of_neutral_or_onium_products() -> None:
    for question, _, product in all_products():
        assert -1 <= product.charge <= max(1, question.substrate.charge + 1), product.smiles


# --- temperature ----------------------------------------------------------------------------------------------


def test_heat_never_lowers_a_rate_constant() -> None:
    for _, question in asked():
        flask = fill_flask(question, PARAMETERS)
        cold, hot = question.temperature_k, question.temperature_k + 15
        for pathway in open_pathways(question.substrate, flask, PARAMETERS, cold):
            whole = replace(pathway.rate, split=0.0)
            assert whole.log10_k(hot) >= whole.log10_k(cold), (question.substrate.smiles, pathway.event)


def answered_log_k(question: Question) -> dict[str, float]:
    """Return log k by label; SN1 and E1, which share one ionisation, as one."""
    found = dict(predict(question).log_k)
    ionised = [found.pop(label) for label in ("SN1", "E1") if label in found]
    if ionised:
        found["ionisation"] = math.log10(math.fsum(10**log for log in ionised))
    return found


def test_heat_never_lowers_a_rate_constant_of_an_answer() -> None:
    compared = 0
    for _, question in asked():
        before = answered_log_k(question)
        for step in (5, 20):
            after = answered_log_k(replace(question, temperature_k=question.temperature_k + step))
            for label in before.keys() & after.keys():
                compared += 1
                assert after[label] >= before[label] - 1e-6, (question.substrate.smiles, label)
    assert compared > 200


# --- terms ----------------------------------------------------------------------------------------------------

_BESIDES = ("sn2.transfer.preference", "sn2.hard", "cation.", "acid.", "model.", "ngp.", "flask.")
"""Terms that have a second say: in what is open, in how a mixture is seen, in the gain of a shift."""


def by_name(pathways: Iterator[Pathway]) -> dict[tuple[object, ...], Pathway]:
    return {
        (p.mechanism, p.label, p.site, p.leaving_group, p.partner, p.event, tuple(t.key for t in p.rate.terms)): p
        for p in pathways
    }


def test_zeroing_a_term_takes_just_its_contribution_away() -> None:
    zeroed = set()
    for _, question in asked()[::3]:
        before = by_name(
            open_pathways(question.substrate, fill_flask(question, PARAMETERS), PARAMETERS, question.temperature_k)
        )
        keys = {t.key for p in before.values() for t in p.rate.terms if t.key in PARAMETERS}
        for key in sorted(keys):
            if key.startswith(_BESIDES) or not PARAMETERS.value(key):
                continue
            less = PARAMETERS.without(key)
            after = by_name(open_pathways(question.substrate, fill_flask(question, less), less, question.temperature_k))
            for name in before.keys() & after.keys():
                gone = math.fsum(t.contribution for t in before[name].rate.terms if t.key == key)
                assert after[name].rate.at_25 == pytest.approx(before[name].rate.at_25 - gone, abs=1e-9), (key, name)
                zeroed.add(key)
    assert len(zeroed) > 60


@pytest.mark.parametrize("key", ["sn2.beta.2", "e2.leave.bromide", "sn1.power.halide", "model.SN2"])
def test_a_term_set_to_zero_has_no_error_either(key: str) -> None:
    less = PARAMETERS.without(key)
    assert (less.value(key), less[key].error) == (0, 0)
    assert less.term(key, 3.0).contribution == 0
    assert all(less[k] == PARAMETERS[k] for k in load_rate_terms() if k != key)


@pytest.mark.parametrize(
    ("change", "message"), [(Parameters.without, "nosuch"), (lambda p, key: p.with_values({key: 1.0}), "nosuch")]
)
def test_a_term_that_is_not_there_cannot_be_changed(change, message) -> None:
    with pytest.raises(KeyError, match=message):
        change(PARAMETERS, "nosuch")


# --- leaving groups -------------------------------------------------------------------------------------------


SOLVENTS = tuple(dict.fromkeys(row.solvent for row in load_rates() if row.channel is Channel.IONISATION))


def ionisation(substrate: str, solvent: Mixture, parameters: Parameters = PARAMETERS) -> float:
    """Return log10 k of ionisation; of a group that does not leave, minus infinity."""
    try:
        return see_channel(substrate, None, solvent, 25.0, Channel.IONISATION, parameters).value
    except SilentError:
        return -math.inf


# From the slowest to the fastest; common practice, no source.
@pytest.mark.parametrize("frame", ["CC(C)(C){}", "CC({})c1ccccc1", "C({})(c1ccccc1)c1ccccc1", "CC3({})CCCCC3"])
@pytest.mark.parametrize(
    "groups",
    [
        ("F", "Cl", "Br", "I"),
        ("OC(C)=O", "OC(=O)c1ccc([N+](=O)[O-])cc1", "OC(=O)C(F)(F)F"),
        ("OS(C)(=O)=O", "OS(=O)(=O)c1ccc(Br)cc1", "OS(=O)(=O)C(F)(F)F"),
        ("OS(=O)(=O)c1ccc(C)cc1", "OS(=O)(=O)c1ccc(Br)cc1", "OS(=O)(=O)c1ccc([N+](=O)[O-])cc1"),
    ],
    ids=lambda groups: groups[-1],
)
def test_a_better_leaving_group_never_slows_ionisation(frame: str, groups: tuple[str, ...]) -> None:
    for solvent in SOLVENTS:
        found = [ionisation(frame.format(group), solvent) for group in groups]
        assert found == sorted(found), solvent
        assert found[-1] > found[0]


def test_raising_the_term_of_a_leaving_group_raises_every_ionisation_by_as_much() -> None:
    better = PARAMETERS.with_values({"sn1.leave.bromide": PARAMETERS.value("sn1.leave.bromide") + 0.5})
    for solvent in SOLVENTS:
        gain = ionisation("CC(C)(C)Br", solvent, better) - ionisation("CC(C)(C)Br", solvent)
        assert gain == pytest.approx(0.5, abs=1e-9)
