"""A book of generated records, to measure with: usage: generated_book.py FOLDER [ENTRIES] [SEED]

Experiments are drawn from the combinations of `generated_chemistry`, with scale, times, yields, people and dates.
Nothing in it was run, and the settings say so. The same number and seed give the same files on every machine.
"""

import datetime as dt
import random
import sys
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import yaml

from builder.chemistry.structure import parse_smiles
from builder.records.identifiers import mint_identifier
from tests.generated_chemistry import METHODS, Flask, LeavingGroup, Method, Named, Skeleton, Substance, skeletons

__all__ = ["SEED", "generated_texts", "write_generated_book"]

SEED = 20261201
FIRST_DAY, LAST_DAY = dt.date(2024, 1, 8), dt.date(2026, 10, 30)
SUPERSEDED_IN = 40
"""One of so many entries is superseded, where the book holds another run of the same transformation."""
MOVING_ON = 0.4
"""Chance that, after a run, the next one of this kind is on another skeleton."""
SCALES_MMOL = (5, 8, 10, 12, 15, 20, 25, 30)
PEOPLE = tuple(f"bench-{number}" for number in range(1, 7))
SAFETY = "safety-1"
SETTINGS: dict[str, Any] = {
    "format": 1,
    "title": "Generated book for measurements",
    "group": "No group (generated)",
    "notice": "Generated to measure the tool: every entry is invented and nothing was run: not for use, not to cite.",
    "invented": True,
    "people": [{"code": code, "shown_as": f"{code} (invented)"} for code in (*PEOPLE, SAFETY)],
}


@dataclass(frozen=True)
class Plan:
    """A combination: every one is a different experiment."""

    skeleton: Skeleton
    group: LeavingGroup
    method: Method
    flask: Flask
    celsius: int
    hours: int

    @property
    def substrate(self) -> Named:
        return Named(f"{self.skeleton.name} {self.group.word}", self.skeleton.smiles + self.group.smiles)

    @property
    def product(self) -> Named:
        """Return what is wanted: with the centre turned over where there is one, or the main alkene."""
        if not self.method.fragment:
            return self.skeleton.alkenes[0]
        bearer = self.skeleton.inverted or self.skeleton
        return Named(self.method.title.format(bearer.name), bearer.smiles + self.method.fragment)

    @property
    def solvent(self) -> str:
        return " with ".join(name for name, _ in self.flask.solvents)


@dataclass(frozen=True)
class Run:
    """A plan that was carried out: when, by whom, on which scale, and what came out, in whole per cent."""

    plan: Plan
    entry: str
    number: int
    day: dt.date
    by: str
    repeats: int
    scale_mmol: int
    litres_per_mole: int
    converted: int
    isolated: int
    alkene: int


# --- drawing experiments ------------------------------------------------------------------------------------


def _campaigns(method: Method, rng: random.Random) -> list[list[Plan]]:
    """Return every plan of a method, those of one skeleton together, in random order within and among them."""
    campaigns = [
        [
            Plan(skeleton, group, method, flask, celsius, hours)
            for group in method.on.get(skeleton.kind, ())
            for flask in method.flasks
            for celsius, hours in flask.runs
        ]
        for skeleton in skeletons()
    ]
    for plans in campaigns:
        rng.shuffle(plans)
    rng.shuffle(campaigns)
    return [plans for plans in campaigns if plans]


