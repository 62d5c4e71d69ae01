"""The text answer, on forecasts made by hand: what the engine finds today does not matter here."""

import math
from dataclasses import replace
from typing import Any

import pytest

from builder.chemistry.structure import parse_smiles
from builder.mechanism.asking import Read, question_from_words
from builder.mechanism.forecast import Contribution, Forecast, Forecasted, PathwayReport, Reason
from builder.publish.forecast_parts import time_text, verdict_sentence
from builder.publish.forecast_text import render_forecast
from builder.records.vocabulary import Course, Mechanism

TIMES = [(None, "unknown"), (math.inf, "never"), (5400.0, "1.5 h")]


@pytest.mark.parametrize(("seconds", "text"), TIMES)
def test_a_time_may_be_unknown_or_without_end(seconds: float | None, text: str) -> None:
    assert time_text(seconds) == text


READ = question_from_words(
    substrate="C[C@H](Br)CCCCCC", nucleophile="sodium azide", solvent=["DMF"], temperature="60 °C", time="16 h"
)
PATHWAY = PathwayReport(
    mechanism=Mechanism.SN2,
    label="SN2",
    event="azide displaces bromide with inversion",
    leaving_group="bromide",
    partner="azide",
    log10_k=-2.0,
    error=0.6,
    share=0.93,
    contributions=(
        Contribution("n of azide", "Swain-Scott n in methanol", 5.78, 0.05, "pearson-songstad-1968"),
        Contribution("no such term", "something nobody has measured", -9.0, 0.9, "estimated-here"),
    ),
)
SN2 = Forecast(
    is_covered=True,
    mechanism=Mechanism.SN2,
    shares={Mechanism.SN2: 0.93, Mechanism.E2: 0.07},
    intervals={Mechanism.SN2: (0.8, 0.98), Mechanism.E2: (0.02, 0.2)},
    log_k={"SN2": -2.0},
    log_k_errors={"SN2": 0.6},
    half_life_s=900.0,
    t95_s=3600.0,
    t99_s=7200.0,
    conversion=0.9995,
    conversion_interval=(0.97, 0.9999),
    products=(
        Forecasted(
            parse_smiles("C[C@@H](N=[N+]=[N-])CCCCCC"),
            0.93,
            Mechanism.SN2,
            Course.INVERSION,
            rearranged=False,
            path=("substitution",),
        ),
    ),
    pathways=(PATHWAY,),
    reasons=(
        Reason("e1cb-without-acceptor", "E1cB at bromide: No carbanion without an acceptor", None, None, "march-2013"),
        Reason("acid-spends-nucleophile", "the acid has taken azide", None, None, "march-2013"),
    ),
)


def of(**changed: Any) -> Forecast:
    return replace(SN2, **changed)


def reason(rule: str, text: str) -> Reason:
    return Reason(rule, text, None, None, "record-format")


VERDICTS = [
    (SN2, "SN2 at the secondary carbon, with inversion; 93 % substitution, 7 % elimination."),
    (
        of(intervals={Mechanism.SN2: (0.3, 0.98), Mechanism.E2: (0.02, 0.7)}),
        "SN2 at the secondary carbon, with inversion; 93 % substitution, 7 % elimination. "
        "A close call: E2 may win within the error.",
    ),
    (
        of(mechanism=Mechanism.NONE, products=(), conversion=0.012, conversion_interval=(0.003, 0.05)),
        "No reaction to speak of in 16 h: conversion 1 % (0.3 to 5 %). "
        "The fastest way would be SN2: azide displaces bromide with inversion.",
    ),
    (
        of(is_covered=False, pathways=(), reasons=(reason("not-covered", "not covered: no leaving group"),)),
        "Not covered: no leaving group.",
    ),
    (
        of(pathways=(), reasons=(reason("sn2-closed-bridgehead", "SN2 at bromide: ..."),)),
        "No reaction is expected: every pathway is closed.",
    ),
    (
        of(pathways=(), reasons=(reason("nothing-acts", "nothing in the flask attacks"),)),
        "No reaction is expected: nothing in the flask attacks.",
    ),
]


@pytest.mark.parametrize(("forecast", "sentence"), VERDICTS, ids=[text[:40] for _, text in VERDICTS])
def test_the_verdict_is_a_sentence(forecast: Forecast, sentence: str) -> None:
    assert verdict_sentence(READ.question, forecast) == sentence


