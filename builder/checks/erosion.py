"""How much configuration the product kept, against the mechanism that is claimed."""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from builder.checks.agreement import AGREEMENT_READS
from builder.checks.case import Case
from builder.checks.derivation import is_desired, routes_by_product
from builder.checks.measured import Span, excess_of_substrate, excess_span
from builder.chemistry.transform import StereoEffect
from builder.finding import Level
from builder.mechanism.erosion import half_life_s, inverted_fraction, racemisation_constant_per_s, specificity
from builder.records.specimen import outcome_example
from builder.records.vocabulary import Course, Mechanism, NucleophileWord
from builder.rule import Fault, Path, rule

__all__ = ["EROSION_CHECKS"]

KEPT_BY_SN2 = 0.95
KEPT_BY_SN1 = 0.5
_SAYS_LOSS = {Course.PARTIAL_INVERSION, Course.RACEMISATION, Course.NOT_APPLICABLE}
_NEEDS = (*AGREEMENT_READS, "label-unknown", "course-twice", "course-contradicts-structure", "ee-above-substrate")


def _eroded(ee: str, mechanism: str = "SN2", course: str = "inversion", start: str = "ee: 98 %") -> str:
    return (
        f"substrate: {{name: (S)-2-bromobutane, smiles: 'CC[C@H](C)Br', stereo: single enantiomer, {start},"
        " class: secondary, leaving_group: bromide, amount: 10 mmol}\nstages: [{temperature: 60 °C, time: 8 h}]\n"
    ) + outcome_example(
        "{yield: 81 %, of: A, kind: assay}",
        f"{{{ee}, of: A, by: chiral HPLC}}",
        products="{label: A, name: (R)-2-azidobutane, smiles: 'CC[C@@H](C)N=[N+]=[N-]', use: desired}",
        more=f"claim: {{mechanism: {mechanism}, course: {course}}}",
    )


@dataclass(frozen=True, slots=True)
class _Kept:
    """The excess of a desired product whose reacting carbon shows it, against that of the substrate."""

    at: Path
    course: Course | None
    before: Span
    after: Span

    @property
    def stated(self) -> float:
        """Return es as the typed numbers give it."""
        return specificity(self.after.stated, self.before.stated)

    @property
    def least(self) -> float:
        """Return the lowest es that rounding and limits leave open."""
        return specificity(self.after.low - self.after.half, min(100.0, self.before.high + self.before.half))

    @property
    def most(self) -> float:
        """Return the highest es that rounding and limits leave open."""
        before = self.before.low - self.before.half
        return specificity(self.after.high + self.after.half, before) if before > 0 else math.inf


def _kept(case: Case) -> Iterator[_Kept]:
    claim, before = case.record.outcome.claim, excess_of_substrate(case.record.substrate)
    if before is None or not before.stated:
        return
    shows = {
        case.record.outcome.products[int(path[-1])].label: path
        for path, routes in routes_by_product(case).items()
        if path[-2] == "products"
        and is_desired(case, path)
        and any(not route.eliminates and route.effect is not StereoEffect.NOT_APPLICABLE for route in routes[:1])
    }
    for index, line in enumerate(case.record.outcome.measured):
        after = excess_span(line.ee, line.er)
        if after is None or line.of is None or len(line.of) != 1 or line.of[0] not in shows:
            continue
        product = case.record.outcome.products[int(shows[line.of[0]][-1])]
        course = product.course or (claim.course if claim is not None else None)
        yield _Kept(("outcome", "measured", index, line.what), course, before, after)


@rule(
    id="ee-kept-under-sn1",
    title="Configuration kept where a free cation is claimed",
    level=Level.QUERY,
    source="iupac-gold",
    needs=_NEEDS,
    fires_on=(_eroded("ee: 80 %", "SN1", "inversion"),),
    silent_on=(_eroded("ee: 20 %", "SN1", "partial inversion"), _eroded("ee: 80 %", "SN2", "partial inversion")),
)
def ee_is_kept_under_sn1(case: Case) -> Iterator[Fault]:
    """Under SN1 a product keeps at most half of the substrate's excess: es = ee of product / ee of substrate ≤ 0.5.

    A free cation is flat and is caught from both sides. An ion pair may shield one of them; more than that is SN2, or a
    neighbouring group, and to be accepted with the reason otherwise. Not asked where the nucleophile is internal, which
    comes back to the face it left.
    """
    claim = case.record.outcome.claim
    if claim is None or claim.mechanism is not Mechanism.SN1 or case.record.nucleophile is NucleophileWord.INTERNAL:
        return
    for kept in _kept(case):
        if kept.least > KEPT_BY_SN1:
            yield Fault(
                at=kept.at,
                message=f"SN1 is claimed, and {100 * kept.stated:.0f} % of the substrate's ee is kept",
                mend="correct the mechanism or the number, or accept this with the reason: ion pair, participation",
                data=_data(case, kept),
            )


@rule(
    id="ee-lost-under-sn2",
    title="Configuration lost where inversion is claimed",
    level=Level.QUERY,
    source="iupac-gold",
    needs=_NEEDS,
    fires_on=(
        _eroded("ee: 80 %"),
        _eroded("er: '90:10'", start="er: '99:1'"),
    ),
    silent_on=(
        _eroded("ee: 95 %"),
        _eroded("er: '98:2'", start="er: '99:1'"),
        _eroded("ee: 80 %", course="partial inversion, basis: ee falls as bromide exchanges"),
    ),
)
def ee_is_lost_under_sn2(case: Case) -> Iterator[Fault]:
    """Under SN2 the product keeps the substrate's excess: es = ee of product / ee of substrate ≥ 0.95.

    98 % going in and 80 % coming out is es 0.82, 91 % of the molecules inverted. Substrate, reaction and product can
    each have lost the rest: the halide that is set free exchanges, an enolisable centre epimerises, part reacts by SN1.
    Then the course is partial inversion, and the basis says where.
    """
    claim = case.record.outcome.claim
    if claim is None or claim.mechanism is not Mechanism.SN2:
        return
    for kept in _kept(case):
        if kept.most < KEPT_BY_SN2 and kept.course not in _SAYS_LOSS:
            share = 100.0 * inverted_fraction(kept.stated)
            yield Fault(
                at=kept.at,
                message=f"SN2 is claimed, and {kept.before.stated:.3g} % ee became {kept.after.stated:.3g} %:"
                f" es {kept.stated:.2f}, {share:.0f} % inverted",
                mend="write course: partial inversion with the cause in basis, correct the number, or accept this",
                data=_data(case, kept),
            )


def _data(case: Case, kept: _Kept) -> dict[str, object]:
    """Return es, the inverted fraction and, for a loss all through the reaction, its rate constant and half-life."""
    found: dict[str, object] = {
        "es": round(kept.stated, 3),
        "inverted_fraction": round(inverted_fraction(kept.stated), 3),
    }
    time_s = sum(stage.time.magnitude for stage in case.record.stages)
    if 0.0 < kept.after.stated < kept.before.stated:
        constant = racemisation_constant_per_s(kept.before.stated, kept.after.stated, time_s)
        found |= {"k_loss_per_s": float(f"{constant:.2e}"), "half_life_h": round(half_life_s(constant) / 3600.0, 1)}
    return found


EROSION_CHECKS = (
    ee_is_kept_under_sn1,
    ee_is_lost_under_sn2,
)
