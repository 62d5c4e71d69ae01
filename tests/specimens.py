"""Examples of rules played on the specimen record, as rule tests and corpus tests need them."""

import datetime as dt
import re

from builder.book import Examined, examine, judge
from builder.checks.case import Case
from builder.checks.house import House
from builder.checks.run import check_settings
from builder.finding import Finding
from builder.records.reader import read_bytes, read_into
from builder.records.settings import Person, Settings
from builder.records.specimen import SPECIMEN_FILE, with_example

TODAY = dt.date(2026, 12, 1)
PLAIN = Settings(format=1, title="A book for tests")
TOOL = "1.4.0"
"""The version of the tool in examples of settings."""


def examine_text(text: str | bytes, file: str = SPECIMEN_FILE, settings: Settings | None = None) -> Examined[Case]:
    """Read and check one record."""
    data = text if isinstance(text, bytes) else text.encode()
    return examine(read_bytes(data, file), settings or PLAIN, TODAY)


def findings_of(text: str | bytes, file: str = SPECIMEN_FILE) -> tuple[Finding, ...]:
    """Return the findings of one record alone in its book."""
    return judge([examine_text(text, file)], PLAIN)[file]


def play(example: str) -> tuple[Finding, ...]:
    """Return all findings of an example: YAML over the specimen, further records behind `---`.

    `# file: PATH` names the file of a record, `# retired: ID` an identifier that the settings retire, `# people: CODES`
    the people they list, `# house: {…}` a house rule. An example that begins with `# handbook.yml` is keys of the
    settings instead.
    """
    if example.startswith("# handbook.yml"):
        return _play_settings(example)
    retired = re.findall(r"^# retired: (\S+)$", example, re.MULTILINE)
    house = re.search(r"^# house: (.+)$", example, re.MULTILINE)
    people = re.search(r"^# people: (.+)$", example, re.MULTILINE)
    typed = f"format: 1\ntitle: A book for tests\nhouse_rules: [{house[1] if house else ''}]\n"
    ruled, findings, _ = read_into(Settings, typed, "handbook.yml")
    assert ruled is not None, findings
    settings = ruled.model_copy(
        update={
            "retired": tuple(retired),
            "people": tuple(Person(code=code, shown_as=code) for code in people[1].split()) if people else (),
        }
    )
    parts = [part.removeprefix("\n") for part in re.split(r"^---$", example, flags=re.MULTILINE)]
    examined = []
    for part in parts:
        named = re.search(r"^# file: (\S+)$", part, re.MULTILINE)
        file = named[1] if named else SPECIMEN_FILE
        examined.append(examine_text(with_example(part), file, settings))
    return tuple(finding for found in judge(examined, settings).values() for finding in found)


def _play_settings(example: str) -> tuple[Finding, ...]:
    settings, findings, places = read_into(Settings, f"format: 1\ntitle: A book for tests\n{example}\n", "handbook.yml")
    return (*findings, *check_settings(_house(settings), places)) if settings else findings


def _house(settings: Settings) -> House:
    return House(settings, TOOL, has_logo=settings.logo in {None, "logo.svg"})