def _draw_runs(entries: int, seed: int) -> list[Run]:
    """Return different experiments in the order of their days.

    Raises ValueError where there are not so many.
    """
    rng = random.Random(seed)
    decks = {method.word + method.title: (_campaigns(method, rng), method.share) for method in METHODS}
    days = (LAST_DAY - FIRST_DAY).days
    runs: dict[str, Run] = {}
    while len(runs) < entries:
        left = [(campaigns, share) for campaigns, share in decks.values() if campaigns]
        if not left:
            raise ValueError(f"there are only {len(runs)} different experiments")
        campaigns, _ = rng.choices(left, [share for _, share in left])[0]
        plan = _draw_plan(campaigns, rng)
        entry = mint_identifier(rng.choice)
        while entry in runs:
            entry = mint_identifier(rng.choice)
        day = FIRST_DAY + dt.timedelta(days=len(runs) * days // entries)
        runs[entry] = _draw_run(plan, entry, len(runs), day, rng)
    return list(runs.values())


def _draw_plan(campaigns: list[list[Plan]], rng: random.Random) -> Plan:
    """Take a plan of the campaign that is under way, which ends when it has none left or by chance."""
    plan = campaigns[-1].pop()
    if not campaigns[-1]:
        campaigns.pop()
    elif rng.random() < MOVING_ON:
        campaigns.insert(0, campaigns.pop())
    return plan


def _draw_run(plan: Plan, entry: str, number: int, day: dt.date, rng: random.Random) -> Run:
    method = plan.method
    isolated = rng.randint(*method.yields)
    return Run(
        plan=plan,
        entry=entry,
        number=number,
        day=day,
        by=rng.choice(PEOPLE),
        repeats=rng.randint(1, 3),
        scale_mmol=rng.choice(SCALES_MMOL),
        litres_per_mole=rng.choice((2, 3, 4, 5)),
        converted=rng.randint(96, 99),
        isolated=isolated,
        alkene=min(rng.randint(*method.alkene), 96 - isolated) if method.fragment and plan.skeleton.alkenes else 0,
    )


# --- links between them -------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Links:
    """What a run has to do with others of the book."""

    preceded_by: Run | None
    related: tuple[Run, ...]
    successor: Run | None


def _link(runs: Sequence[Run]) -> Iterator[tuple[Run, Links]]:
    """Yield each run with those that made its substrate, used the same pair before, or took its place."""
    made: dict[str, Run] = {}
    alike: dict[tuple[str, str], list[Run]] = {}
    for run in runs:
        if run.plan.method.mechanism != "none":
            made.setdefault(run.plan.product.smiles, run)
        alike.setdefault(_transformation(run), []).append(run)
    for run in runs:
        same = alike[_transformation(run)]
        place = same.index(run)
        later = same[place + 1] if place + 1 < len(same) and run.number % SUPERSEDED_IN == 0 else None
        maker = made.get(run.plan.substrate.smiles)
        earlier = maker if maker is not None and maker.number < run.number else None
        yield run, Links(earlier, tuple(same[max(0, place - 2) : place]), later)


def _transformation(run: Run) -> tuple[str, str]:
    return run.plan.skeleton.name, run.plan.product.smiles


# --- a run as a record --------------------------------------------------------------------------------------


def _record(run: Run, links: Links) -> dict[str, Any]:
    """Return a run as the record a chemist would write of it."""
    plan, method = run.plan, run.plan.method
    reviewed = run.day + dt.timedelta(days=9)
    return _without_gaps(
        {
            "format": 1,
            "entry": run.entry,
            "revision": 1,
            "status": "superseded" if links.successor else "current",
            "title": _title(plan),
            "performed": {"date": run.day, "by": [run.by], "runs": run.repeats},
            "reviewed": {
                "by": PEOPLE[(PEOPLE.index(run.by) + 1) % len(PEOPLE)],
                "date": reviewed,
                "due": reviewed.replace(year=reviewed.year + 2, day=min(reviewed.day, 28)),
            },
            "notebook": f"GB{1 + run.number // 180}/{1 + run.number % 180:03}",
            "substrate": _substrate(run),
            **_reagents(plan),
            "solvent": _solvents(run),
            "stages": [_stage(run)],
            "work_up": _work_up(run),
            "outcome": _failed(run) if method.mechanism == "none" else _went(run),
            "evidence": _evidence(run),
            "procedure": _procedure(run) if run.number % 4 else None,
            "take_away": _take_away(run),
            "scale_limit": f"{2 * run.scale_mmol} mmol without a new review" if method.scope else None,
            "safety_review": {
                "by": SAFETY,
                "date": run.day - dt.timedelta(days=4),
                "scope": method.scope.format(_millimoles_of_reagent(run)),
            }
            if method.scope
            else None,
            "related": [other.entry for other in links.related],
            "preceded_by": links.preceded_by.entry if links.preceded_by else None,
            "disclosure": "internal" if run.number % 4 else "cleared",
            "superseded": {
                "by": links.successor.entry,
                "date": links.successor.day,
                "because": f"the later run in {links.successor.plan.solvent} is easier to work up",
            }
            if links.successor
            else None,
        }
    )


def _without_gaps(part: dict[str, Any]) -> dict[str, Any]:
    return {key: value for key, value in part.items() if value not in (None, [])}


def _title(plan: Plan) -> str:
    where = f"in {plan.solvent} at {plan.celsius} °C"
    if plan.method.mechanism == "none":
        return f"{_capital(plan.substrate.name)} and {_reagent(plan).name} {where}, no reaction"
    by = f" and {_reagent(plan).name}" if plan.method.reagent else ""
    source = f"the {plan.group.word}" if plan.method.fragment else plan.substrate.name
    return f"{_capital(plan.product.name)} from {source}{by} {where}"


def _capital(name: str) -> str:
    return name[:1].upper() + name[1:]


def _reagent(plan: Plan) -> Substance:
    assert plan.method.reagent is not None
    return plan.method.reagent


def _substrate(run: Run) -> dict[str, Any]:
    plan = run.plan
    return _without_gaps(
        {
            "name": plan.substrate.name,
            "smiles": plan.substrate.smiles,
            "stereo": plan.skeleton.stereo,
            "ee": "99 %" if plan.skeleton.inverted else None,
            "class": list(plan.skeleton.classes),
            "leaving_group": plan.group.word,
            "mass": _grams(run, plan.substrate, 100),
        }
    )


def _grams(run: Run, compound: Named, percent: int | None = None) -> str:
    """Return the mass of a compound on the scale of a run, at its yield unless another per cent is given."""
    share = (run.isolated if percent is None else percent) / 100
    return f"{parse_smiles(compound.smiles).mass * run.scale_mmol * share / 1000:.3f} g"


def _reagents(plan: Plan) -> dict[str, Any]:
    method = plan.method
    charged: dict[str, Any] = {}
    if method.reagent is None:
        charged["nucleophile"] = "solvent"
    else:
        charged["nucleophile" if method.fragment else "base"] = _charged(method.reagent)
    if method.helper is not None:
        helper = _charged(method.helper)
        charged |= {"reagents": [helper | {"use": method.helper.use}]} if method.helper.use else {"base": helper}
    return charged


def _charged(substance: Substance) -> dict[str, Any]:
    return {"name": substance.name, "smiles": substance.smiles, "equivalents": substance.equivalents}


def _solvents(run: Run) -> list[dict[str, str]]:
    millilitres = run.scale_mmol * run.litres_per_mole
    return [
        {"name": name, "volume": f"{millilitres * percent / 100:g} mL"} for name, percent in run.plan.flask.solvents
    ]


def _stage(run: Run) -> dict[str, Any]:
    plan, method = run.plan, run.plan.method
    charged = [substance.name for substance in (method.helper, method.reagent) if substance is not None]
    boils = {"acetone": 56, "2-butanone": 79, "ethanol": 78, "methanol": 64, "THF": 66}
    at_reflux = plan.celsius >= boils.get(plan.flask.solvents[0][0], 500)
    gone = f"GC, {plan.group.word} < {101 - run.converted} %"
    failed = method.mechanism == "none"
    is_salt = method.reagent is not None and "." in method.reagent.smiles
    stirred = f"stirred at {300 + 50 * (run.number % 5)} rpm, the salt stays in part undissolved"
    stage = {
        "add": [*(name for name, _ in plan.flask.solvents), *charged, plan.substrate.name],
        "temperature": f"{plan.celsius} °C",
        "measured": "internal" if run.number % 5 else "bath",
        "time": f"{plan.hours} h",
        "vessel": "reflux" if at_reflux else "open",
        "atmosphere": "nitrogen",
        "end_point": f"stopped after {plan.hours} h, unchanged by GC since the start" if failed else gone,
        "note": stirred if is_salt and run.number % 2 else None,
    }
    return _without_gaps(stage)


def _work_up(run: Run) -> list[str]:
    method = run.plan.method
    silica, eluent = 2 * run.scale_mmol + 20, f"n-heptane with {2 + run.number % 9} % ethyl acetate"
    purified = (
        f"concentrated at 35 °C and {20 + 10 * (run.number % 4)} mbar, filtered through {silica // 4} g silica",
        f"concentrated at 30 °C, chromatography on {silica} g silica, {eluent}",
        "washed with 2 × 15 mL brine, dried over sodium sulfate, concentrated at 35 °C and 20 mbar",
    )[run.number % 3]
    waste = [f"waste: {method.waste}"] if method.waste else []
    return [f"quench: {method.quench}", purified, *waste]


def _went(run: Run) -> dict[str, Any]:
    plan, method = run.plan, run.plan.method
    if not method.fragment:
        return _eliminated(run)
    products = [_product("A", plan.product, "desired") | {"stereo": plan.skeleton.stereo}]
    measured: list[dict[str, Any]] = [
        {"conversion": f"{run.converted} %", "by": "GC"},
        {"yield": f"{run.isolated} %", "of": "A", "kind": "isolated", "mass": _grams(run, plan.product)},
    ]
    if plan.skeleton.inverted:
        measured.append({"ee": f"{98 - run.number % 3} %", "of": "A", "by": "chiral HPLC"})
    if run.alkene:
        products.append(_product("B", plan.skeleton.alkenes[0], "by-product"))
        measured.append({"yield": f"{run.alkene} %", "of": "B", "kind": "assay", "by": "GC"})
    return {"result": ["substitution"], "claim": _claim(run), "products": products, "measured": measured}


def _eliminated(run: Run) -> dict[str, Any]:
    """Return the outcome of an elimination: the alkenes are weighed together, and their ratio is measured."""
    alkenes = run.plan.skeleton.alkenes
    labels = "ABC"[: len(alkenes)]
    uses = ("desired", "by-product", "by-product")
    yielded = {"yield": f"{run.isolated} %", "of": list(labels), "kind": "isolated", "mass": _grams(run, alkenes[0])}
    shift = run.number % 7
    ratio = {
        1: None,
        2: f"{70 + shift}:{30 - shift}",
        3: f"{48 + shift}:{18 + shift}:{34 - 2 * shift}",
    }[len(alkenes)]
    compared = [{"ratio": f"{':'.join(labels)} = {ratio}", "by": "GC", "calibrated": True}] if ratio else []
    return {
        "result": ["elimination"],
        "claim": _claim(run),
        "products": [_product(label, alkene, use) for label, alkene, use in zip(labels, alkenes, uses, strict=False)],
        "measured": [{"conversion": f"{run.converted} %", "by": "GC"}, *compared, yielded],
    }


def _product(label: str, compound: Named, use: str) -> dict[str, Any]:
    return {"label": label, "name": compound.name, "smiles": compound.smiles, "use": use}


def _claim(run: Run) -> dict[str, Any]:
    return {"mechanism": run.plan.method.mechanism, "course": _course(run), "basis": [_basis(run)]}


def _course(run: Run) -> str:
    stereo, method = run.plan.skeleton.stereo, run.plan.method
    if method.mechanism == "E2":
        return "not determined"
    if method.mechanism == "SN2" and "secondary" in run.plan.skeleton.classes:
        return "inversion" if stereo == "single enantiomer" else "not determined"
    return "not applicable"


def _basis(run: Run) -> str:
    if run.plan.skeleton.inverted and run.plan.method.fragment:
        return "chiral HPLC of product"
    return "product structure" if run.number % 2 else "product ratio"


def _failed(run: Run) -> dict[str, Any]:
    plan = run.plan
    aryl = "aryl" in plan.skeleton.classes
    return {
        "result": ["no reaction"],
        "sought": {"name": plan.product.name, "smiles": plan.product.smiles},
        "claim": {"mechanism": "none", "course": "not applicable", "basis": ["recovered substrate"]},
        "measured": [
            {"conversion": "< 2 %", "by": "GC"},
            {"recovered": f"{run.converted - 2} %", "of": "substrate", "by": "GC"},
        ],
        "failure": {
            "cause": "no backside at an aryl carbon" if aryl else "approach from behind blocked by three alkyl groups",
            "basis": "substrate recovered unchanged, known behaviour of such halides",
            "repeated": run.repeats > 1,
        },
    }


def _evidence(run: Run) -> list[str]:
    more = ("13C NMR", "GC-MS", "IR", "GC with reference substances", "melting point")
    chiral = run.plan.skeleton.inverted and run.plan.method.fragment
    return ["1H NMR", more[run.number % len(more)], *(["chiral HPLC against the racemate"] if chiral else [])]


def _procedure(run: Run) -> str:
    plan, minutes = run.plan, 10 + run.number % 17
    hours = sorted({max(1, plan.hours // 4), max(2, plan.hours // 2), plan.hours})
    return (
        f"The solvent ({plan.solvent}) was degassed with nitrogen for {minutes // 2} min. Reagent and substrate went in"
        f" as listed, the substrate in one portion; the mixture reached {plan.celsius} °C within {minutes} min and was"
        f" sampled after {', '.join(map(str, hours[:-1]))} and {hours[-1]} h."
    )


def _take_away(run: Run) -> str:
    plan = run.plan
    if plan.method.mechanism == "none":
        return f"Nothing of the {plan.group.word} goes in {plan.hours} h at {plan.celsius} °C; another route is needed."
    side = f"; plan for {run.alkene} % of alkene" if run.alkene else ""
    return f"{run.isolated} % after {plan.hours} h at {plan.celsius} °C in {plan.solvent}{side}."


def _millimoles_of_reagent(run: Run) -> str:
    return f"{run.scale_mmol * _reagent(run.plan).equivalents:g}"


# --- writing them -------------------------------------------------------------------------------------------


class _Writer(yaml.CSafeDumper):
    """Indents lists, and writes no anchors."""

    def ignore_aliases(self, data: object) -> bool:
        return True


def generated_texts(entries: int, seed: int = SEED) -> Iterator[tuple[str, str]]:
    """Yield path below the entries folder and text of each record."""
    for run, links in _link(_draw_runs(entries, seed)):
        yield f"{run.plan.method.word.replace(' ', '-')}/{run.entry}.yml", _yaml(_record(run, links))


def settings_text() -> str:
    """Return the settings of the book, which say that it is invented."""
    return _yaml(SETTINGS)


def _yaml(data: dict[str, Any]) -> str:
    return yaml.dump(data, Dumper=_Writer, sort_keys=False, allow_unicode=True, width=10_000)


def write_generated_book(folder: Path, entries: int, seed: int = SEED) -> None:
    """Write settings and records into `folder`, which need not exist."""
    for path, text in (("handbook.yml", settings_text()), *generated_texts(entries, seed)):
        place = folder / path
        place.parent.mkdir(parents=True, exist_ok=True)
        place.write_text(text, "utf-8", newline="\n")


if __name__ == "__main__":
    given = sys.argv[1:]
    write_generated_book(Path(given[0]), *(int(number) for number in given[1:]))
