"""Mistakes of the pen, made on purpose in sound records: which rule must catch each, and where.

A mistake changes a document, or the text of one, and says where it must be found. Line and column are taken from
ruamel.yaml, or counted in the text where no YAML reader can read it; never from the reader that is tested.
"""

import random
import re
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import islice
from typing import Any

from builder.finding import Finding, Level
from tests.honest_records import Honest, dump, honest_record, in_si, load, molar_mass, percent_of, quantity
from tests.specimens import findings_of

Path = tuple[str | int, ...]
Make = Callable[[Any], Path | None]
"""Changes a document and returns the way to where it shows; None where there is nothing to do the mistake with."""
Garble = Callable[[str], tuple[str, int, int] | None]
"""Returns text that is changed, with line and column from 1; None likewise."""

MISTAKES_EACH = 10
RECORDS = (
    "NS31QC1WC",
    "NS73GVK5P",
    "NS74SQPGF",
    "NSFJVECJZ",
    "NSFZPQCJ2",
    "NSG9D05Y6",
    "NSGNYFAZQ",
    "NSJ3NRD0D",
    "NSK35EYGH",
    "NSKW5VDAA",
    "NSM92QN3H",
    "NSNQJXKB0",
    "NSP5X4055",
    "NSQ1T7VJ6",
    "NSQ8V09TA",
    "NSS7HRHAX",
    "NSWM9V6ZH",
    "NSWMKVE5F",
    "NSXBTQ65D",
    "NSZBFDPZE",
)
"""Entries that between them have something for every mistake: salts, enantiomers, racemates, a solvent that freezes."""
WATER = 18.015  # g/mol


@dataclass(frozen=True, slots=True)
class Mistake:
    """One kind of mistake; rules: any of which catches it. says: what the message or the mend must tell besides."""

    name: str
    rules: frozenset[str]
    make: Make | None = None
    garble: Garble | None = None
    says: str = ""


@dataclass(frozen=True, slots=True)
class Mistaken:
    """A record with one mistake in it, and where that must be found."""

    entry: str
    mistake: Mistake
    text: str
    line: int
    column: int


def mistaken_records(seed: int) -> Iterator[Mistaken]:
    """Yield ten mistakes of each of twenty sound records; a kind that was made seldom is tried first."""
    rng = random.Random(seed)
    made = Counter[str]()
    for entry in RECORDS:
        honest = honest_record(entry, rng)
        in_turn = sorted(rng.sample(MISTAKES, len(MISTAKES)), key=lambda mistake: made[mistake.name])
        possible = (found for mistake in in_turn if (found := mistaken(honest, mistake)) is not None)
        for each in islice(possible, MISTAKES_EACH):
            made[each.mistake.name] += 1
            yield each


def mistaken(honest: Honest, mistake: Mistake) -> Mistaken | None:
    """Return a record with one mistake in it; None where it cannot be made there."""
    text = honest.text
    if mistake.garble is not None:
        garbled = mistake.garble(text)
        return None if garbled is None else Mistaken(honest.entry, mistake, *garbled)
    assert mistake.make is not None
    document = load(text)
    path = mistake.make(document)
    if path is None:
        return None
    changed = dump(document)
    line, column = _position(load(changed), path)
    return Mistaken(honest.entry, mistake, changed, line, column)


def _position(document: Any, path: Path) -> tuple[int, int]:
    """Return line and column of a value, from 1."""
    for step in path[:-1]:
        document = document[step]
    line, column = document.lc.item(path[-1]) if isinstance(path[-1], int) else document.lc.value(path[-1])
    return line + 1, column + 1


# --- amounts --------------------------------------------------------------------------------------------------


def _attacker(document: Any) -> tuple[str, Any] | None:
    """Return the only nucleophile, else the only base, with its key."""
    for key in ("nucleophile", "base"):
        if isinstance(document.get(key), dict):
            return key, document[key]
    return None


