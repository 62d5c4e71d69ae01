"""What the amounts charged allow: yields that no reagent or base covers, and an order of addition that matters."""

from collections import Counter
from collections.abc import Iterator, Mapping

from builder.checks.case import Case
from builder.checks.derivation import is_desired, product_paths, routes_by_product
from builder.chemistry.fragments import Fragment
from builder.chemistry.structure import Structure
from builder.finding import Level
from builder.mechanism.amounts import Role, rounding_of
from builder.mechanism.gas import InFlask, present_in
from builder.mechanism.stoichiometry import Supply, proton_capacity, staying_elements, supply_of
from builder.records.figures import amount_text
from builder.records.model import Charged, Measurement
from builder.records.specimen import outcome_example
from builder.records.vocabulary import Mechanism, ReagentUse, Result, YieldKind
from builder.rule import Fault, Path, rule

__all__ = ["LIMIT_CHECKS"]

POINTS = 2.0  # of the method that measured the yield; common practice, no source
AT_LEAST_ONE = 1.02  # equivalents of nucleophile, at which the substrate still counts as one equivalent or more
SHORT_BELOW = 0.98  # equivalents; honest weighing is within 2 %
_SUBSTITUTES = {Result.SUBSTITUTION, Result.RING_OPENING}
_HELPERS = {ReagentUse.BASE, ReagentUse.BUFFER, ReagentUse.CATALYST}
_FROM_WATER = {"O"}  # an alcohol may come of moisture or of the work-up
_AMINE = Fragment.from_smarts("[NX3;H1,H2,H3;+0;!$(N-[C,S,P]=[O,S,N]);!$(N-c);!$(N~[N,O])]")
_STILL_ATTACKS = Fragment.from_smarts("[NX3;+0;!$(N-[C,S,P]=[O,S,N]);!$(N-c);!$(N~[N,O])]")
_SULFIDE = Fragment.from_smarts("[$([S-2]),$([SX1H1-]),$([SX2H2])]")
_STILL_THIOL = Fragment.from_smarts("[SX2H1,SX1-]")
_WITHDRAWING = "$(C=O),$(C#N),$([N+](=O)[O-]),$(S(=O)=O)"
_BETWEEN_TWO = f"([{_WITHDRAWING}])[{_WITHDRAWING}]"
_ACTIVE_METHYLENE = Fragment.from_smarts(f"[$([CH2]{_BETWEEN_TWO}),$([CH-]{_BETWEEN_TWO})]")
_STILL_ACIDIC = Fragment.from_smarts(f"[CX4;!H0]{_BETWEEN_TWO}")
_AZIDE = "nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: %s}\n"
_LOSES_A_PROTON = Fragment.from_smarts(
    "[$([OX2;H1]-c),$([OX2;H1]-[C,P]=[OX1]),$([SX2;H1]-[#6]),$([nX3;H1]),$([NX3;H1](-[C,S]=O)-[C,S]=O),"
    f"$([CX4;!H0]{_BETWEEN_TWO})]"
)
_PHENOL = (
    "nucleophile: {name: phenol, smiles: Oc1ccccc1, equivalents: 1.1}\n"
    "base: {name: a base, smiles: '[K+].CC(C)(C)[O-]', equivalents: %s}\n"
    "stages: [{temperature: 60 °C, time: 16 h}]\n"
)
_PHENYL_ETHER = "{label: A, name: 2-phenoxybutane, smiles: 'CCC(C)Oc1ccccc1', use: desired}"
_READS = ("structure-unreadable", "leaving-group-not-found", "product-not-reachable")
_OVER_ALKYLATION = (
    ("a primary or secondary amine", _AMINE, _STILL_ATTACKS),
    ("a sulfide", _SULFIDE, _STILL_THIOL),
    ("an active methylene compound", _ACTIVE_METHYLENE, _STILL_ACIDIC),
)


