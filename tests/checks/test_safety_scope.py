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
        ("azide, at most 5 mmol", "10 mmol"),
        ("azide (up to 5 mmol)", "10 mmol"),
        ("azide at 0,5 mmol", "10 mmol"),
        ("azide at 5000 µmol", "10 mmol"),
        ("azide at 5000 \u03bcmol", "10 mmol"),
        ("azide at 1 000 mmol", None),
        ("azide at 5e-3 mol", "10 mmol"),
        ("azide, behind a shield, 0,5 g", "0.975 g"),
        ("azide in DMF at 5 mmol", "10 mmol"),
        ("azide in DMF or DMSO at 5 mmol", "10 mmol"),
        ("azide with DMF, 5 mmol", "10 mmol"),
        ("azide up to 0.5 grams", "0.975 g"),
        ("azide below 5 MMOL", "10 mmol"),
        ("5 mmol azide in DMF", "10 mmol"),
        ("up to 5 mmol of sodium azide", "10 mmol"),
        ("cyanide at 30 mmol, 5 mmol dry sodium azide", "10 mmol"),
        ("azide from 5 mmol to 10 mmol", None),
        ("azide and nitrite at 5 mmol", "10 mmol"),
        ("azide with nitrite at 5 mmol", "10 mmol"),
        ("nitrite, azide and hydride at 5 mmol", "10 mmol"),
        ("azide at 20 mmol and nitrite at 1 mmol", None),
        ("azide at 20 mmol, nitrite (1 mmol)", None),
        ("nitrite 1 mmol, azide 20 mmol, hydride 1 mmol", None),
        # What follows an amount of azide speaks of something else, and neither lifts nor lowers it.
        ("azide at 5 mmol, hydrogen up to 20 mmol", "10 mmol"),
        ("azide at 10 mmol, hydrogen up to 1 mmol", None),
        ("azide at 10 mmol, azide up to 0.5 g", "0.975 g"),
        ("azide at 5 mmol, sodium azide up to 15 mmol", None),
        # No concentration, rate, percentage or volume of a solution.
        ("azide at 0.5 mmol/mL", None),
        ("azide at 0.5 mmol per mL", None),
        ("azide at 0.5 mol L⁻¹", None),
        ("azide dosed at 1 mmol/h", None),
        ("azide with 5 mol% of crown ether", None),
        ("azide in 20 mL of DMF", None),
        ("bromide at 1 mmol", "10 mmol"),
        ("everything at 10 mmol", None),
        ("everything at 5 mmol", "10 mmol"),
        ("azide in one run; all below 0.5 mol/L", None),
        ("azide, 20 mL of a 0.5 mol/L solution", None),
    ],
)
def test_an_amount_in_the_scope_is_not_exceeded(words: str, held: str | None) -> None:
    # Where a scope ties no amount to a substance it names, the amount is the scale of the run: 10 mmol of substrate.
    found = faults("safety-scope-exceeded", with_example(signed(words)))
    assert [str(fault.data["held"]) for fault in found] == ([held] if held else [])


def test_the_excess_names_both_amounts() -> None:
    (fault,) = faults("safety-scope-exceeded", with_example(signed("azide at 5 mmol")))
    assert fault.message == "sodium azide: 10 mmol, and the safety review covers 5 mmol"
    assert fault.at == ("nucleophile", 0)


@pytest.mark.parametrize(
    ("words", "at"),
    [
        ("(S)-Octan-2-yl methanesulfonate up to 1 g", [("substrate",)]),
        ("azide at 10 mmol, (S)-octan-2-yl methanesulfonate at 3 g", []),
        ("azide, but no DMF, up to 0.5 g", [("nucleophile", 0)]),
        ("up to 1 g in hood 3", [("substrate",)]),
        ("up to 3 g in hood 3", []),
        ("azide at 10 mmol, 1 g in hood 3", []),
    ],
)
def test_an_amount_holds_for_what_it_speaks_of(words: str, at: list[tuple[object, ...]]) -> None:
    # By hand: the specimen charges 2.083 g of the mesylate, (S)-octan-2-yl methanesulfonate.
    found = faults("safety-scope-exceeded", with_example(signed(words)))
    assert [fault.at for fault in found] == at


def test_a_volume_is_that_of_the_liquid_charged() -> None:
    reagent = (
        "reagents: [{name: iodomethane, smiles: CI, use: additive, volume: 5 mL, density: 2.28 g/mL}]\n"  # from memory
    )
    held = {
        words: [
            str(fault.data["held"]) for fault in faults("safety-scope-exceeded", with_example(signed(words) + reagent))
        ]
        for words in ("iodomethane up to 2 mL", "iodomethane up to 5000 µL", "iodomethane, 2 mL of a solution")
    }
    assert list(held.values()) == [["5 mL"], [], []]
