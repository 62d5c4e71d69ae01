"""Numbers and addresses that stand for something outside the book: CAS numbers, DOIs."""

import re
from collections.abc import Iterator

from builder.checks.case import Case, compounds_of
from builder.finding import Level
from builder.mechanism.solvents import find_solvent, load_solvents
from builder.mechanism.synonyms import cas_of
from builder.records.model import EvidenceFile
from builder.rule import Fault, Path, rule

__all__ = ["IDENTITY_CHECKS"]


def _solvent(name: str, cas: str, smiles: str = "") -> str:
    drawn = f", smiles: '{smiles}'" if smiles else ""
    return (
        f"solvent: [{{name: {name}, volume: 20 mL, cas: {cas}{drawn}}}]\nstages: [{{temperature: 60 °C, time: 16 h}}]"
    )


@rule(
    id="cas-of-another",
    title="A CAS number of another substance",
    source="cas-common-chemistry",
    needs=("structure-unreadable",),
    fires_on=(
        _solvent("DMF", "67-68-5", "CN(C)C=O"),
        _solvent("DMF", "26628-22-8", "CN(C)C=O"),
        _solvent("DMSO", "68-12-2"),
    ),
    silent_on=(_solvent("DMF", "68-12-2", "CN(C)C=O"), _solvent("DMSO", "67-68-5")),
)
def cas_belongs_to_another(case: Case) -> Iterator[Fault]:
    """A CAS number belongs to the substance beside it, as far as the tables know the number or the substance.

    A number that they know for another structure is an error. Where they only know another number for this one, it may
    be of a salt, a hydrate or an isotopomer, and is a query.
    """
    owners = {solvent.cas: solvent for solvent in load_solvents()}
    for path, compound in compounds_of(case.record):
        structure = case.structures.get(path)
        named = find_solvent(compound.name) if structure is None else None
        known = cas_of(structure) if structure is not None else named.cas if named is not None else ""
        if compound.cas is None or compound.cas == known or (structure is None and named is None):
            continue
        owner = owners.get(compound.cas)
        if owner is not None:
            yield Fault(
                at=(*path, "cas"),
                message=f"{compound.cas} is {owner.name}, not {compound.name}",
                mend=f"write {known}, or correct name and structure" if known else "correct the number, or drop it",
                fix=known or None,
            )
        elif known:
            yield Fault(
                at=(*path, "cas"),
                message=f"{compound.cas} is not the number that the tables have for {compound.name}, {known}",
                mend=f"write {known}, or draw the form that was used",
                level=Level.QUERY,
            )


_SAYS_DOI = re.compile(r"\b(?:doi\.org/|doi\s*[:=]?\s*)(?P<said>\S+)", re.IGNORECASE)
_DOI = re.compile(r"10\.[0-9]{4,9}(\.[0-9]+)*/[^\s\"<>]+")


@rule(
    id="doi-malformed",
    title="A DOI that cannot be resolved",
    source="doi-handbook",
    fires_on=(
        "evidence: ['1H NMR as in doi:10.1021ja01234a001']",
        "evidence: ['https://doi.org/jacs.1948.70.846']",
        "outcome: {result: [no reaction], claim: {mechanism: none, basis: 'doi 1021/ja01'}}",
    ),
    silent_on=(
        "evidence: ['1H NMR as in doi:10.1021/ja01182a117', 'https://doi.org/10.1515/pac-2018-1010.']",
        "evidence: [no doi yet]",
    ),
)
def doi_is_malformed(case: Case) -> Iterator[Fault]:
    """A DOI is 10., a registrant of four digits or more, a slash and a name.

    Without one of them it leads nowhere, and the evidence behind the record is lost with it.
    """
    for path, text in _cited(case):
        for found in _SAYS_DOI.finditer(text):
            said = found["said"]
            if any(sign.isdigit() for sign in said) and not _DOI.match(said):
                yield Fault(
                    at=path, message=f'"{said:.60}" is not a DOI', mend="write it like doi:10.1515/pac-2018-1010"
                )


def _cited(case: Case) -> Iterator[tuple[Path, str]]:
    """Yield the texts of a record that cite: evidence, the basis of the claim, the procedure."""
    for index, piece in enumerate(case.record.evidence):
        if isinstance(piece, EvidenceFile):
            yield ("evidence", index, "what"), piece.what
        else:
            yield ("evidence", index), piece
    claim = case.record.outcome.claim
    for index, basis in enumerate(claim.basis or () if claim is not None else ()):
        yield ("outcome", "claim", "basis", index), basis
    if case.record.procedure is not None:
        yield ("procedure",), case.record.procedure


IDENTITY_CHECKS = (
    cas_belongs_to_another,
    doi_is_malformed,
)