@rule(
    id="yield-above-reagent",
    title="More product than a reagent can give",
    source="common-practice",
    needs=(*_READS, "label-unknown", "quantities-disagree"),
    fires_on=(
        _AZIDE % "0.70" + outcome_example("{yield: 81 %, of: A, kind: assay}"),
        _AZIDE % "0.60"
        + "base: {name: triethylamine, smiles: 'CCN(CC)CC', equivalents: 2.0}\n"
        + "stages: [{temperature: 60 °C, time: 16 h}]\n"
        + outcome_example("{yield: 81 %, of: A, kind: assay}"),
        "base: {name: potassium tert-butoxide, smiles: '[K+].CC(C)(C)[O-]', equivalents: 0.60}\n# without nucleophile\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\n"
        "outcome: {result: [elimination], claim: {mechanism: E2}, products: [{label: A, name: but-1-ene, smiles: C=CCC,"
        " use: desired}], measured: [{yield: 75 %, of: A, kind: assay, by: GC}]}",
    ),
    silent_on=(_AZIDE % "1.05" + outcome_example("{yield: 81 %, of: A, kind: assay}"),),
)
def yield_is_above_the_reagent(case: Case) -> Iterator[Fault]:
    """A yield, counted on the substrate, is no higher than what each reagent in the product allows, with 2 points.

    How many molecules of substrate and reagent one product holds is counted from the atoms: sulfide takes two alkyl
    groups, phosphorus tribromide gives three bromides, carbonate takes two protons. Everything charged that could
    supply the atoms counts together, beside a nucleophile no base, catalyst or buffer; a solvent that is whole in the
    product has no end. An E2 or E1cB needs a proton
    taken for each alkene.
    """
    for path, line, bound in _bounded_lines(case):
        if bound is None or line.yield_ is None or line.yield_.is_upper_limit:
            continue
        allowed, names, charged = bound
        measured = line.yield_.magnitude
        if measured > allowed * (1.0 + _rounding(case)) + POINTS:
            yield Fault(
                at=(*path, "yield"),
                message=f"{line.yield_} of {'+'.join(line.of or ())}, but at most {allowed:.3g} % can come of"
                f" {amount_text(charged)} of {names} and {_substrate_text(case)}",
                mend="the amounts are believed: correct the yield, an amount, or list what else took part",
                data={"most_percent": round(allowed, 1)},
            )


@rule(
    id="reagent-below-one",
    title="Less reagent than the desired product needs",
    level=Level.QUERY,
    source="common-practice",
    needs=("yield-above-reagent",),
    fires_on=(_AZIDE % "0.80" + outcome_example("{yield: 75 %, of: A, kind: assay}"),),
    silent_on=(
        _AZIDE % "1.0" + outcome_example("{yield: 75 %, of: A, kind: assay}"),
        "nucleophile: solvent\nsolvent: [{name: ethanol, volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]\n"
        + outcome_example(products="{label: A, name: 2-ethoxybutane, smiles: 'CCC(C)OCC'}").replace(
            "  products", "  measured: [{yield: 20 %, of: A, kind: assay}]\n  products"
        ),
    ),
)
def reagent_is_below_one(case: Case) -> Iterator[Fault]:
    """What ends up in the desired product is charged with at least as much as the substrate can use.

    Yields and equivalents of this book are counted on the substrate. Where the other partner is the dear one and the
    substrate is in excess by design, no yield can reach 100 %; accept this with that reason, so that nobody reads the
    number as a poor one.
    """
    for path in product_paths(case):
        bound = _bound(case, path) if is_desired(case, path) else None
        if bound is not None and bound[0] < 100.0 * (SHORT_BELOW - _rounding(case)):
            allowed, names, charged = bound
            yield Fault(
                at=_place_of(case, Role.NUCLEOPHILE, Role.BASE),
                message=f"at most {allowed:.3g} % of {case.structures[path].formula} can come of"
                f" {amount_text(charged)} of {names}, for yields are counted on {_substrate_text(case)}",
                mend="correct an amount, or accept this: the substrate is in excess by design",
                data={"most_percent": round(allowed, 1)},
            )
            return


