"""How a group leaves in a given flask: as it stands, protonated, turned into another group, or taken by silver."""

from collections.abc import Iterator
from dataclasses import dataclass

from builder.chemistry.fragments import Fragment
from builder.chemistry.perception import ReactiveSite, perceive_sites
from builder.chemistry.structure import Structure
from builder.mechanism.flask import Flask
from builder.mechanism.rate_terms import Parameters, Term
from builder.mechanism.rules import Situation

__all__ = ["Departure", "departures"]

HALIDES = frozenset({"iodide", "bromide", "chloride", "fluoride"})
SULFONATES = frozenset(
    {"tosylate", "mesylate", "brosylate", "nosylate", "benzenesulfonate", "triflate", "nonaflate", "tresylate"}
    | {"fluorosulfonate", "cyclic sulfate", "alkyl sulfate", "sulfonate", "perchlorate"}
)
_ESTERS = frozenset(
    {
        "carboxylate",
        "4-nitrobenzoate",
        "trifluoroacetate",
        "carbonate",
        "carbamate",
        "phosphate",
        "2,4-dinitrophenoxide",
    }
)
_PROTONATED = {
    "hydroxyl": ("water", "acid.alcohol"),
    "ether": ("protonated ether", "acid.ether"),
    "silyl ether": ("protonated ether", "acid.ether"),
    "phenoxide": ("protonated ether", "acid.phenol ether"),
    "carboxylate": ("protonated ester", "acid.ester"),
    "4-nitrobenzoate": ("protonated ester", "acid.ester"),
    "carbonate": ("protonated ester", "acid.ester"),
    "carbamate": ("protonated ester", "acid.ester"),
    "trichloroacetimidate": ("protonated ester", "acid.imidate"),
    "epoxide": ("protonated epoxide", "acid.epoxide"),
    "oxetane": ("protonated oxetane", "acid.epoxide"),
    "aziridine": ("protonated aziridine", "acid.amine"),
    "activated aziridine": ("protonated aziridine", "acid.sulfonamide"),
}
_FOLLOWS_ACIDITY = frozenset({"acid.alcohol", "acid.ether"})
"""Groups whose loss keeps pace with the acidity even where nearly all of them bear a proton."""
_ACTIVE_NITROGEN = ("[NX3;r3]S(=O)=O", "[NX3;r3]C=[O,S]", "[NX3;r3]P=O")


@dataclass(frozen=True, slots=True)
class Departure:
    """A site, the group that leaves it in this flask, and what that costs.

    terms: cost of making the group, in every mechanism. pull: what silver or a Lewis acid adds to an ionisation.
    how: for the reasons of an answer; empty where the group leaves as it stands.
    """

    structure: Structure
    site: ReactiveSite
    group: str
    terms: tuple[Term, ...] = ()
    pull: tuple[Term, ...] = ()
    how: str = ""

    @property
    def family(self) -> str:
        """Return the family of the group: halide, sulfonate, ester or onium."""
        if self.group in HALIDES:
            return "halide"
        if self.group in SULFONATES:
            return "sulfonate"
        return "ester" if self.group in _ESTERS else "onium"

    @property
    def is_activated(self) -> bool:
        """Say whether the flask helps it."""
        return bool(self.how)

    @property
    def situation(self) -> Situation:
        """Return the site as the gates look at it."""
        formed = self.group if self.group != self.site.leaving_group else None
        known = {
            "activated phosphate",
            "protonated ester",
            "protonated epoxide",
            "protonated oxetane",
            "protonated aziridine",
        }
        if formed in known | {"activated aziridine"}:
            formed = None
        return Situation(self.structure, self.site, self.is_activated, formed)


def departures(structure: Structure, flask: Flask, parameters: Parameters) -> tuple[Departure, ...]:
    """Return every way a group of the structure can leave in this flask."""
    found = [
        d
        for site in perceive_sites(structure)
        if not site.is_addition
        for d in _of_site(structure, site, flask, parameters)
    ]
    return tuple(found)


def _of_site(structure: Structure, site: ReactiveSite, flask: Flask, parameters: Parameters) -> Iterator[Departure]:
    group = site.leaving_group
    if group == "hydroxyl" and flask.activators:
        for activator in flask.activators:
            made = "activated phosphate" if activator == "phosphate" else activator
            yield Departure(structure, site, made, how=f"hydroxyl made into {made}")
        return
    if group == "amine" and flask.nitrosates and _is_primary_amine(structure, site):
        yield Departure(structure, site, "diazonium", how="amine diazotised")
        return
    if group == "aziridine" and any(Fragment.from_smarts(text).is_in(structure) for text in _ACTIVE_NITROGEN):
        yield Departure(structure, site, "activated aziridine")
        yield from _helped(structure, site, "activated aziridine", flask, parameters)
        return
    if flask.acidity is not None and group in _PROTONATED:
        yield from _helped(structure, site, group, flask, parameters)
        if group not in {"epoxide", "trifluoroacetate"}:
            return
    pull: list[Term] = []
    how = ""
    if group in HALIDES and flask.has_silver:
        pull.append(parameters.term("sn1.silver"))
        how = "halide taken by silver"
    if group in HALIDES and flask.lewis_grade > 1:
        pull.append(parameters.term("sn1.lewis acid", flask.lewis_grade - 1))
        how = "halide taken by a Lewis acid"
    if group == "fluoride" and flask.acidity is not None and flask.acidity < 0:
        pull.append(parameters.term("sn1.lewis acid", min(3.0, -flask.acidity / 2)))
        how = "fluoride helped by acid"
    yield Departure(structure, site, group, (), tuple(pull), how)


def _helped(
    structure: Structure, site: ReactiveSite, group: str, flask: Flask, parameters: Parameters
) -> Iterator[Departure]:
    """Yield the departure of a group that the acid of the flask, if there is one, protonates or holds."""
    if flask.acidity is not None:
        made, basicity = _PROTONATED[group]
        how = "helped by a Lewis acid" if flask.is_lewis else "protonated"
        yield Departure(structure, site, made, _cost_of_proton(basicity, flask, parameters), how=how)


def _cost_of_proton(basicity: str, flask: Flask, parameters: Parameters) -> tuple[Term, ...]:
    """Return log10 of what the proton does: pKa of the protonated group less acidity, for most groups at most 0."""
    if flask.acidity is None or flask.acidity_key is None:
        raise ValueError("a flask without acid protonates nothing")
    if basicity not in _FOLLOWS_ACIDITY and parameters.value(basicity) >= flask.acidity:
        return ()
    return (parameters.term(basicity), parameters.term(flask.acidity_key, -1.0))


def _is_primary_amine(structure: Structure, site: ReactiveSite) -> bool:
    return site.leaving_atom is not None and structure.atoms[site.leaving_atom].hydrogens == 2
