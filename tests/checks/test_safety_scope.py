"""What the scope of a safety review lifts: what it names, up to the amounts it states, and nothing else."""

import pytest

from builder.records.specimen import with_example
from tests.blocking import BLOCKING, NO_REVIEW, Blocking, blocked, signed
from tests.checks.test_cautions import faults

DCM = "solvent: [{name: dichloromethane, volume: 20 mL}]"
HYDRIDE = "base: [{name: sodium hydride, smiles: '[Na+].[H-]', amount: 10 mmol}]"
NITRITE = "reagents: [{name: sodium nitrite, smiles: '[Na+].[O-]N=O', use: additive, amount: 1 mmol}]"
CYANIDE = (
    "reagents: [{name: potassium cyanide, smiles: '[K+].[C-]#N', use: additive, amount: 1 mmol}]\n"
    "work_up: ['acidify with 2 mol/L HCl']"
)
ACID_QUENCH = "work_up: ['quench with 1 mol/L hydrochloric acid']"


@pytest.mark.parametrize("each", BLOCKING, ids=lambda each: each.done)
def test_it_blocks_until_its_scope_is_signed(each: Blocking) -> None:
    assert each.caution in blocked(NO_REVIEW + each.example)
    assert each.caution in blocked(signed("lasers in hood 3") + each.example)
    assert each.caution not in blocked(signed(each.scope) + each.example)


@pytest.mark.parametrize(
    ("words", "example", "left"),
    [
        ("azide at 10 mmol", DCM, set()),
        ("azide at 10 mmol", ACID_QUENCH, set()),
        ("sodium azide at 15 mmol in DCM", DCM, set()),
        ("azide at 10 mmol", HYDRIDE, {"hydride-amide-solvent"}),
        ("azide and hydride at 10 mmol", HYDRIDE, set()),
        ("azide at 10 mmol", NITRITE, {"nitrite-amide-solvent"}),
        ("azide at 10 mmol, nitrite with DMF, no amine", NITRITE, set()),
        ("azide at 10 mmol, no acid", ACID_QUENCH, {"azide-acid"}),
        ("azide at 10 mmol, no chlorinated solvent", DCM, {"azide-dichloromethane"}),
        ("everything in hood 3", DCM, {"azide-dichloromethane"}),
    ],
)
def test_a_scope_covers_what_it_names(words: str, example: str, left: set[str]) -> None:
    assert blocked(signed(words) + example) == left


def test_azide_does_not_cover_cyanide_and_the_message_says_what_the_scope_must_name() -> None:
    found = faults("hazard-out-of-scope", with_example(signed("azide at 10 mmol") + CYANIDE))
    cyanide = next(fault for fault in found if fault.data["caution"] == "cyanide-acid")
    assert cyanide.message.endswith("the safety review names azide, not cyanide")
    assert "named in the scope of safety_review" in cyanide.mend
    assert "local rules and qualified people decide" in cyanide.mend


@pytest.mark.parametrize(
    ("words", "held"),
    [
        # By hand: the specimen charges 10 mmol of substrate and 15 mmol of sodium azide, 0.975 g (65.01 g/mol).
        ("azide at 10 mmol", None),
        ("azide at 15 mmol", None),
        ("azide at 5 mmol", "10 mmol"),
        ("azide up to 1 g", None),
        ("azide up to 500 mg", "0.975 g"),
        ("azide at 10 mmol (hydride 2 g another day)", None),
        ("bromide at 1 mmol", None),
        ("azide, 20 mL of a 0.5 mol/L solution", None),
    ],
)
def test_an_amount_in_the_scope_is_not_exceeded(words: str, held: str | None) -> None:
    found = faults("safety-scope-exceeded", with_example(signed(words)))
    assert [str(fault.data["held"]) for fault in found] == ([held] if held else [])


def test_the_excess_names_both_amounts() -> None:
    (fault,) = faults("safety-scope-exceeded", with_example(signed("azide at 5 mmol")))
    assert fault.message == "sodium azide: 10 mmol, and the safety review covers 5 mmol"
    assert fault.at == ("nucleophile", 0)