STOP = {
    "id": "azide-acid",
    "severity": "stop",
    "text": "azide with acid: hydrazoic acid",
    "precaution": "keep above pH 9",
    "source": "a source",
    "decides": "local rules and qualified people decide",
}


def test_the_whole_answer_reads_as_a_chemist_needs_it() -> None:
    assert render_forecast(READ, SN2, (STOP,)) == (
        "SN2 at the secondary carbon, with inversion; 93 % substitution, 7 % elimination.\n"
        "A forecast from a rule engine, not a measurement.\n"
        "\n"
        "Read as\n"
        "  substrate    C[C@H](Br)CCCCCC, read as CCCCCC[C@H](C)Br\n"
        "  nucleophile  sodium azide, read as azide with [Na+]\n"
        "  solvent      DMF\n"
        "  conditions   60 °C, 0.5 mol/L substrate (default), 1.50 equivalents (default), 16 h\n"
        "\n"
        "Shares of what reacts, by mechanism (5 to 95 %)\n"
        "  SN2    93 % (80 to 98 %)\n"
        "  E2     7 % (2 to 20 %)\n"
        "\n"
        "Products, share of what reacts\n"
        "      93 %  CCCCCC[C@@H](C)N=[N+]=[N-]  SN2, inversion; substitution\n"
        "\n"
        "Rate\n"
        "  half-life 15 min, 95 % after 60 min\n"
        "  conversion in 16 h: > 99.9 % (97 to > 99.9 %)\n"
        "\n"
        "Why: azide displaces bromide with inversion; log k = −2.00 ± 0.60, k in L/(mol s) at 60 °C\n"
        "    −9.00 ± 0.90  something nobody has measured                             estimated\n"
        "    +5.78 ± 0.05  Swain-Scott n in methanol                                 Pearson, Sobel and Songstad, …\n"
        "    +1.22         from 25 °C to 60 °C\n"
        "\n"
        "Mind\n"
        "  the acid has taken azide\n"
        "  only estimated, no observation bears on it: something nobody has measured\n"
        "\n"
        "Cautions\n"
        "  STOP: azide with acid: hydrazoic acid. Keep above pH 9. [a source]\n"
        "  It is a screen, not a clearance: local rules and qualified people decide.\n"
    )


def test_a_product_of_two_mechanisms_is_one_product() -> None:
    one = SN2.products[0]
    other = replace(
        one, share=0.05, mechanism=Mechanism.SN1, course=Course.RACEMISATION, path=("ionisation", "capture")
    )
    text = render_forecast(READ, of(products=(replace(one, share=0.88), other)), ())
    products = text.split("Products")[1].split("\n\n")[0].splitlines()[1:]
    assert products == [
        f"      93 %  {one.structure.smiles}",
        "            SN2 88 %, inversion; substitution",
        "            SN1 5 %, racemisation; ionisation > capture",
    ]


def test_every_stop_is_shown_and_the_milder_ones_up_to_four() -> None:
    many = [{**STOP, "text": f"stop {n}"} for n in range(6)]
    many += [{**STOP, "id": f"mild-{n}", "severity": "note", "text": f"note {n}"} for n in range(6)]
    text = render_forecast(READ, SN2, many)
    assert (text.count("STOP:"), text.count("NOTE:")) == (6, 4)
    assert "2 more, see --json" in text


CLOSED = (
    reason("sn1-closed-primary", "SN1 at bromide: No plain primary cation"),
    reason("e1cb-without-acceptor", "E1cB at bromide: No carbanion without an acceptor"),
)
MINDED = [
    ({}, of(reasons=CLOSED), "  SN1 at bromide: No plain primary cation (sn1-closed-primary)\n  E1cB: the substrate"),
    ({"temperature": "-78 °C"}, SN2, "-78 °C lies outside the 0 to 150 °C of the data"),
    ({"additives": ["hexane"]}, SN2, "hexane is taken as without effect"),
    ({}, of(half_life_s=math.inf, t95_s=math.inf), "never reached, the reagents run out before"),
    ({}, of(t95_s=math.inf), "half-life 15 min; 95 % is not reached"),
]


@pytest.mark.parametrize(("changed", "forecast", "text"), MINDED, ids=[text for _, _, text in MINDED])
def test_what_to_mind_is_said(changed: dict[str, Any], forecast: Forecast, text: str) -> None:
    words = {"substrate": "CCCCBr", "nucleophile": "NaN3", "solvent": ["DMF"], "temperature": "25 °C", **changed}
    read: Read = question_from_words(**words)
    assert text in render_forecast(read, forecast, ())