@rule(
    id="base-below-one",
    title="Less base than protons are set free",
    level=Level.QUERY,
    source="common-practice",
    needs=("yield-above-reagent",),
    fires_on=(_PHENOL % "0.10" + outcome_example("{yield: 75 %, of: A, kind: assay}", products=_PHENYL_ETHER),),
    silent_on=(
        _PHENOL % "1.0" + outcome_example("{yield: 75 %, of: A, kind: assay}", products=_PHENYL_ETHER),
        _PHENOL.replace("[K+].CC(C)(C)[O-]", "[K+].[K+].[O-]C([O-])=O") % "0.60"
        + outcome_example("{yield: 75 %, of: A, kind: assay}", products=_PHENYL_ETHER),
    ),
)
def base_is_below_one(case: Case) -> Iterator[Fault]:
    """Where an acidic nucleophile sets a proton free with each product, the base listed can take them all.

    Asked of phenols, thiols, acids, azoles, imides and active methylene compounds charged neutral beside a `base`, with
    a group that leaves as an anion of its own. Carbonate takes two protons; every basic species charged counts, and a
    basic solvent takes all. Without base left the anion is gone, and what does the rest is another mechanism.
    """
    substrate = case.amounts.substrate.amount_mol
    drawn = [row for row in case.amounts.rows if row.role is Role.NUCLEOPHILE and row.path in case.structures]
    acidic = [row for row in drawn if _LOSES_A_PROTON.is_in(case.structures[row.path])]
    leaves_free = any(each.site.leaving_atom is not None and not each.site.leaving_ring_size for each in case.sites)
    taken = _protons(case)
    if not substrate or not case.record.bases or not acidic or not leaves_free or taken is None:
        return
    protons, names, _ = taken
    set_free = min(substrate, sum(row.amount_mol if row.amount_mol is not None else substrate for row in acidic))
    if _SUBSTITUTES & set(case.record.outcome.result) and protons < (SHORT_BELOW - _rounding(case)) * set_free:
        yield Fault(
            at=_place_of(case, Role.BASE),
            message=f"{amount_text(protons)} of protons can be taken by {names}, while"
            f" {' and '.join(row.name for row in acidic)} sets {amount_text(set_free)} free",
            mend="correct the amount of base, or accept this with what takes the acid",
            data={"protons_mol": round(protons, 6)},
        )


@rule(
    id="order-of-addition-open",
    title="Over-alkylation is possible, and nothing says what was added to what",
    level=Level.QUERY,
    source="common-practice",
    needs=_READS,
    fires_on=(
        "nucleophile: {name: benzylamine, smiles: NCc1ccccc1, equivalents: 1.0}\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\n"
        + outcome_example(
            "{yield: 61 %, of: A, kind: assay}",
            products="{label: A, name: N-benzylbutan-2-amine, smiles: 'CCC(C)NCc1ccccc1', use: desired}",
        ),
    ),
    silent_on=(
        "nucleophile: {name: benzylamine, smiles: NCc1ccccc1, equivalents: 1.0}\n"
        "stages: [{add: [benzylamine, DMF, 2-bromobutane], over: 1 h, temperature: 60 °C, time: 16 h}]\n"
        + outcome_example(
            "{yield: 61 %, of: A, kind: assay}",
            products="{label: A, name: N-benzylbutan-2-amine, smiles: 'CCC(C)NCc1ccccc1', use: desired}",
        ),
        "nucleophile: {name: benzylamine, smiles: NCc1ccccc1, equivalents: 5.0}\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\n"
        + outcome_example(
            "{yield: 61 %, of: A, kind: assay}",
            products="{label: A, name: N-benzylbutan-2-amine, smiles: 'CCC(C)NCc1ccccc1', use: desired}",
        ),
    ),
)
def order_of_addition_is_open(case: Case) -> Iterator[Fault]:
    """Where the product attacks as readily as the nucleophile, the record says what went in first, and how fast.

    Asked where a primary or secondary amine, a sulfide or an active methylene compound meets at least one equivalent of
    alkylating substrate, the desired product can be alkylated once more, and no stage has `add`. The product of a wrong
    order is the dialkylated one.
    """
    if any(stage.add for stage in case.record.stages) or case.record.procedure is not None:
        return
    desired = [case.structures[path] for path in product_paths(case) if is_desired(case, path)]
    for index, _ in enumerate(case.record.nucleophiles):
        row = case.amounts.at(("nucleophile", index))
        structure = case.structures.get(("nucleophile", index))
        if structure is None or row.equivalents is None or row.equivalents > AT_LEAST_ONE:
            continue
        for kind, attacks, still in _OVER_ALKYLATION:
            if attacks.is_in(structure) and any(still.is_in(product) for product in desired):
                yield Fault(
                    at=("stages",),
                    message=f"{row.name}, {kind}, meets {1 / row.equivalents:.3g} equivalents of alkylating agent, and"
                    " its product can be alkylated again",
                    mend="say in a stage what was added to what, and how fast: add: [first, second], over: 1 h",
                )
                return


LIMIT_CHECKS = (base_is_below_one, order_of_addition_is_open, reagent_is_below_one, yield_is_above_the_reagent)

_Bound = tuple[float, str, float]
"""The highest yield in percent, the names of what sets it, and how much of that was charged (mol)."""


