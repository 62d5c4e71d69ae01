"""What stays and what goes in a substitution: the leaving group, the attacking atom, the kind of carbon."""

from collections import Counter
from collections.abc import Iterator

from builder.checks.case import Case
from builder.checks.derivation import SOUGHT, expected_product, is_desired, product_paths, routes_by_product, search
from builder.chemistry.perception import NO_LEAVING_GROUP, Hybridisation, attacking_atoms, sites_of
from builder.chemistry.structure import Structure
from builder.mechanism.amounts import Role, charged_rows
from builder.mechanism.stoichiometry import staying_elements
from builder.records.specimen import outcome_example
from builder.records.vocabulary import Result
from builder.rule import Fault, Path, rule

__all__ = ["CONSERVED_CHECKS"]

_READS = ("structure-unreadable", "leaving-group-not-found", "leaving-group-unknown", "element-from-nowhere")
_LEAVES_AS_GAS = "diazonium"  # aryl cations form from it: the one substitution at sp2 carbon that is covered


def _example(smiles: str) -> str:
    product = f"{{label: A, name: the product, smiles: '{smiles}', use: desired}}"
    return outcome_example("{yield: 81 %, of: A, kind: assay}", products=product)


def _at_sp2(smiles: str, product: str, word: str, result: str = "substitution") -> str:
    return (
        f"substrate: {{name: RCl, smiles: '{smiles}', class: {word}, leaving_group: chloride, amount: 10 mmol}}\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\n" + _example(product).replace("[substitution]", f"[{result}]")
    )


@rule(
    id="centre-out-of-scope",
    title="Substitution at a carbon that is not sp3",
    source="march-2013",
    needs=_READS,
    fires_on=(_at_sp2("Clc1ccccc1", "[N-]=[N+]=Nc1ccccc1", "aryl"),),
    silent_on=(
        "substrate: {name: benzyl chloride, smiles: ClCc1ccccc1, class: [primary, benzylic], leaving_group: chloride,"
        " amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n" + _example("[N-]=[N+]=NCc1ccccc1"),
        "substrate: {name: chlorobenzene, smiles: Clc1ccccc1, class: aryl, leaving_group: chloride, amount: 10 mmol}\n"
        "stages: [{temperature: 60 °C, time: 16 h}]\n"
        "outcome: {result: [no reaction], measured: [{recovered: 96 %, of: substrate, by: GC}]}",
    ),
)
def centre_is_out_of_scope(case: Case) -> Iterator[Fault]:
    """This book holds substitutions at sp3 carbon; at an aryl, vinyl, alkynyl or acyl carbon others are at work.

    Addition–elimination, arynes and metals do what no mechanism of this book does. That nothing happens there is worth
    an entry; an elimination to an alkyne or allene is within the scope, and so is the loss of nitrogen from an
    arenediazonium ion.
    """
    group = case.record.substrate.leaving_group
    if Result.SUBSTITUTION not in case.record.outcome.result or group in {NO_LEAVING_GROUP, _LEAVES_AS_GAS}:
        return
    kinds = {each.site.hybridisation for each in case.sites}
    if kinds and Hybridisation.SP3 not in kinds:
        classes = sorted({name for each in case.sites for name in each.site.classes}) or ["not sp3"]
        yield Fault(
            at=("substrate", "class"),
            message=f"the carbon that bears the {group} is {' and '.join(classes)}: out of the scope of this book",
            mend="correct the SMILES or the leaving group; a substitution at such a carbon belongs elsewhere",
        )


