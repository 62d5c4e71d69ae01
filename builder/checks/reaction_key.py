"""The keys under which entries are compared: of the reaction as it was run, and of the change it makes."""

from builder.checks.case import Case
from builder.chemistry.neutral import neutral_form
from builder.chemistry.perception import stem_of
from builder.chemistry.structure import Structure, stereo_key
from builder.mechanism.amounts import Role
from builder.records.model import Product, Record
from builder.records.vocabulary import NucleophileWord, ProductUse, StereoKind

__all__ = [
    "attacking_role",
    "product_key",
    "product_structure",
    "reaction_key",
    "transformation_key",
    "wanted_products",
]


def reaction_key(case: Case) -> str:
    """Return substrate with its kind of stereo, nucleophile or base, leaving group and desired products as one text.

    Empty where the substrate or what was wanted could not be read.
    """
    substrate, wanted = case.structures.get(("substrate",)), wanted_products(case)
    if substrate is None or not wanted:
        return ""
    parts = (
        stereo_key(substrate, _stereo(case.record.substrate.stereo, substrate)),
        "+".join(_partners(case)),
        case.record.substrate.leaving_group,
        "+".join(sorted(wanted)),
    )
    return " | ".join(parts)


def attacking_role(record: Record) -> Role:
    """Return the role of what attacks: a base where no nucleophile is charged, nor named by its word."""
    return Role.BASE if record.nucleophile in {None, NucleophileWord.NONE} else Role.NUCLEOPHILE


def _partners(case: Case) -> list[str]:
    """Return what attacks, sorted: nucleophiles without counter-ions or the word in their place, else the bases."""
    role = attacking_role(case.record)
    if role is Role.NUCLEOPHILE and not case.record.nucleophiles:
        return [str(case.record.nucleophile)]
    rows = [row for row in case.amounts.rows if row.role is role]
    found = [(case.structures.get(row.path), row.name) for row in rows]
    return sorted(_without_cations(structure) if structure else name.casefold() for structure, name in found)


def _without_cations(structure: Structure) -> str:
    """Return a species without counter-ions as a key, those such as tetrabutylammonium among them."""
    pieces = structure.without_counter_ions.fragments
    anions = [piece for piece in pieces if piece.charge < 0]
    return ".".join(sorted(piece.smiles for piece in (anions or pieces)))


def wanted_products(case: Case) -> dict[str, Structure]:
    """Return the products the entry was after, by their keys: the desired ones, else what was sought, else all."""
    outcome = case.record.outcome
    desired = [product for product in outcome.products if product.use is ProductUse.DESIRED]
    if not desired and outcome.sought is not None:
        sought = case.structures.get(("outcome", "sought"))
        return {product_key(case, sought, None): sought} if sought is not None else {}
    found = [(product, product_structure(case, product)) for product in desired or outcome.products]
    return {product_key(case, structure, product): structure for product, structure in found if structure is not None}


def product_structure(case: Case, product: Product) -> Structure | None:
    """Return the structure of a product of a case; None where it could not be read."""
    return case.structures.get(("outcome", "products", case.record.outcome.products.index(product)))


def product_key(case: Case, structure: Structure, product: Product | None) -> str:
    """Return the key of a product as its uncharged form; of a racemate either mirror image gives the same."""
    stated = product.stereo if product is not None else None
    bare = neutral_form(structure)
    kind = str(stated or case.record.substrate.stereo) if bare.stereocentres.total else ""
    return stereo_key(bare, kind).partition(" ")[0]


def _stereo(stated: StereoKind | None, structure: Structure) -> str:
    if stated is not None:
        return str(stated)
    return str(StereoKind.NOT_DETERMINED if structure.stereocentres.total else StereoKind.ACHIRAL)


def transformation_key(case: Case) -> str:
    """Return what stays of the substrate and what is wanted as one text; empty where either could not be read."""
    substrate, wanted = case.structures.get(("substrate",)), wanted_products(case)
    if substrate is None or not wanted:
        return ""
    stems = [stem_of(each.on, each.site) for each in case.sites]
    stem = min(stems, default=substrate.without_counter_ions.flat_smiles)
    return f"{stem} > {'+'.join(sorted({neutral_form(each).flat_smiles for each in wanted.values()}))}"