def _milligrams_for_grams(document: Any) -> Path | None:
    substrate = document["substrate"]
    if not substrate["mass"].endswith(" g") or "amount" not in substrate:
        return None
    substrate["mass"] = substrate["mass"].replace(" g", " mg")
    return ("substrate", "amount")


def _moles_for_millimoles(document: Any) -> Path | None:
    found = _attacker(document)
    if found is None or not str(found[1].get("amount", "")).endswith(" mmol"):
        return None
    key, substance = found
    if not {"mass"} & substance.keys():
        return None
    substance["amount"] = substance["amount"].replace(" mmol", " mol")
    return (key, "amount")


def _wrong_equivalents(document: Any) -> Path | None:
    found = _attacker(document)
    if found is None or "equivalents" not in found[1] or not {"mass", "amount", "volume"} & found[1].keys():
        return None
    key, substance = found
    substance["equivalents"] = round(float(substance["equivalents"]) * 1.4, 2)
    return (key, "equivalents")


def _microlitres_for_millilitres(document: Any) -> Path | None:
    solvents = document.get("solvent", [])
    if "concentration" not in document or len(solvents) != 1 or not solvents[0].get("volume", "").endswith(" mL"):
        return None
    solvents[0]["volume"] = solvents[0]["volume"].replace(" mL", " µL")
    return ("concentration",)


def _twice_the_concentration(document: Any) -> Path | None:
    solvents = document.get("solvent", [])
    if "concentration" not in document or not solvents or not all("volume" in each for each in solvents):
        return None
    number, unit = document["concentration"].split()
    document["concentration"] = f"{float(number) * 2:#.3g} {unit}"
    return ("concentration",)


def _hydrate_weighed(document: Any) -> Path | None:
    found = _attacker(document)
    if found is None or "mass" not in found[1] or "amount" not in found[1] or {"form", "strength"} & found[1].keys():
        return None
    key, substance = found
    mass = molar_mass(substance["smiles"])
    if WATER / mass < 0.09 or "." not in substance["smiles"]:  # less could be rounding; only salts take up water
        return None
    substance["mass"] = quantity(in_si(substance["mass"]) * (mass + WATER) / mass, "mass", 4)
    return (key, "amount")


def _purity_forgotten(document: Any) -> Path | None:
    substrate = document["substrate"]
    if "amount" not in substrate or {"purity", "strength"} & substrate.keys():
        return None
    substrate["purity"] = "80 %"
    return ("substrate", "amount")


def _lost_counter_ion(document: Any) -> Path | None:
    found = _attacker(document)
    if found is None or not re.match(r"\[(Na|K|Li|Cs)\+\]\.", str(found[1].get("smiles", ""))):
        return None
    key, substance = found
    substance["smiles"] = type(substance["smiles"])(substance["smiles"].split(".", 1)[1])
    return (key, "smiles") if substance["smiles"].count("-]") and "." not in substance["smiles"] else None


# --- conditions -----------------------------------------------------------------------------------------------

_BOILING = {"DMF": 153, "DMSO": 189, "THF": 66, "acetone": 56, "acetonitrile": 82, "ethanol": 78, "methanol": 65}
"""°C at 1 atm, to a degree or three; from memory, as in every table."""


def _stage_in_one_solvent(document: Any) -> tuple[Any, int] | None:
    solvents = document.get("solvent", [])
    if len(solvents) != 1 or solvents[0]["name"] not in _BOILING or len(document["stages"]) != 1:
        return None
    stage = document["stages"][0]
    return None if "pressure" in stage else (stage, _BOILING[solvents[0]["name"]])


def _boiling_in_an_open_flask(document: Any) -> Path | None:
    found = _stage_in_one_solvent(document)
    if found is None:
        return None
    stage, boiling = found
    stage.update(temperature=f"{boiling + 30} °C", vessel="open", measured="internal")
    stage.pop("vessel_volume", None)
    return ("stages", 0, "temperature")