@rule(
    id="leaving-group-in-product",
    title="The leaving group is still in the product",
    source="common-practice",
    needs=(*_READS, "centre-out-of-scope"),
    fires_on=(_example("CCC(C)Br"), _example("[N-]=[N+]=NCCC(C)Br")),
    silent_on=(
        _example("CCC(C)N=[N+]=[N-]"),
        "substrate: {name: '1,4-dibromobutane', smiles: BrCCCCBr, class: primary, leaving_group: bromide,"
        " amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 16 h}]\n" + _example("[N-]=[N+]=NCCCCBr"),
    ),
)
def leaving_group_is_in_the_product(case: Case) -> Iterator[Fault]:
    """The product of a substitution has one leaving group less than the substrate.

    Asked of a desired product that is the substrate once more, or to which no open way is known, where the group is not
    charged by itself. Then the substrate was copied into the product, or the nucleophile drawn onto another carbon.
    """
    group = case.record.substrate.leaving_group
    if not case.sites or group == NO_LEAVING_GROUP or not _claims_substitution(case) or _brings_the_group(case):
        return
    copied = {path: s for path, s in _desired(case).items() if _is_substrate(case, s)}
    for path, product in (dict(_without_way(case)) | copied).items():
        before = min(_number_of(each.on, group) for each in case.sites)
        if before and _number_of(product, group) >= before:
            yield Fault(
                at=(*path, "smiles"),
                message=f"the {group} is still in the product, and a substitution is recorded",
                mend=f"correct the SMILES{_expected(case)}",
            )


@rule(
    id="nucleophile-not-in-product",
    title="The attacking atom is not in the product",
    source="common-practice",
    needs=(*_READS, "centre-out-of-scope", "leaving-group-in-product"),
    fires_on=(_example("CCC(C)C"),),
    silent_on=(_example("CCC(C)N=[N+]=[N-]"), _example("C=CCC").replace("[substitution]", "[elimination]")),
)
def nucleophile_is_not_in_the_product(case: Case) -> Iterator[Fault]:
    """The product of a substitution holds an atom that attacked: nitrogen of an azide, carbon of a cyanide.

    Counted by element against what stays of the substrate; asked of a desired product to which no open way is known.
    The elements say it, wherever the atom was drawn; of a hydride, which brings no element, nothing is asked.
    """
    named = [
        (substance.name, {atom.symbol for atom in attacking_atoms(case.structures[path])})
        for path, role, substance in charged_rows(case.record)
        if role is Role.NUCLEOPHILE and path in case.structures
    ]
    attackers = set().union(*(symbols for _, symbols in named))
    if not attackers or "H" in attackers or not _claims_substitution(case):
        return
    for path, product in _without_way(case):
        if not attackers & _gained(case, product):
            names = " or ".join(f"{'/'.join(sorted(symbols))} of {name}" for name, symbols in named)
            yield Fault(
                at=(*path, "smiles"),
                message=f"no {names} is in the product, and a substitution is recorded",
                mend=f"correct the SMILES or the nucleophile{_expected(case)}",
            )


CONSERVED_CHECKS = (centre_is_out_of_scope, leaving_group_is_in_the_product, nucleophile_is_not_in_the_product)


def _claims_substitution(case: Case) -> bool:
    result = case.record.outcome.result
    return Result.SUBSTITUTION in result and not {Result.ELIMINATION, Result.REARRANGEMENT} & set(result)


def _desired(case: Case) -> dict[Path, Structure]:
    paths = [path for path in product_paths(case) if path != SOUGHT and is_desired(case, path)]
    return {path: case.structures[path] for path in paths}


def _without_way(case: Case) -> Iterator[tuple[Path, Structure]]:
    """Yield the desired products to which no open way is known; none where something is not drawn."""
    if case.has_undrawn_species or not case.sites or search(case).was_cut:
        return
    routes = routes_by_product(case)
    for path, product in _desired(case).items():
        if all(route.closed_by for route in routes[path]):
            yield path, product


def _brings_the_group(case: Case) -> bool:
    """Say whether the group that leaves is also charged by itself, so that it may rightly be in the product."""
    left = [Counter(each.on.elements) - Counter(staying_elements(each.on, each.site)) for each in case.sites]
    return any(Counter(piece.elements) in left for species in case.flask for piece in species.fragments)


def _is_substrate(case: Case, product: Structure) -> bool:
    """Say whether a product is the substrate once more, whatever configuration is drawn."""
    return product.flat == case.substrate.flat


def _number_of(structure: Structure, group: str) -> int:
    return sum(site.multiplicity for site in sites_of(structure, group))


def _gained(case: Case, product: Structure) -> set[str]:
    """Return the elements of which a product has more than stays of the substrate, whichever site reacts."""
    wanted = Counter(product.elements)
    return set().union(*((wanted - Counter(staying_elements(each.on, each.site))).keys() for each in case.sites))


def _expected(case: Case) -> str:
    expected = expected_product(case)
    return f"; {expected} would follow" if expected else ""