def _bounded_lines(case: Case) -> Iterator[tuple[Path, Measurement, _Bound | None]]:
    """Yield the measured yields of desired products, by weight or against a standard, each with what bounds it."""
    for index, line in enumerate(case.record.outcome.measured):
        if line.yield_ is None or line.kind is YieldKind.AREA or line.of is None:
            continue
        paths = case.product_paths(line.of)
        if paths and all(path in case.structures and is_desired(case, path) for path in paths):
            bounds = [_bound(case, path) for path in paths]
            known = {bound[1]: bound for bound in bounds if bound is not None}  # by what sets it
            together = (sum(b[0] for b in known.values()), " and ".join(known), sum(b[2] for b in known.values()))
            yield ("outcome", "measured", index), line, None if None in bounds else together


def _bound(case: Case, path: Path) -> _Bound | None:
    """Return what bounds the yield of one product; None where nothing does, or an amount is unknown."""
    substrate = case.amounts.substrate.amount_mol
    routes = routes_by_product(case).get(path, ())
    if not substrate or not case.sites or not routes or case.has_undrawn_species:
        return None
    if all(route.eliminates for route in routes):
        return _bound_by_base(case, substrate)
    if not _SUBSTITUTES & set(case.record.outcome.result):
        return None
    staying = staying_elements(routes[0].start, routes[0].site)
    gained = set(Counter(case.structures[path].elements) - Counter(staying))
    if gained <= _FROM_WATER:
        return None
    supplied = _supplied(case, case.structures[path], staying)
    total, names, charged = 0.0, [], 0.0
    for each, supply in supplied:
        if each.moles is None or each.path[0] == "solvent":
            return None
        total += 100.0 * each.moles * supply.per_molecule * supply.substrates / substrate
        names.append(case.amounts.at(each.path).name)
        charged += each.moles
    return (total, " and ".join(names), charged) if names else None


def _supplied(case: Case, product: Structure, staying: Mapping[str, int]) -> list[tuple[InFlask, Supply]]:
    """Return what could have given a product its atoms, each with how.

    A solvent must be whole in the product. Beside a nucleophile that could, neither a base, catalyst or buffer counts
    nor what would take several molecules for one of product: carbonate is no source of the oxygen of a phenyl ether.
    """
    found = [(each, supply_of(product, staying, each.structure)) for each in _charged(case)[1:]]
    able = [(each, supply) for each, supply in found if supply and not (each.path[0] == "solvent" and supply.left_over)]
    if not any(each.path[0] == "nucleophile" for each, _ in able):
        return able
    return [
        (each, supply)
        for each, supply in able
        if each.path[0] in {"nucleophile", "solvent"}
        or (supply.per_molecule >= 1.0 and not _only_helps(case, each.path))
    ]


def _only_helps(case: Case, path: Path) -> bool:
    if path[0] != "reagents":
        return path[0] == "base"
    return case.record.reagents[int(path[1])].use in _HELPERS


def _bound_by_base(case: Case, substrate_mol: float) -> _Bound | None:
    """Return what the bases allow of an E2 or E1cB; None for other mechanisms, and where a solvent is basic."""
    claim = case.record.outcome.claim
    if claim is None or claim.mechanism not in {Mechanism.E2, Mechanism.E1CB} or not case.record.bases:
        return None
    taken = _protons(case)
    return None if taken is None else (100.0 * taken[0] / substrate_mol, *taken[1:])


def _protons(case: Case) -> _Bound | None:
    """Return how many protons (mol) can be taken, by what, and how much of it; None where a solvent is basic.

    None, too, where nothing takes a proton or an amount is unknown.
    """
    protons, names, charged = 0.0, [], 0.0
    for each in _charged(case):
        capacity = proton_capacity(each.structure)
        if not capacity:
            continue
        if each.moles is None or each.path[0] == "solvent":
            return None
        protons += capacity * each.moles
        names.append(case.amounts.at(each.path).name)
        charged += each.moles
    return (protons, " and ".join(names), charged) if names else None


def _charged(case: Case) -> tuple[InFlask, ...]:
    """Return all that was charged, the substrate first; solvents that are not drawn by the table."""
    return present_in(case.record, case.structures, case.amounts, len(case.record.stages) - 1)


def _substrate_text(case: Case) -> str:
    row = case.amounts.substrate
    return f"{amount_text(row.amount_mol or 0.0)} of {row.name}"


def _rounding(case: Case) -> float:
    """Return how far honest rounding of substrate and partners may move their ratio."""
    partners: list[Charged] = [*case.record.nucleophiles, *case.record.bases]
    return rounding_of(case.record.substrate) + max((rounding_of(each) for each in partners), default=0.0)


def _place_of(case: Case, *roles: Role) -> Path:
    rows = [row for row in case.amounts.rows if row.role in roles and row.typed]
    return (*rows[0].path, rows[0].typed) if rows else ("substrate",)