def _reflux_in_the_cold(document: Any) -> Path | None:
    found = _stage_in_one_solvent(document)
    if found is None:
        return None
    stage, boiling = found
    stage.update(temperature=f"{boiling - 25} °C", vessel="reflux", measured="internal")
    return ("stages", 0, "temperature")


def _kelvin(document: Any) -> Path | None:
    stage = document["stages"][-1]
    match = re.fullmatch(r"(\d+) °C", str(stage["temperature"]))
    if match is None or int(match[1]) > 100:
        return None
    stage.update(temperature=f"{int(match[1]) + 273} °C", vessel="sealed")
    return ("stages", len(document["stages"]) - 1, "temperature")


def _frozen(document: Any) -> Path | None:
    if [each["name"] for each in document.get("solvent", [])] != ["DMSO"] or len(document["stages"]) != 1:
        return None
    document["stages"][0].update(temperature="-20 °C")
    return ("stages", 0, "temperature")


def _full_to_the_brim(document: Any) -> Path | None:
    solvents = document.get("solvent", [])
    if not solvents or not all("volume" in each for each in solvents) or len(document["stages"]) != 1:
        return None
    litres = sum(in_si(each["volume"]) for each in solvents)
    document["stages"][0].update(vessel="sealed", vessel_volume=f"{litres * 1100:.3g} mL")
    return ("stages", 0, "vessel_volume")


def _temperature_without_unit(document: Any) -> Path | None:
    match = re.fullmatch(r"(\d+) °C", str(document["stages"][0]["temperature"]))
    if match is None:
        return None
    document["stages"][0]["temperature"] = int(match[1])
    return ("stages", 0, "temperature")


def _overnight(document: Any) -> Path | None:
    document["stages"][-1]["time"] = "overnight"
    return ("stages", len(document["stages"]) - 1, "time")


def _decimal_comma(document: Any) -> Path | None:
    substrate = document["substrate"]
    if "." not in substrate["mass"]:
        return None
    substrate["mass"] = substrate["mass"].replace(".", ",")
    return ("substrate", "mass")


# --- outcome --------------------------------------------------------------------------------------------------


def _measured(document: Any, what: str) -> Iterator[tuple[int, Any]]:
    for index, line in enumerate(document["outcome"].get("measured", [])):
        if what in line:
            yield index, line


def _append(document: Any, text: str) -> int:
    measured = document["outcome"]["measured"]
    measured.append(load(f"[{text}]")[0])
    return len(measured) - 1


def _desired(document: Any) -> tuple[int, Any] | None:
    for index, product in enumerate(document["outcome"]["products"]):
        if product.get("use") == "desired":
            return index, product
    return None


def _above_100(document: Any) -> Path | None:
    index, line = next(_measured(document, "yield"))
    line.pop("mass", None)
    line["yield"] = "118 %"
    return ("outcome", "measured", index, "yield")


def _yield_and_mass(document: Any) -> tuple[int, Any, float] | None:
    for index, line in _measured(document, "yield"):
        if line.get("kind") == "isolated" and "mass" in line and re.fullmatch(r"\d+(\.\d+)? %", str(line["yield"])):
            return index, line, 100 * percent_of(line, "yield")
    return None


def _yield_by_another_mass(document: Any) -> Path | None:
    found = _yield_and_mass(document)
    if found is None:
        return None
    index, line, percent = found
    line["yield"] = f"{percent - 12:g} %"
    return ("outcome", "measured", index, "mass")


def _milligrams_of_product(document: Any) -> Path | None:
    found = _yield_and_mass(document)
    if found is None or not found[1]["mass"].endswith(" g"):
        return None
    index, line, _ = found
    line["mass"] = line["mass"].replace(" g", " mg")
    return ("outcome", "measured", index, "mass")


