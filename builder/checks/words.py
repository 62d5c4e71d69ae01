"""Words in a free text that stand where a number or a name belongs."""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache

from pydantic import BaseModel

from builder.checks.case import Case
from builder.finding import Level
from builder.records.model import STRUCTURES
from builder.rule import Fault, Path, rule

__all__ = ["WORD_CHECKS"]


@dataclass(frozen=True, slots=True)
class _Vague:
    """A word that leaves open what was done.

    word: the pattern that finds it, honest uses left out. told_by: what in the same clause tells it after all; empty
    where nothing could. wanted: what to write, and where.
    """

    word: re.Pattern[str]
    told_by: re.Pattern[str] | None
    wanted: str


def _vague(word: str, told_by: str, wanted: str) -> _Vague:
    told = re.compile(told_by, re.IGNORECASE) if told_by else None
    return _Vague(re.compile(word, re.IGNORECASE), told, wanted)


_TEMPERATURE = r"\d\s*(°|º|℃|K\b)"
_TIME = r"\d\s*(s|min|h|d|hours?|minutes?|days?)\b"
_QUANTITY = r"\d\s*(%|equiv|eq\b|mol|mmol|g\b|mg\b|mL|ml\b|L\b|µL|-?\s?fold)"
_DROPWISE = _vague(r"\bdrop-?wise\b", rf"{_TIME}|mL/min|drops? (per|a) ", "how long it took, over: 15 min")
_VAGUE = (
    _vague(
        r"\br\.t\.|\brt\b|\b(room|ambient) temperature\b",
        _TEMPERATURE,
        "what the thermometer showed, 20 °C to 25 °C; of a stage under temperature",
    ),
    _vague(r"\bover ?night\b|\bo/n\b|\bover the weekend\b", _TIME, "the time it was, 16 h; of a stage under time"),
    _vague(
        r"(?<!\bis )(?<!\bare )(?<!\bwas )\b(in|an|with|large|slight|small|big|huge)\s+excess\b",
        _QUANTITY,
        "the equivalents, in the line of the substance",
    ),
    _vague(r"\bcatalytic\s+(amounts?|quantit(y|ies))\b|\bcat\.\s", _QUANTITY, "the equivalents, or mol %"),
    _DROPWISE,
    _vague(
        r"^\s*dry\s*$|\bdry\s+(?=(solvents?|ether|acetone|acetonitrile|alcohols?|ethanol|methanol|benzene|toluene|pyridine"
        r"|dioxane|dichloromethane|chloroform|tetrahydrofuran|acetic acid|pentane|hexane|THF|DMF|DMSO|DMAc|NMP|DCM|MeCN"
        r"|MeOH|EtOH|2-butanone)\b)",
        r"ppm|%\s*(of )?water|sieves?|distilled|Karl Fischer",
        "the water content in ppm, or how it was dried",
    ),
    _vague(r"\b(standard|usual|normal|routine) work-?\s?up\b|\bworked up as usual\b", "", "the steps, under work_up"),
    _vague(r"\bas usual\b|\bin the usual (way|manner)\b", "", "what was done"),
    _vague(r"\bworked (very )?(well|fine|nicely)\b|\bwent (well|fine)\b", "", "a number: yield, conversion, ratio"),
    _vague(r"\bsome\s+(?!\d|cases?\b|reasons?\b|of\b|weeks?\b|days?\b)", r"\d\s*%", "how much"),
    _vague(
        r"\ba (little|bit of|few drops of)\b(?!\s+(more|less|faster|slower|later|earlier|higher|lower)\b)",
        _QUANTITY,
        "how much",
    ),
)
_LIKELY = re.compile(
    r"r\.?t\b|temperature|over ?night|o/n|weekend|excess|\bcat|drop|dry|usual|work|went|some|little|bit of|few drops",
    re.IGNORECASE,
)
"""A piece of each of them: a text without any is done with."""
_QUOTED = re.compile(r'"[^"]*"|“[^”]*”|‘[^’]*’|«[^»]*»')
_NOT_READ = frozenset({*STRUCTURES, "cas", "name", "entry", "by", "accepted", "rxn_file"})
"""Structures, names and methods are no prose; what is accepted has its reason already."""


@rule(
    id="text-vague",
    title="A free text with a word that says nothing",
    level=Level.QUERY,
    source="common-practice",
    fires_on=(
        "take_away: worked well",
        "work_up: [standard work-up]",
        "stages: [{temperature: 60 °C, time: 16 h, note: azide in excess}]",
        "stages: [{temperature: 60 °C, time: 16 h, note: bromide added dropwise at 0 °C}]",
        "stages: [{temperature: 60 °C, time: 16 h, note: 'in dry DMF, then stirred overnight at rt'}]",
        "take_away: some alkene forms",
    ),
    silent_on=(
        "take_away: 81 % in 16 h; elimination below 5 %.",
        "work_up: ['dry over MgSO4, dry-loaded on 20 g silica, excess azide stays in the water']",
        "stages: [{temperature: 60 °C, time: 16 h, note: 'cooled with dry ice, bromide dropwise over 15 min'}]",
        "stages: [{temperature: 60 °C, time: 16 h, note: 'azide in 0.5 equiv excess, DMF with 30 ppm water'}]",
        "evidence: ['the catalytic hydrogenation gives butan-2-amine', '\"Dropwise\", BK1/001']",
    ),
)
def text_says_nothing(case: Case) -> Iterator[Fault]:
    """A text says a number, a time or a cause, not rt, overnight, excess, catalytic, dropwise, dry, some or as usual.

    Each hides what the next run depends on: a room has 17 °C or 31 °C, a night 10 h or 18 h, dry DMF 30 ppm or 500 ppm
    of water. What the same clause tells, "dropwise over 15 min", is told. Names and quoted words are left alone.
    """
    for path, text in _texts(case.record):
        found = next((each for each in _vague_words(text) if not _is_told_elsewhere(case, path, each[1])), None)
        if found is not None:
            word, vague = found
            yield Fault(at=path, message=f'"{word}" leaves open how much or how', mend=f"write {vague.wanted}")


def _vague_words(text: str) -> Iterator[tuple[str, _Vague]]:
    """Yield the vague words of a text that nothing in their clause tells."""
    if not _LIKELY.search(text):
        return
    for clause in re.split(r";|\.\s", _QUOTED.sub(" ", text)):
        for vague in _VAGUE:
            found = vague.word.search(clause)
            if found and not (vague.told_by and vague.told_by.search(clause)):
                yield found[0].strip(), vague


def _is_told_elsewhere(case: Case, path: Path, vague: _Vague) -> bool:
    """Say whether the stage that a note belongs to has the duration of an addition typed."""
    match path:
        case ("stages", int(index), *_):
            return vague is _DROPWISE and case.record.stages[index].over is not None
    return False


def _texts(part: object, path: Path = ()) -> Iterator[tuple[Path, str]]:
    """Yield every text of a record that is prose, with its path."""
    if isinstance(part, str):
        yield path, part
    elif isinstance(part, tuple):
        for index, item in enumerate(part):
            yield from _texts(item, (*path, index))
    elif isinstance(part, BaseModel):
        for name, key in _prose_of(type(part)):
            value = getattr(part, name)
            if value is not None:
                yield from _texts(value, (*path, key))


@cache
def _prose_of(model: type[BaseModel]) -> tuple[tuple[str, str], ...]:
    """Return attribute and key of the fields of a part of a record that are read."""
    named = ((name, info.alias or name) for name, info in model.model_fields.items())
    return tuple((name, key) for name, key in named if key not in _NOT_READ)


WORD_CHECKS = (text_says_nothing,)
