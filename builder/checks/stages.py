"""What the stages of a procedure give, against what went into them."""

from collections.abc import Iterable, Iterator, Sequence

from builder.checks.case import Case
from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import perceive_sites, sites_of
from builder.chemistry.structure import Structure
from builder.chemistry.transform import activate_hydroxyl, derivatise_hydroxyl
from builder.finding import Level
from builder.mechanism.products import search_routes
from builder.mechanism.reaction import SiteInPlay
from builder.rule import Fault, Path, rule

__all__ = ["STAGE_CHECKS"]

_TWO_STAGES = """\
substrate: {{name: (S)-butan-2-ol, smiles: 'CC[C@H](C)O', class: secondary, leaving_group: mesylate, amount: 10 mmol}}
reagents: [{{name: methanesulfonyl chloride, smiles: 'CS(=O)(=O)Cl', use: activator, equivalents: 1.2}}]
stages:
  - {{temperature: 0 °C, time: 1 h, gives: {{name: the mesylate, smiles: '{gives}', isolated: false}}}}
  - {{temperature: 60 °C, time: 16 h}}
outcome:
  result: [substitution]
  products: [{{label: A, name: 2-azidobutane, smiles: 'CC[C@@H](C)N=[N+]=[N-]', use: desired}}]
  measured: [{{yield: 81 %, of: A, kind: assay}}]
"""
_MESYLATE = "CC[C@H](C)OS(C)(=O)=O"


@rule(
    id="stage-gives-inverted",
    title="An activation drawn with inversion",
    source="march-2013",
    needs=("structure-unreadable",),
    fires_on=(_TWO_STAGES.format(gives="CC[C@@H](C)OS(C)(=O)=O"),),
    silent_on=(_TWO_STAGES.format(gives=_MESYLATE),),
)
def stage_gives_is_inverted(case: Case) -> Iterator[Fault]:
    """Making a leaving group of a hydroxyl group leaves its carbon alone: the configuration stays.

    The oxygen keeps its bond to carbon and takes a new one to sulfur, phosphorus or an acyl group. Drawn otherwise,
    the course of the stage that follows would be read the wrong way round.
    """
    for path, given, starts in _given(case):
        made = [product for product in _activated(starts, case.flask) if product.flat == given.flat]
        drawn = given.stereocentres.specified
        if made and drawn and given not in made and all(product.stereocentres.specified == drawn for product in made):
            yield Fault(
                at=(*path, "smiles"),
                message="drawn with another configuration than the alcohol it is made from",
                mend="correct the drawing: activation does not touch the carbon",
            )


@rule(
    id="stage-gives-not-reachable",
    title="A stage gives what does not follow",
    level=Level.QUERY,
    source="iupac-gold",
    needs=("structure-unreadable",),
    fires_on=(_TWO_STAGES.format(gives="CCC[C@H](C)OS(C)(=O)=O"),),
    silent_on=(_TWO_STAGES.format(gives=_MESYLATE),),
)
def stage_gives_what_does_not_follow(case: Case) -> Iterator[Fault]:
    """What a stage gives follows from the substrate, from what an earlier stage gave, or from a reagent and a base.

    Sought are the activation of a hydroxyl group, deprotonation, and what `product-not-reachable` seeks.
    """
    if case.has_undrawn_species:
        return
    for path, given, starts in _given(case):
        known = {neutral_form(species).flat for species in (*starts, *case.flask)}
        activated = {product.flat for product in _activated(starts, case.flask)}
        if neutral_form(given).flat in known or given.flat in activated:
            continue
        sites = tuple(SiteInPlay(start, site, is_activated=True) for start in starts for site in perceive_sites(start))
        search = search_routes((given,), sites, case.flask)
        if search.routes[0] or search.was_cut:
            continue
        yield Fault(
            at=(*path, "smiles"),
            message="this does not follow from what had been charged",
            mend="correct the SMILES, list what is missing, or accept stage-gives-not-reachable with a reason",
        )


STAGE_CHECKS = (stage_gives_is_inverted, stage_gives_what_does_not_follow)


def _given(case: Case) -> Iterator[tuple[Path, Structure, tuple[Structure, ...]]]:
    """Yield what each stage gives, with its path and all it may have been made from."""
    starts: tuple[Structure, ...] = (case.substrate,)
    for index in range(len(case.record.stages)):
        path: Path = ("stages", index, "gives")
        if path in case.structures:
            yield path, case.structures[path], starts
            starts = (*starts, case.structures[path])


def _activated(alcohols: Iterable[Structure], flask: Sequence[Structure]) -> Iterator[Structure]:
    """Yield what the reagents in the flask make of hydroxyl groups, and the protonated alcohols."""
    for alcohol in alcohols:
        for site in sites_of(alcohol, "hydroxyl"):
            yield activate_hydroxyl(alcohol, site, "water").product
            for reagent in flask:
                yield from (edit.product for edit in derivatise_hydroxyl(alcohol, site, reagent))