def _more_than_went_in(document: Any) -> Path | None:
    if any(True for _ in _measured(document, "recovered")):
        return None
    _, line = next(_measured(document, "yield"))
    if line.get("kind") == "area" or 100 * percent_of(line, "yield") < 50:
        return None
    for other in [i for i, _ in _measured(document, "conversion")][::-1]:
        document["outcome"]["measured"].pop(other)
    _append(document, "{recovered: 60 %, of: substrate, by: GC}")
    return ("outcome", "measured")


def _mirrored(document: Any) -> Path | None:
    claim = document["outcome"].get("claim", {})
    found = _desired(document)
    if found is None or claim.get("course") not in ("inversion", "retention"):
        return None
    product = found[1]
    smiles = product["smiles"]
    if product.get("stereo") != "single enantiomer" or len(re.findall(r"@+", smiles)) != 1:
        return None
    swapped = re.sub(r"@+", lambda m: "@" if m[0] == "@@" else "@@", smiles)
    product["smiles"] = type(smiles)(swapped)
    return ("outcome", "claim", "course")


def _another_skeleton(document: Any) -> Path | None:
    found = _desired(document)
    if found is None or not found[1]["smiles"].startswith("C"):
        return None
    index, product = found
    product["smiles"] = type(product["smiles"])("C" + product["smiles"])
    if "/" in product["smiles"][:4] or "@" in product["smiles"][:6]:
        return None
    return ("outcome", "products", index, "smiles")


def _ee_of_an_achiral_product(document: Any) -> Path | None:
    found = _desired(document)
    if found is None or found[1].get("stereo") != "achiral":
        return None
    index = _append(document, f"{{ee: 40 %, of: {found[1]['label']}, by: chiral HPLC}}")
    return ("outcome", "measured", index, "ee")


def _ee_of_a_racemate(document: Any) -> Path | None:
    found = _desired(document)
    if document["substrate"].get("stereo") != "racemate" or found is None or found[1].get("stereo") != "racemate":
        return None
    index = _append(document, f"{{ee: 40 %, of: {found[1]['label']}, by: chiral HPLC}}")
    return ("outcome", "measured", index, "ee")


def _more_ee_than_before(document: Any) -> Path | None:
    if "crystal" in str(document.get("work_up")):  # which enriches
        return None
    for index, line in _measured(document, "ee"):
        if "ee" in document["substrate"] and re.fullmatch(r"\d+(\.\d+)? %", str(line["ee"])):
            document["substrate"]["ee"] = "80 %"
            line["ee"] = "97 %"
            return ("outcome", "measured", index, "ee")
    return None


def _two_tales_of_one_ee(document: Any) -> Path | None:
    for _, line in _measured(document, "ee"):
        if re.fullmatch(r"\d+(\.\d+)? %", str(line["ee"])) and isinstance(line.get("of"), str):
            index = _append(document, f"{{er: '75:25', of: {line['of']}, by: chiral GC}}")
            return ("outcome", "measured", index, "er")
    return None


def _spread_of_one(document: Any) -> Path | None:
    for index, line in _measured(document, "yield"):
        if "spread" not in line and "n" not in line:
            line["spread"] = "3 %"
            return ("outcome", "measured", index, "spread")
    return None


def _label_of_nobody(document: Any) -> Path | None:
    for index, line in _measured(document, "yield"):
        if isinstance(line["of"], str):
            line["of"] = "Q"
            return ("outcome", "measured", index, "of")
    return None


# --- what is declared -----------------------------------------------------------------------------------------


def _another_leaving_group(document: Any) -> Path | None:
    groups = {"bromide": "iodide", "chloride": "bromide", "mesylate": "tosylate"}
    declared = document["substrate"]["leaving_group"]
    if len(document["stages"]) != 1 or declared not in groups:
        return None
    document["substrate"]["leaving_group"] = groups[declared]
    return ("substrate", "leaving_group")


