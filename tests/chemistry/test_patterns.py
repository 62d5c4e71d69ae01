"""The pattern tables: their loaders refuse every fault, and what they hold is consistent."""

import pytest

from builder.chemistry.patterns import (
    Electrons,
    load_activations,
    load_attack_patterns,
    load_class_patterns,
    load_leaving_groups,
    parse_attack_patterns,
    parse_class_patterns,
    parse_leaving_groups,
)

HEAD = "name\tabbreviation\tsmarts\tconjugate_acid\tconjugate_acid_pka\tneeds_activation\tactivated_by\tsource\tnote\n"
ROW = "iodide\tI\t[C:1]-[I:2]\tHI\t-10\tno\tsilver\tmarch-2013\t-\n"


@pytest.mark.parametrize(
    ("text", "complaint"),
    [
        ("", "the header must read"),
        (HEAD.replace("smarts", "pattern") + ROW, "the header must read"),
        (HEAD + ROW + ROW, "given twice: iodide"),
        (HEAD + ROW.replace("HI", " "), "a cell is blank"),
        (HEAD + ROW.replace("\t-\n", "\n"), "a cell is blank or missing"),
        (HEAD + ROW.replace("[C:1]", "[C:1"), "is no SMARTS"),
        (HEAD + ROW.replace("[I:2]", "[I]"), "must mark atoms"),
        (HEAD + ROW.replace("march-2013", "hearsay"), "unknown source hearsay"),
        (HEAD + ROW.replace("\tno\t", "\tmaybe\t"), "neither yes nor no"),
        (HEAD + ROW.replace("silver", "hope"), "hope"),
        (HEAD + ROW.replace("-10", "nan"), "no finite number"),
        (HEAD + ROW.replace("-10", "low"), "could not convert"),
    ],
)
def test_a_faulty_leaving_group_table_is_refused(text: str, complaint: str) -> None:
    with pytest.raises(ValueError, match=complaint):
        parse_leaving_groups(text)


def test_a_sound_table_is_read() -> None:
    (row,) = parse_leaving_groups("# quantity: test\n" + HEAD + ROW)
    assert (row.name, row.conjugate_acid_pka, row.needs_activation, row.note) == ("iodide", -10.0, False, "")


def test_faulty_tables_of_classes_and_attacking_atoms_are_refused() -> None:
    classes = "name\tkind\tsmarts\texpected\tmeaning\tsource\nallylic\tsomehow\t[C:1]\tyes\t-\tmarch-2013\n"
    with pytest.raises(ValueError, match="somehow"):
        parse_class_patterns(classes)
    attack = "kind\tpreference\tsmarts\telectrons\treach\tnote\tsource\n"
    with pytest.raises(ValueError, match="must mark atoms"):
        parse_attack_patterns(attack + "enolate\t1\t[C:1]=C[O-]\tshift\tany\t-\tmarch-2013\n")


def test_every_ambident_kind_has_a_usual_atom() -> None:
    kinds = {row.kind for row in load_attack_patterns()}
    usual = {row.kind for row in load_attack_patterns() if row.preference == 1}
    assert kinds == usual


def test_every_way_of_finding_electrons_is_used() -> None:
    assert {row.electrons for row in load_attack_patterns()} == set(Electrons)


def test_every_activation_makes_a_known_leaving_group() -> None:
    assert load_activations().keys() <= {row.name for row in load_leaving_groups()}


def test_words_are_lower_case_and_free_of_punctuation_that_yaml_minds() -> None:
    words = [row.name for row in (*load_leaving_groups(), *load_class_patterns())]
    assert [w for w in words if w != w.lower() or set(w) & set(":#{}[]&*!|>'\"%@`")] == []


def test_strong_acids_leave_without_activation() -> None:
    # A group whose conjugate acid is strong (pKa below 0) needs no activation (March, ch. 10; from memory).
    weak = [r.name for r in load_leaving_groups() if (r.conjugate_acid_pka or 0) < 0 and r.needs_activation]
    assert weak == []
