"""Closed lists of words: one word for one idea, in records, predictions and pages alike."""

from enum import StrEnum

__all__ = [
    "ELIMINATIONS",
    "SUBSTITUTIONS",
    "Course",
    "Disclosure",
    "Mechanism",
    "NucleophileWord",
    "ProductUse",
    "ReagentUse",
    "Result",
    "Status",
    "StereoKind",
    "Thermometer",
    "Vessel",
    "YieldKind",
]


class Mechanism(StrEnum):
    """How bonds are made and broken; Ingold's names as the trade uses them."""

    SN2 = "SN2"
    SN2_PRIME = "SN2'"
    SN1 = "SN1"
    E2 = "E2"
    E1 = "E1"
    E1CB = "E1cB"
    NGP = "NGP"
    ADE = "AdE"
    NONE = "none"


ELIMINATIONS = frozenset({Mechanism.E1, Mechanism.E2, Mechanism.E1CB})
SUBSTITUTIONS = frozenset({Mechanism.SN1, Mechanism.SN2, Mechanism.SN2_PRIME, Mechanism.NGP})


class Course(StrEnum):
    """Stereochemical course at the reacting centre, or of an elimination or addition."""

    INVERSION = "inversion"
    RETENTION = "retention"
    RACEMISATION = "racemisation"
    PARTIAL_INVERSION = "partial inversion"
    DOUBLE_INVERSION = "double inversion"
    ANTI = "anti"
    SYN = "syn"
    NOT_APPLICABLE = "not applicable"
    NOT_DETERMINED = "not determined"


class StereoKind(StrEnum):
    """What a bottle holds, kept apart from what is drawn.

    In a racemate any drawn relative configuration holds; meso counts as achiral; a mixture is stated by ee, er
    or dr.
    """

    SINGLE_ENANTIOMER = "single enantiomer"
    RACEMATE = "racemate"
    MIXTURE = "mixture"
    UNKNOWN_ENANTIOMER = "unknown enantiomer"
    ACHIRAL = "achiral"
    NOT_DETERMINED = "not determined"


class Status(StrEnum):
    """Where an entry stands in its life."""

    DRAFT = "draft"
    CURRENT = "current"
    SUPERSEDED = "superseded"
    WITHDRAWN = "withdrawn"

    @property
    def is_retired(self) -> bool:
        """Say whether an entry of this status no longer holds."""
        return self in {Status.SUPERSEDED, Status.WITHDRAWN}


class Result(StrEnum):
    """What was seen to happen, in the order of importance."""

    SUBSTITUTION = "substitution"
    ELIMINATION = "elimination"
    REARRANGEMENT = "rearrangement"
    ADDITION = "addition"
    RING_OPENING = "ring opening"
    DECOMPOSITION = "decomposition"
    NO_REACTION = "no reaction"

    @property
    def gives_products(self) -> bool:
        """Say whether it gives products that can be named and measured."""
        return self not in {Result.DECOMPOSITION, Result.NO_REACTION}


class NucleophileWord(StrEnum):
    """Words that stand in place of a charged nucleophile."""

    SOLVENT = "solvent"
    INTERNAL = "internal"
    NONE = "none"


class ReagentUse(StrEnum):
    """Why a reagent is in the flask."""

    ACTIVATOR = "activator"
    ACID = "acid"
    BASE = "base"
    CATALYST = "catalyst"
    ADDITIVE = "additive"
    BUFFER = "buffer"


class ProductUse(StrEnum):
    """What a product was wanted for."""

    DESIRED = "desired"
    BY_PRODUCT = "by-product"


class YieldKind(StrEnum):
    """What a yield means: weighed, measured against a standard, or an uncalibrated area share."""

    ISOLATED = "isolated"
    ASSAY = "assay"
    AREA = "area"


class Thermometer(StrEnum):
    """Where a temperature was read."""

    INTERNAL = "internal"
    JACKET = "jacket"
    BATH = "bath"


class Vessel(StrEnum):
    """How a stage was contained."""

    OPEN = "open"
    REFLUX = "reflux"
    SEALED = "sealed"
    GAS_COLLECTED = "gas collected"
    FLOW = "flow"
    MICROWAVE = "microwave"


class Disclosure(StrEnum):
    """Who may see an entry; `handbook build --only cleared` keeps back the first two."""

    INTERNAL = "internal"
    UNDER_FILING = "under filing"
    CLEARED = "cleared"
    PUBLISHED = "published"