def _another_class(document: Any) -> Path | None:
    swapped = {"primary": "secondary", "secondary": "tertiary", "tertiary": "secondary"}
    declared = document["substrate"]["class"]
    if not isinstance(declared, str) or declared not in swapped:
        return None
    document["substrate"]["class"] = swapped[declared]
    return ("substrate", "class")


def _reviewed_before_it_was_run(document: Any) -> Path | None:
    if "reviewed" not in document:
        return None
    document["reviewed"]["date"] = document["performed"]["date"].replace(year=document["performed"]["date"].year - 1)
    return ("reviewed", "date")


# --- hazards --------------------------------------------------------------------------------------------------


def _azide(document: Any) -> bool:
    found = _attacker(document)
    return found is not None and "[N-]=[N+]=[N-]" in found[1].get("smiles", "")


def _azide_into_dichloromethane(document: Any) -> Path | None:
    if not _azide(document):
        return None
    document.pop("safety_review", None)
    document["work_up"] = load("[quench with 60 mL water, extract with 3 × 20 mL dichloromethane]")
    return ("work_up", 1)


def _azide_into_acid(document: Any) -> Path | None:
    if not _azide(document):
        return None
    document.pop("safety_review", None)
    document["work_up"] = load("[quench with 1 M HCl, extract with 3 × 20 mL ethyl acetate]")
    return ("work_up", 0)


# --- text -----------------------------------------------------------------------------------------------------


def _find(text: str, pattern: str) -> tuple[re.Match[str], int] | None:
    match = re.search(pattern, text, re.MULTILINE)
    return None if match is None else (match, text.count("\n", 0, match.start()) + 1)


def _unquoted_smiles(text: str) -> tuple[str, int, int] | None:
    found = _find(text, r"^(  smiles: )'(\[[^'\n]*)'$")
    if found is None:
        return None
    match, line = found
    return f"{text[: match.start()]}{match[1]}{match[2]}{text[match.end() :]}", line, len(match[1]) + 1


def _repeated_key(text: str) -> tuple[str, int, int] | None:
    found = _find(text, r"^notebook: .*\n")
    if found is None:
        return None
    match, line = found
    return f"{text[: match.end()]}notebook: BK9/999\n{text[match.end() :]}", line + 1, 1


def _misspelt_key(text: str) -> tuple[str, int, int] | None:
    found = _find(text, r"^(  )leaving_group: ")
    if found is None:
        return None
    match, line = found
    return text[: match.start()] + "  leaving_groop: " + text[match.end() :], line, 3


def _bad_escape(text: str) -> tuple[str, int, int] | None:
    found = _find(text, r"^( +smiles: )'([^'\n]*\\[^'\n]*)'$")
    if found is None:
        return None
    match, line = found
    return f'{text[: match.start()]}{match[1]}"{match[2]}"{text[match.end() :]}', line, len(match[1]) + 1


def _rules(*names: str) -> frozenset[str]:
    return frozenset(names)


