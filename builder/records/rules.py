"""The rules that reading a record can break: YAML traps, form, quantities.

Each card stands for faults that the reader itself finds, so that they have a page, a source and tested examples
like every other rule. An example is YAML text that replaces whole top-level keys of the specimen record.
"""

from builder.finding import Level
from builder.records.specimen import GAP, TWO_PRODUCTS, outcome_example
from builder.rule import Rule, card

__all__ = ["READING_RULES", "reading_rule"]

READING_RULES: tuple[Rule[object, object], ...] = (
    card(
        id="alias-overgrown",
        title="More values than a record may hold",
        level=Level.ERROR,
        source="record-format",
        text="""A record as read holds at most 20,000 values, each alias counted as what it repeats.

        A handful of nested aliases can stand for millions of values and would stall every reader of the book.""",
        fires_on=(
            "evidence: [&a [x,x,x,x,x,x,x,x,x,x], &b [*a,*a,*a,*a,*a,*a,*a,*a,*a,*a],"
            " &c [*b,*b,*b,*b,*b,*b,*b,*b,*b,*b], &d [*c,*c,*c,*c,*c,*c,*c,*c,*c,*c],"
            " [*d,*d,*d,*d,*d,*d,*d,*d,*d,*d]]",
        ),
        silent_on=("evidence: [&method 1H NMR, *method]",),
    ),
    card(
        id="boolean-word",
        title="yes or no where true or false is meant",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""A yes-or-no value is written true or false.

        YAML 1.1 readers turn yes, no, on and off into booleans, YAML 1.2 readers keep them as words: the same file
        would mean two things.""",
        fires_on=("neat: no\n# without solvent",),
        silent_on=("neat: true\n# without solvent\nstages: [{temperature: 60 °C, time: 16 h}]",),
    ),
    card(
        id="duplicate-key",
        title="A key stands twice",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""Each key stands once in its mapping.

        Most readers silently keep the last of two values, so half of what was typed would vanish.""",
        fires_on=("title: first title\ntitle: second title",),
        silent_on=("title: one title",),
    ),
    card(
        id="empty-value",
        title="A key without a value",
        level=Level.ERROR,
        source="record-format",
        text="""A key that stands in the record has a value.

        An empty value is either forgotten, or swallowed by a # that YAML reads as a comment. What is not known is
        left out, key and all.""",
        fires_on=("notebook:", "notebook: #112"),
        silent_on=("notebook: '#112'",),
    ),
    card(
        id="file-misnamed",
        title="A YAML file that is no record's",
        level=Level.ERROR,
        source="record-format",
        text="""Below entries/ a YAML file is a record called NS….yml, the settings, or stands in archive/ or schema/.

        A record under another name, or with the ending .yaml, would be left out of the book without a word.""",
        fires_on=(),
    ),
    card(
        id="file-not-text",
        title="The file is not UTF-8 text",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""A record is UTF-8 text without control characters.

        A byte-order mark and Windows line ends are tolerated; other encodings would turn °, µ and α into something
        else.""",
        fires_on=("title: a bell \x07 in the title",),
        silent_on=("title: 60 °C, µmol and α are fine",),
    ),
    card(
        id="file-too-large",
        title="The file is too large for a record",
        level=Level.ERROR,
        source="record-format",
        text="""A record file is at most 256 kB.

        A long record has 10 kB. Spectra and pictures stay where they are, and are named with their SHA-256.""",
        fires_on=(),
    ),
    card(
        id="file-unreachable",
        title="A record that is no plain file of the book",
        level=Level.ERROR,
        source="record-format",
        text="""A record is a plain file inside the book that can be read.

        A link to somewhere else would let a change outside the book change it; a folder or a pipe holds no record.""",
        fires_on=(),
    ),
    card(
        id="gap-left-open",
        title="A gap of the skeleton is still open",
        level=Level.ERROR,
        source="record-format",
        text="""What `handbook new` left to fill in is filled in.

        A key that nobody can fill is taken out, so that its absence is seen. All gaps of a record are told in one
        finding, with their lines.""",
        fires_on=(f"notebook: {GAP}", f"stages: [{{temperature: {GAP}, time: 16 h}}]"),
        silent_on=("notebook: BK2/112",),
    ),
    card(
        id="house-rule-not-one",
        title="A house rule without exactly one demand",
        level=Level.ERROR,
        source="record-format",
        text="""A house rule is one agreement with one reason: a sentence, or one demand that is checked.

        Two demands in one rule would share a reason and be accepted together.""",
        fires_on=(
            "# handbook.yml\nhouse_rules: [{banned_solvents: DMF, measured: internal, because: agreed}]",
            "# handbook.yml\nhouse_rules: [{because: agreed}]",
        ),
        silent_on=("# handbook.yml\nhouse_rules: [{banned_solvents: DMF, because: toxic for reproduction}]",),
    ),
    card(
        id="key-missing",
        title="A required key is missing",
        level=Level.ERROR,
        source="record-format",
        text="""A record has everything without which it says nothing.

        Required are format, entry, revision, status, title, performed, substrate, nucleophile or base, solvent or
        neat, one stage with temperature and time, and the outcome with its result.""",
        fires_on=("outcome: {sought: CCC}", "stages: [{time: 16 h}]", "superseded: {because: better data}"),
        silent_on=("stages: [{temperature: 60 °C, time: 16 h}]",),
    ),
    card(
        id="key-unknown",
        title="A key the format does not have",
        level=Level.ERROR,
        source="record-format",
        text="""Only the keys of the format stand in a record.

        A mistyped key would otherwise be ignored, and its value with it.""",
        fires_on=("sovent: [{name: DMF, volume: 20 mL}]",),
        silent_on=("notebook: BK2/112",),
    ),
    card(
        id="markup-in-text",
        title="HTML in a text",
        level=Level.ERROR,
        source="record-format",
        text="""Names and notes are plain text, without HTML.

        The site shows every text as it is typed, so a tag would stand there as letters; and what asks a browser to load
        or run something has no place in a record.""",
        fires_on=("title: Azide <img src=x onerror=alert(1)>", "take_away: the <sup>13</sup>C signal is enough"),
        silent_on=("take_away: 'at < 5 % water, A > B'",),
    ),
    card(
        id="measurement-not-one",
        title="A measurement line without exactly one measurement",
        level=Level.ERROR,
        source="record-format",
        text="""Each line of `measured` holds exactly one of yield, conversion, recovered, ee, er, dr and ratio.

        Otherwise nobody can say which of them the method, the spread and the label belong to.""",
        fires_on=(outcome_example("{yield: 81 %, ee: 97 %, of: A, kind: isolated}"),),
        silent_on=(outcome_example("{yield: 81 %, of: A, kind: isolated}"),),
    ),
    card(
        id="text-cut-by-comment",
        title="A text ends where YAML sees a comment",
        level=Level.REMARK,
        source="yaml-1-2",
        text="""A text with a # behind a space stands in quotes.

        There a comment begins: Run #3 of azide is read as Run. A remark of one's own is set apart, # like this.""",
        fires_on=("title: Run #3 of azide", "work_up: [brine]\nnotebook: BK2 #112  # copied"),
        silent_on=("title: 'Run #3 of azide'", "title: Azide of stage 1  # formed there"),
    ),
    card(
        id="text-split-at-comma",
        title="A text is split at its comma",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""A name or text with a comma inside [ ] or { } stands in quotes.

        There the comma ends a value: {name: 2,2-dimethylpropane} reads as the name 2 and a key without value.""",
        fires_on=(
            "related: []\nsolvent: [{name: 1,4-dioxane, volume: 20 mL}]",
            "stages: [{add: [1,4-dioxane, sodium azide], temperature: 60 °C, time: 16 h}]",
        ),
        silent_on=("solvent: [{name: '1,4-dioxane', volume: 20 mL}]\nstages: [{temperature: 60 °C, time: 16 h}]",),
    ),
    card(
        id="nesting-too-deep",
        title="The file is nested too deeply",
        level=Level.ERROR,
        source="record-format",
        text="""A record nests at most 16 levels deep.

        The format itself needs six; more is a slip of the keyboard or an attack.""",
        fires_on=("evidence: " + "[" * 30 + "]" * 30,),
        silent_on=("evidence: [1H NMR]",),
    ),
    card(
        id="number-altered",
        title="A number that YAML would alter",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""Numbers are plain decimals: no leading zeros, no octal, hexadecimal or infinite ones.

        0042 is read as 42 or as 34, depending on the reader. What is no number, a lot or a page, is quoted.""",
        fires_on=("notebook: 0042", "revision: 0x1"),
        silent_on=("notebook: '0042'",),
    ),
    card(
        id="quantity-arithmetic",
        title="A sum or a range in place of a number",
        level=Level.ERROR,
        source="record-format",
        text="""A quantity is one number with one unit.

        The record holds what was weighed; sums are done once, by the builder.""",
        fires_on=(
            "stages: [{temperature: 60 °C, time: 2*8 h}]",
            "stages: [{temperature: 60 °C, time: 1–2 h}]",
        ),
        silent_on=("stages: [{temperature: 60 °C, time: 16 h}]",),
    ),
    card(
        id="quantity-decimal-comma",
        title="A comma inside a number",
        level=Level.ERROR,
        source="record-format",
        text="""The decimal sign is a point, and thousands are not set apart.

        2,083 is two in one country and two thousand in another.""",
        fires_on=("solvent: [{name: DMF, volume: '1,5 mL'}]",),
        silent_on=("solvent: [{name: DMF, volume: 1.5 mL}]",),
    ),
    card(
        id="quantity-out-of-range",
        title="A quantity nature does not allow",
        level=Level.ERROR,
        source="record-format",
        text="""Amounts, times and pressures are positive, percentages lie within their bounds, temperatures above 0 K.

        A yield a little above 100 % is a matter for the balance, not for this rule.""",
        fires_on=(
            "stages: [{temperature: -300 °C, time: 16 h}]",
            "stages: [{temperature: 60 °C, time: -1 h}]",
        ),
        silent_on=("stages: [{temperature: -78 °C, time: 16 h}]",),
    ),
    card(
        id="quantity-unknown-unit",
        title="A unit outside the closed list",
        level=Level.ERROR,
        source="record-format",
        text="""Units come from a closed list.

        Each stands for itself alone, so that a record means the same to every reader.""",
        fires_on=("stages: [{temperature: 60 °C, time: 16 hours}]",),
        silent_on=("stages: [{temperature: 60 °C, time: 16 h}]",),
    ),
    card(
        id="quantity-unreadable",
        title="Not a quantity",
        level=Level.ERROR,
        source="record-format",
        text="""A quantity is a number, a space and a unit.

        Everything beside that belongs into a note.""",
        fires_on=("stages: [{temperature: warm, time: 16 h}]",),
        silent_on=("stages: [{temperature: 60 °C, time: 16 h}]",),
    ),
    card(
        id="quantity-vague",
        title="A word in place of a measurement",
        level=Level.ERROR,
        source="record-format",
        text="""rt, overnight, reflux and about are no quantities.

        They hide the variables on which the next run depends: a room has 17 °C or 31 °C, a night 10 h or 18 h.""",
        fires_on=("stages: [{temperature: rt, time: overnight}]",),
        silent_on=("stages: [{temperature: 20 °C to 25 °C, time: 16 h}]",),
    ),
    card(
        id="quantity-without-unit",
        title="A number without its unit",
        level=Level.ERROR,
        source="record-format",
        text="""Every quantity carries its unit.

        60 could be °C or K, and 2 could be g or mmol.""",
        fires_on=("stages: [{temperature: 60, time: 16 h}]",),
        silent_on=("stages: [{temperature: 60 °C, time: 16 h}]",),
    ),
    card(
        id="quantity-wrong-dimension",
        title="A unit of another kind of quantity",
        level=Level.ERROR,
        source="record-format",
        text="""A mass is in grams, an amount in moles, a volume in litres.

        The unit says what was measured, so it must fit the key.""",
        fires_on=("solvent: [{name: DMF, volume: 20 g}]",),
        silent_on=("solvent: [{name: DMF, volume: 20 mL}]",),
    ),
    card(
        id="ratio-unreadable",
        title="A ratio outside the grammar",
        level=Level.ERROR,
        source="record-format",
        text="""A ratio is written 'A:B = 65:35'; parts may be sums of labels, er and dr are numbers only.

        Labels are the ones given to the products, as many parts as numbers.""",
        fires_on=(outcome_example("{ratio: '65/35', by: GC}"),),
        silent_on=(outcome_example("{ratio: 'A:B = 90:10', by: GC, calibrated: true}", products=TWO_PRODUCTS),),
    ),
    card(
        id="smiles-unquoted",
        title="A SMILES that YAML reads as something else",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""A SMILES stands in single quotes.

        [OH-] becomes a list, *CC an alias, and inside double quotes the backslash of C\\C=C\\C is an escape.""",
        fires_on=("nucleophile: {name: sodium azide, smiles: [Na+].[N-]=[N+]=[N-], equivalents: 1.5}",),
        silent_on=("nucleophile: {name: sodium azide, smiles: '[Na+].[N-]=[N+]=[N-]', equivalents: 1.5}",),
    ),
    card(
        id="tag-refused",
        title="A YAML tag",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""Records carry no YAML tags.

        A tag asks the reader to build an object of the writer's choice; a record is data and nothing else.""",
        fires_on=("title: !!python/object/apply:os.system ['true']",),
        silent_on=("title: no tag here!",),
    ),
    card(
        id="value-not-permitted",
        title="A value outside the permitted ones",
        level=Level.ERROR,
        source="record-format",
        text="""Where the format has a closed list, or a shape, the value fits it.

        Lists and pages are built from these words, so each idea has one.""",
        fires_on=("status: finished", "performed: {date: 14.03.2026, by: [bench-2]}", "related: [NS0000000]"),
        silent_on=("status: draft",),
    ),
    card(
        id="value-wrong-type",
        title="A value of the wrong kind",
        level=Level.ERROR,
        source="record-format",
        text="""A name is text, a count is a whole number, a list is a list.

        What looks like a number but is a name or a code is quoted.""",
        fires_on=("title: 42", "title: [a, b]"),
        silent_on=("title: '42'",),
    ),
    card(
        id="yaml-1-1-reads-otherwise",
        title="An older YAML reader would alter this",
        level=Level.REMARK,
        source="yaml-1-2",
        text="""A plain 97:3, NO or 1e-4 is read as typed here, but not by a YAML 1.1 reader.

        There 97:3 is a number to base 60, NO is false and 1e-4 is text. Quotes settle it for both.""",
        fires_on=("title: NO", "notebook: 12:30"),
        silent_on=("title: 'NO'",),
    ),
    card(
        id="yaml-unreadable",
        title="The file is not YAML",
        level=Level.ERROR,
        source="yaml-1-2",
        text="""A record is one YAML document.

        The usual causes are a tab in the margin, a colon followed by a space inside a text without quotes, or a
        value that begins with one of @ ` % & * ! | > { [.""",
        fires_on=("title: a: b", "title: @home", "title: '$unclosed"),
        silent_on=("title: 'a: b'",),
    ),
)

_BY_ID = {rule.id: rule for rule in READING_RULES}


def reading_rule(rule_id: str) -> Rule[object, object]:
    """Return the card with this id.

    Raises KeyError for an id that no reading rule has: our fault, never the record's.
    """
    return _BY_ID[rule_id]