MISTAKES: tuple[Mistake, ...] = (
    Mistake("mg for g of substrate", _rules("quantities-disagree"), _milligrams_for_grams, says="1000"),
    Mistake("mol for mmol of nucleophile", _rules("quantities-disagree"), _moles_for_millimoles, says="1000"),
    Mistake("wrong equivalents", _rules("quantities-disagree"), _wrong_equivalents),
    Mistake("µL for mL of solvent", _rules("quantities-disagree"), _microlitres_for_millilitres, says="1000"),
    Mistake("twice the concentration", _rules("quantities-disagree"), _twice_the_concentration),
    Mistake("monohydrate weighed", _rules("quantities-disagree"), _hydrate_weighed, says="monohydrate"),
    Mistake("purity forgotten", _rules("quantities-disagree"), _purity_forgotten, says="purity"),
    Mistake("counter-ion lost", _rules("salt-without-counter-ion"), _lost_counter_ion),
    Mistake("boiling in an open flask", _rules("temperature-above-boiling"), _boiling_in_an_open_flask),
    Mistake("reflux in the cold", _rules("reflux-off-boiling"), _reflux_in_the_cold),
    Mistake("kelvin with °C", _rules("temperature-looks-kelvin"), _kelvin),
    Mistake("colder than it freezes", _rules("temperature-below-freezing"), _frozen),
    Mistake("sealed and full", _rules("vessel-overfilled"), _full_to_the_brim),
    Mistake("temperature without unit", _rules("quantity-without-unit"), _temperature_without_unit),
    Mistake("overnight", _rules("quantity-vague"), _overnight),
    Mistake("decimal comma", _rules("quantity-decimal-comma"), _decimal_comma),
    Mistake("yield of 118 %", _rules("yield-above-100"), _above_100),
    Mistake("yield of another mass", _rules("yield-mass-disagrees"), _yield_by_another_mass),
    Mistake("mg for g of product", _rules("yield-mass-disagrees"), _milligrams_of_product, says="1000"),
    Mistake("more than went in", _rules("balance-above-100"), _more_than_went_in),
    Mistake("product mirrored", _rules("course-contradicts-structure"), _mirrored),
    Mistake("product of another skeleton", _rules("product-not-reachable"), _another_skeleton),
    Mistake("ee of an achiral product", _rules("ee-without-chirality"), _ee_of_an_achiral_product),
    Mistake("ee out of a racemate", _rules("ee-from-racemate", "stereo-contradicts-structure"), _ee_of_a_racemate),
    Mistake("more ee than before", _rules("ee-above-substrate"), _more_ee_than_before),
    Mistake("er against ee", _rules("ee-er-disagree"), _two_tales_of_one_ee),
    Mistake("spread of one run", _rules("spread-without-repeats"), _spread_of_one),
    Mistake("label of no product", _rules("label-unknown"), _label_of_nobody),
    Mistake("another leaving group", _rules("leaving-group-not-found"), _another_leaving_group),
    Mistake("another class", _rules("class-not-found"), _another_class),
    Mistake("reviewed before it was run", _rules("dates-out-of-order"), _reviewed_before_it_was_run),
    Mistake("azide extracted with dichloromethane", _rules("hazard-unreviewed"), _azide_into_dichloromethane),
    Mistake("azide quenched with acid", _rules("hazard-unreviewed"), _azide_into_acid),
    Mistake("SMILES without quotes", _rules("smiles-unquoted"), garble=_unquoted_smiles),
    Mistake("key repeated", _rules("duplicate-key"), garble=_repeated_key),
    Mistake("key misspelt", _rules("key-unknown"), garble=_misspelt_key),
    Mistake("backslash in double quotes", _rules("smiles-unquoted"), garble=_bad_escape),
)


# --- what the checks say of them ---------------------------------------------------------------------------------


def found_instead(mistaken: Mistaken) -> list[str] | None:
    """Return what was found in place of a mistake; None where it was caught."""
    found = findings_of(mistaken.text, f"{mistaken.entry}.yml")
    return None if any(_catches(finding, mistaken) for finding in found) else [_shown(finding) for finding in found]


def _catches(finding: Finding, mistaken: Mistaken) -> bool:
    is_there = (finding.place.line, finding.place.column) == (mistaken.line, mistaken.column)
    says_it = mistaken.mistake.says in f"{finding.message} {finding.mend}"
    is_grave = finding.level.weight >= Level.QUERY.weight
    return is_there and says_it and is_grave and finding.rule in mistaken.mistake.rules


def _shown(finding: Finding) -> str:
    return f"{finding.place.line}:{finding.place.column} {finding.rule}: {finding.message}; {finding.mend}"


def complaints(honest: Honest) -> list[str]:
    """Return the errors and open queries of an honest record."""
    return [
        f"{honest.entry} {_shown(finding)}"
        for finding in findings_of(honest.text, f"{honest.entry}.yml")
        if finding.level.weight >= Level.QUERY.weight and finding.accepted is None
    ]
