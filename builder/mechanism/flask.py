"""What is in the flask: who attacks, who takes protons, how acid it is, and what else helps a group to leave.

Bases make conjugate bases of what they are charged with, by the difference of pKa; a Brønsted acid spends the basic
nucleophiles, a Lewis acid does not. Solvents attack at their own molarity and are not used up.
"""

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

from builder.chemistry.perception import Nucleophile, attacking_atoms
from builder.chemistry.structure import parse_smiles
from builder.mechanism.kinds import BaseFamily, Kind, load_kinds
from builder.mechanism.medium import Medium, medium_of
from builder.mechanism.nucleophiles import Bulk, Reactivity, nucleophile_by_structure
from builder.mechanism.question import Ingredient, Question
from builder.mechanism.rate_terms import Parameters
from builder.mechanism.reagents import Dose, Role

__all__ = ["Attacker", "Flask", "fill_flask"]

_NEUTRAL_STAND_IN = "1,2-dichloroethane"
_PROTIC_STAND_IN = "ethanol"
_SILVER = "[Ag+]"
_SPARINGLY_SOLUBLE = frozenset({"[Na+]", "[K+]", "[Ca+2]", "[Mg+2]"})
_NEXT_TO_NOTHING = 1e-12
_FEW_ATOMS = 4
"""Heavy atoms up to which an anion counts as inorganic, so that its salt hardly dissolves in ether or toluene."""
_HELD_BY_SALT = 3.8
"""Desolvation term of an anion from which its sodium salt hardly dissolves in acetone or acetonitrile either."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Attacker:
    """One attacking atom of one species, at its concentration.

    kind: what it is like as it attacks; of a phenol whose proton a base has taken, a phenoxide.
    n, n_error: Swain-Scott n(CH3I) in methanol of the usual atom of the species.
    is_usual_atom: the one that attacks first.
    molar: mol/L. pool: what it is drawn from; None for a solvent, which does not run out. portion: of the pool, what
    is in this form, acid or anion; protons move faster than carbon reacts, so it stays the same as the pool shrinks.
    """

    nucleophile: Nucleophile
    kind: Kind
    name: str
    n: float
    n_error: float
    n_source: str
    pka: float
    pka_dmso: float
    is_hindered: bool
    is_anion: bool
    molar: float
    pool: str | None
    is_sparingly_soluble: bool = False
    is_usual_atom: bool = True
    portion: float = 1.0

    @property
    def log_activity(self) -> float:
        """Return log10 of what a rate constant is multiplied by: mol/L of a solvent, else the portion of its pool."""
        return math.log10(max(_NEXT_TO_NOTHING, self.molar if self.is_solvent else self.portion))

    @property
    def is_solvent(self) -> bool:
        """Say whether the solvent itself attacks."""
        return self.pool is None

    @property
    def base(self) -> BaseFamily | None:
        """Return the family of the base it is in an E2; None for one that takes no proton."""
        if self.kind.base is BaseFamily.OXYGEN and self.is_hindered:
            return BaseFamily.BULKY_ALKOXIDE
        return self.kind.base


@dataclass(frozen=True, slots=True, kw_only=True)
class Flask:
    """Everything beside the substrate.

    acidity: Hammett acidity function, or for a Lewis acid the acidity that would help oxygen as much; None without
    acid. acidity_key: the term the acidity comes from. activators: leaving groups they make of a hydroxyl group.
    pools: mol/L of what can run out, by name.
    """

    medium: Medium
    attackers: tuple[Attacker, ...]
    pools: dict[str, float]
    acidity: float | None = None
    acidity_key: str | None = None
    is_lewis: bool = False
    lewis_grade: int = 0
    has_silver: bool = False
    has_phase_helper: bool = False
    nitrosates: bool = False
    has_peroxide: bool = False
    activators: tuple[str, ...] = ()
    has_base: bool = False
    spent: tuple[str, ...] = ()

    @property
    def nucleophiles(self) -> tuple[Attacker, ...]:
        """Return the attackers that were charged, the solvent left out."""
        return tuple(a for a in self.attackers if not a.is_solvent)

    @property
    def is_achiral(self) -> bool:
        """Say whether nothing in it brings a configuration of its own."""
        return all(
            a.nucleophile.species.is_achiral or not a.nucleophile.species.stereocentres.specified
            for a in self.attackers
        )

    def on_hand(self, pool: str | None) -> float:
        """Return what a rate constant is multiplied by at the start: mol/L of a pool, one for first order."""
        return 1.0 if pool is None else self.pools.get(pool, 0.0)

    @property
    def is_bronsted_acid(self) -> bool:
        """Say whether a proton, not a Lewis acid, makes it acid."""
        return self.acidity is not None and not self.is_lewis and self.acidity <= MOST_ACIDITY


LEVELLING = 1.2
"""How much weaker, in pKa, a base may be than the anion of a solvent that still takes its place: log10 of 17 M."""
_MAIN_SHARE = 0.6
_LEVELLED = frozenset({BaseFamily.OXYGEN, BaseFamily.BULKY_ALKOXIDE, BaseFamily.AMIDE})
_SOLVENT_ANIONS = {"O": "[OH-]", "CO": "C[O-]", "CCO": "CC[O-]", "CC(C)O": "CC(C)[O-]", "CC(C)(C)O": "CC(C)(C)[O-]"}
UNCHARGED_PENALTY = 4.0
"""How much a neutral base loses, in pKa, where two ions must be made of two molecules without a protic solvent."""
NEUTRAL_PKA = 7.0
"""pKa of the conjugate acid from which a species counts as a base that takes weakly acidic protons."""
BASIC_PKA = 4.0
"""The same for proton catchers such as pyridine."""
ENOUGH_M = 0.1
"""Concentration, mol/L, from which an ion beside a cation counts."""
MOST_ACIDITY = 1.5
"""Acidity up to which a Brønsted acid counts as strong: weaker ones help only what forms a very stable cation."""


def fill_flask(question: Question, parameters: Parameters) -> Flask:
    """Return the flask of a question."""
    doses = list(question.additives)
    is_protic = not question.solvent and _is_protic_when_neat(question)
    medium = medium_of(question.solvent, _PROTIC_STAND_IN if is_protic else _NEUTRAL_STAND_IN)
    roles = {dose.reagent.role for dose in doses}
    counter_ions = {i.counter_ion for i in (question.nucleophile, question.base) if i is not None}
    counter_ions |= {s.smiles for i in (question.nucleophile, question.base) if i for s in i.structure.fragments}
    has_silver = Role.SILVER in roles or _SILVER in counter_ions
    helped = bool(roles & {Role.CROWN, Role.ONIUM})
    acidity, key, grade = _acidity(doses, medium, parameters)
    is_lewis = key is not None and key.startswith("acid.lewis")
    groups = _activated_groups(doses)
    charged, pools = _charge(question, doses, parameters, medium, helped=helped, groups=groups)
    solvents = _solvent_attackers(medium)
    spent: tuple[str, ...] = ()
    if not is_lewis:
        limit = _acid_pka(doses, medium)
        spent = tuple(sorted({a.name for a in charged if _is_spent(a, limit)}))
        charged = [a for a in charged if a.name not in spent]
    return Flask(
        medium=medium,
        attackers=(*charged, *solvents),
        pools=pools,
        acidity=acidity,
        acidity_key=key,
        is_lewis=is_lewis,
        lewis_grade=grade,
        has_silver=has_silver,
        has_phase_helper=helped,
        nitrosates=Role.NITROSATION in roles,
        has_peroxide=Role.PEROXIDE in roles,
        activators=groups,
        has_base=question.base is not None
        or any(a.base is not None and a.pka > BASIC_PKA for a in (*charged, *solvents)),
        spent=spent,
    )


def _is_protic_when_neat(question: Question) -> bool:
    protic = any(a.kind in {"alcohol", "water", "carboxylic acid"} for a in attacking_atoms(question.substrate))
    return protic or any(dose.reagent.role is Role.BRONSTED_ACID for dose in question.additives)


# --- what was charged -----------------------------------------------------------------------------------------


def _charge(
    question: Question,
    doses: Iterable[Dose],
    parameters: Parameters,
    medium: Medium,
    *,
    helped: bool,
    groups: tuple[str, ...],
) -> tuple[list[Attacker], dict[str, float]]:
    """Return the attackers charged, each NuH also as the anion a base makes of it, and the pools they come from."""
    molar = question.charged_equivalents * question.concentration_m
    if medium.is_neat:
        molar = max(molar, parameters.value("flask.neat"))
    doses = list(doses)
    found: list[Attacker] = []
    if question.nucleophile is not None and not _is_water_set_free(question, medium):
        found += _attackers_of(question.nucleophile, molar, medium, helped=helped)
    bases: list[Attacker] = []
    if question.base is not None:
        bases += _attackers_of(question.base, molar, medium, helped=helped)
    for dose in doses:
        bases += _from_dose(dose, molar, medium, helped=helped)
        found += _supplied(dose, molar, parameters)
    taken = _solvent_names(medium)
    found = [a for a in found if a.name not in taken]
    if "alkoxyphosphonium" in groups and any(dose.reagent.needs for dose in doses):
        found, _ = _deprotonated(found, parameters.value("flask.betaine"), molar)
    left = []
    for base in bases:
        remaining = base.molar
        if base.is_usual_atom:
            strength = base.pka - (0.0 if base.is_anion or medium.is_protic else UNCHARGED_PENALTY)
            found, remaining = _deprotonated(found, strength, base.molar)
        left.append(replace(base, molar=remaining))
    merged = _merged([*found, *(b for b in left if b.name not in taken)])
    levelled = [_levelled(a, medium) for a in merged]
    pools = _pools(levelled, math.fsum(b.molar for b in left))
    return [a if a.pool is None else replace(a, portion=a.molar / pools[a.pool]) for a in levelled], pools


def _pools(attackers: Sequence[Attacker], base_molar: float) -> dict[str, float]:
    """Return what can be used up, mol/L by name; an anion is made again from its acid as long as base is left."""
    pools: dict[str, float] = {}
    for a in attackers:
        if a.pool is not None:
            pools[a.pool] = max(pools.get(a.pool, 0.0), a.molar)
    for anion in attackers:
        acid = next((a for a in attackers if a.pool == anion.pool and a.is_anion < anion.is_anion), None)
        if anion.pool is not None and acid is not None:
            pools[anion.pool] = max(pools[anion.pool], anion.molar + min(acid.molar, base_molar))
    return pools


def _is_water_set_free(question: Question, medium: Medium) -> bool:
    """Say whether water is named beside an acid in a flask without water: the water a dehydration sets free."""
    named = question.nucleophile is not None and question.nucleophile.structure.smiles == "O"
    acid = {Role.BRONSTED_ACID, Role.LEWIS_ACID}
    return named and medium.share("water") == 0 and any(dose.reagent.role in acid for dose in question.additives)


def _attackers_of(ingredient: Ingredient, molar: float, medium: Medium, *, helped: bool) -> list[Attacker]:
    counter = {ingredient.counter_ion} | {s.smiles for s in ingredient.structure.fragments}
    is_salt = not helped and bool(counter & _SPARINGLY_SOLUBLE)
    found = []
    able = attacking_atoms(ingredient.structure)
    for place, nucleophile in enumerate(able):
        small = nucleophile.species.heavy_atom_count <= _FEW_ATOMS and nucleophile.charge < 0
        attacker = _attacker(nucleophile, molar, nucleophile.species.smiles, able[0].kind)
        held = medium.is_apolar or (medium.is_weak_donor and attacker.kind.desolvation >= _HELD_BY_SALT)
        found.append(replace(attacker, is_sparingly_soluble=is_salt and small and held, is_usual_atom=place == 0))
    return found


def _attacker(nucleophile: Nucleophile, molar: float, pool: str | None, usual_kind: str | None = None) -> Attacker:
    """Return an attacker; the row of its species counts for atoms of the kind that usually attacks only."""
    kind = load_kinds()[nucleophile.kind]
    row = nucleophile_by_structure(nucleophile.species.smiles) if usual_kind in {None, nucleophile.kind} else None
    hindered = is_hindered(nucleophile)
    return Attacker(
        nucleophile=nucleophile,
        kind=kind,
        name=row.name if row is not None else nucleophile.species.smiles,
        n=kind.n if row is None or row.n is None else row.n,
        n_error=kind.error if row is None or row.n is None or row.n_error is None else row.n_error,
        n_source=kind.source if row is None or row.n is None else row.sources.get("n", kind.source),
        pka=kind.pka if row is None or row.pka_water is None else row.pka_water,
        pka_dmso=_pka_dmso(kind, row),
        is_hindered=hindered or (row is not None and row.bulk is Bulk.HINDERED),
        is_anion=nucleophile.charge < 0,
        molar=molar,
        pool=pool,
    )


def _pka_dmso(kind: Kind, row: Reactivity | None) -> float:
    if row is not None and row.pka_dmso is not None:
        return row.pka_dmso
    if row is not None and row.pka_water is not None:
        return row.pka_water + kind.pka_dmso - kind.pka
    return kind.pka_dmso


@lru_cache(maxsize=1024)
def is_hindered(nucleophile: Nucleophile) -> bool:
    """Say whether branching beside the attacking atom gets in its way, as in tert-butoxide or triethylamine."""
    atoms = nucleophile.species.atoms
    atom = atoms[nucleophile.atom]
    around = [
        n
        for n, _ in atom.neighbours
        if atoms[n].symbol == "C" and all(order == 1.0 for _, order in atoms[n].neighbours)
    ]
    branched = [sum(atoms[m].symbol != "H" for m, _ in atoms[n].neighbours) - 1 for n in around]
    if atom.symbol in {"O", "S"}:
        return any(b >= 3 for b in branched)
    if atom.symbol == "N" and not atom.aromatic:
        tied = len(atom.ring_sizes) >= 2
        crowded = sum(b >= 2 for b in branched)
        return not tied and (crowded >= 2 or (len(around) == 3 and sum(branched) >= 3) or any(b >= 3 for b in branched))
    if atom.aromatic and atom.symbol == "N":  # substituents beside a pyridine nitrogen
        beside = [m for n, _ in atom.neighbours for m, _ in atoms[n].neighbours if m != nucleophile.atom]
        return sum(not atoms[m].aromatic for m in beside) >= 2
    return False


@lru_cache(maxsize=256)
def has_long_branches(nucleophile: Nucleophile) -> bool:
    """Say whether all branches beside the attacking atom are longer than methyl, as in 3-ethyl-3-pentoxide."""
    atoms = nucleophile.species.atoms
    for near, _ in atoms[nucleophile.atom].neighbours:
        branches = [n for n, _ in atoms[near].neighbours if n != nucleophile.atom and atoms[n].symbol == "C"]
        if len(branches) == 3:
            return all(len(atoms[n].neighbours) >= 2 for n in branches)
    return False


def _from_dose(dose: Dose, molar: float, medium: Medium, *, helped: bool) -> list[Attacker]:
    """Return what a reagent listed as base brings."""
    if dose.reagent.role is not Role.BASE or dose.reagent.smiles is None:
        return []
    ingredient = Ingredient(dose.reagent.name, parse_smiles(dose.reagent.smiles))
    return _attackers_of(ingredient, molar, medium, helped=helped)


def _supplied(dose: Dose, molar: float, parameters: Parameters) -> list[Attacker]:
    """Return the anion a reagent brings; concentrated hydrogen halide brings it in mol/L by its strength."""
    weak = (
        dose.reagent.role is Role.LEWIS_ACID
        and (dose.reagent.strength or 0) < 3
        and "Si" not in (dose.reagent.smiles or "")
    )
    if dose.reagent.supplies is None or weak:
        return []
    amount = molar
    if dose.mass_percent is not None:
        amount = max(molar, dose.mass_percent * parameters.value("acid.molarity"))
    if dose.reagent.role is Role.SILVER:
        amount = parameters.value("flask.silver oxide")
    anion = parse_smiles(dose.reagent.supplies)
    return [_attacker(n, amount, n.species.smiles) for n in attacking_atoms(anion)]


def _merged(attackers: Iterable[Attacker]) -> list[Attacker]:
    """Return the attackers, the same atom of the same species once, at its highest concentration."""
    found: dict[tuple[str, int, str], Attacker] = {}
    for a in attackers:
        key = (a.nucleophile.species.smiles, a.nucleophile.atom, a.kind.name)
        if a.molar > 1e-9 and (key not in found or found[key].molar < a.molar):
            found[key] = a
    return list(found.values())


def _deprotonated(attackers: Sequence[Attacker], base_pka: float, base_molar: float) -> tuple[list[Attacker], float]:
    """Return the attackers after a base has taken protons, the most acidic atom of each species first.

    A species gives one proton; the atom that has lost it is the one that attacks first from then on.
    """
    most_acidic: dict[str, Attacker] = {}
    for a in attackers:
        pka = _acid_pka_of(a)
        known = most_acidic.get(a.nucleophile.species.smiles)
        if pka is not None and not a.is_anion and (known is None or pka < (_acid_pka_of(known) or 99.0)):
            most_acidic[a.nucleophile.species.smiles] = a
    found: list[Attacker] = []
    for a in attackers:
        if most_acidic.get(a.nucleophile.species.smiles) is a:
            pair, base_molar = _shared_proton(a, base_pka, base_molar)
            found += pair
        else:
            found.append(a)
    return found, base_molar


def _acid_pka_of(attacker: Attacker) -> float | None:
    """Return the pKa of the proton on an attacking atom; the row of a species speaks of its usual atom."""
    if attacker.kind.anion is None:
        return None
    row = nucleophile_by_structure(attacker.nucleophile.species.smiles) if attacker.is_usual_atom else None
    return attacker.kind.acid_pka if row is None or row.pka_acid is None else row.pka_acid


def _shared_proton(acid: Attacker, base_pka: float, base_molar: float) -> tuple[list[Attacker], float]:
    """Return the acid and its anion at equilibrium with a base, and what is left of the base, mol/L.

    The equilibrium constant is ten to the difference of pKa in water, in every solvent: both sides hold an anion.
    """
    acid_pka = _acid_pka_of(acid)
    if acid.kind.anion is None or acid_pka is None:
        return [acid], base_molar
    constant = 10 ** min(9.0, base_pka - acid_pka)
    ionised = _shared(acid.molar, base_molar, constant)
    if ionised < 1e-7:
        return [acid], base_molar
    kind = load_kinds()[acid.kind.anion]
    anion = replace(
        acid,
        kind=kind,
        name=f"{acid.name}, deprotonated",
        n=kind.n,
        n_error=kind.error,
        n_source=kind.source,
        pka=acid_pka,
        pka_dmso=acid_pka + kind.pka_dmso - kind.pka,
        is_anion=True,
        is_usual_atom=True,
        molar=ionised,
    )
    return [anion, replace(acid, molar=acid.molar - ionised)], base_molar - ionised


def _shared(acid: float, base: float, constant: float) -> float:
    """Return x of x² = K (acid - x)(base - x), mol/L."""
    if abs(constant - 1.0) < 1e-9:
        return acid * base / (acid + base)
    a, b, c = 1.0 - constant, constant * (acid + base), -constant * acid * base
    root = math.sqrt(max(0.0, b * b - 4 * a * c))
    return min(acid, base, 2 * c / (-b - root)) if b + root else 0.0


def _levelled(attacker: Attacker, medium: Medium) -> Attacker:
    """Return a strong base in water or an alcohol as the hydroxide or alkoxide it makes of it; any other as it is.

    The solvent is there in tenfold excess or more, so a base up to LEVELLING weaker than its anion is levelled too.
    """
    if not attacker.is_anion or attacker.kind.base not in _LEVELLED:
        return attacker
    for solvent, share in medium.parts:
        for nucleophile in attacking_atoms(parse_smiles(solvent.smiles)) if share > _MAIN_SHARE else ():
            kind = load_kinds()[nucleophile.kind]
            if nucleophile.kind not in {"water", "alcohol"} or kind.anion is None:
                continue
            acid = nucleophile_by_structure(solvent.smiles)
            acid_pka = kind.acid_pka if acid is None or acid.pka_acid is None else acid.pka_acid
            anion = load_kinds()[kind.anion]
            conjugate = _SOLVENT_ANIONS.get(solvent.smiles)
            row = None if conjugate is None else nucleophile_by_structure(conjugate)
            same = row is not None and row.name == attacker.name
            if acid_pka is None or same or attacker.pka < acid_pka - LEVELLING:
                continue
            made = _attacker(nucleophile, attacker.molar, attacker.pool)
            return replace(
                made,
                kind=anion,
                name=f"{attacker.name} as anion of {solvent.name}",
                n=anion.n if row is None or row.n is None else row.n,
                n_error=anion.error,
                n_source=anion.source,
                pka=acid_pka,
                pka_dmso=acid_pka + anion.pka_dmso - anion.pka,
                is_anion=True,
            )
    return attacker


# --- solvents -------------------------------------------------------------------------------------------------


def _solvent_names(medium: Medium) -> frozenset[str]:
    return frozenset() if medium.is_neat else frozenset(a.name for a in _solvent_attackers(medium))


@lru_cache(maxsize=512)
def _solvent_attackers(medium: Medium) -> tuple[Attacker, ...]:
    if medium.is_neat:
        return ()
    found: dict[str, Attacker] = {}
    for solvent, share in medium.parts:
        structure = parse_smiles(solvent.smiles)
        molar = 1000.0 * (solvent.density_g_ml or 1.0) / structure.mass * share
        for nucleophile in attacking_atoms(structure):
            if nucleophile.preference == 1 and load_kinds()[nucleophile.kind].solvolyses:
                found.setdefault(solvent.name, replace(_attacker(nucleophile, molar, None), name=solvent.name))
    return tuple(found.values())


# --- acid -----------------------------------------------------------------------------------------------------


def _acidity(doses: Iterable[Dose], medium: Medium, parameters: Parameters) -> tuple[float | None, str | None, int]:
    """Return the acidity, the term it comes from and the grade of the strongest Lewis acid."""
    keys: list[str] = []
    grade = 0
    for dose in doses:
        if dose.reagent.role is Role.BRONSTED_ACID:
            key = _acid_key(dose, medium)
            keys += [key] if key else []
        elif dose.reagent.role is Role.LEWIS_ACID and dose.reagent.strength is not None:
            grade = max(grade, round(dose.reagent.strength))
            keys.append(f"acid.lewis.{round(dose.reagent.strength)}")
    for solvent, share in medium.parts:
        if share >= 0.5 and solvent.name == "trifluoroacetic acid":
            keys.append("acid.h0.trifluoroacetic")
        elif share >= 0.75 and solvent.name == "formic acid":
            keys.append("acid.h0.formic")
        elif share >= 0.5 and solvent.name in {"acetic acid", "formic acid"}:
            keys.append("acid.h0.carboxylic")
    if not keys:
        return None, None, grade
    key = min(keys, key=parameters.value)
    if grade >= 2 and any(k.startswith("acid.h0") for k in keys) and key != "acid.h0.carboxylic":
        key = min(key, "acid.h0.with lewis acid", key=parameters.value)
    return parameters.value(key), key, grade


def _acid_key(dose: Dose, medium: Medium) -> str | None:
    """Return the term for the acidity an acid brings; None for one too weak to activate anything."""
    pka = dose.reagent.strength
    if pka is None or pka > 3.0:
        return None
    if dose.is_catalytic:
        return "acid.h0.catalytic"
    if pka > 0.5:
        strong = dose.is_concentrated or medium.is_neat or not medium.is_protic
        return "acid.h0.middling" if strong or (dose.mass_percent or 0) >= 50 else "acid.h0.middling dilute"
    if (dose.mass_percent or 0) >= 60:
        return "acid.h0.neat" if pka < -2.5 and not dose.reagent.supplies else "acid.h0.fuming"
    if (dose.mass_percent or 0) >= 25:
        return "acid.h0.concentrated"
    if medium.is_neat:
        return "acid.h0.neat" if dose.reagent.supplies is None else "acid.h0.aprotic"
    if dose.is_concentrated:
        return "acid.h0.concentrated"
    if medium.share("water") > 0.8:
        return "acid.h0.aqueous"
    carboxylic = medium.share("acetic acid") + medium.share("formic acid") + medium.share("trifluoroacetic acid")
    if not medium.is_protic or carboxylic > 0.5:
        return "acid.h0.aprotic"
    return "acid.h0.alcohol"


def _acid_pka(doses: Iterable[Dose], medium: Medium) -> float | None:
    """Return the pKa of the strongest acid charged in more than traces, an acidic solvent included."""
    found = [
        dose.reagent.strength
        for dose in doses
        if dose.reagent.role in {Role.BRONSTED_ACID, Role.BUFFER_ACID}
        and dose.reagent.strength is not None
        and not dose.is_catalytic
    ]
    for solvent, share in medium.parts:
        if share >= 0.2 and any(n.kind == "carboxylic acid" for n in attacking_atoms(parse_smiles(solvent.smiles))):
            row = nucleophile_by_structure(solvent.smiles)
            if row is not None and row.pka_acid is not None:
                found.append(row.pka_acid)
    return min(found, default=None)


_SPENT_BY = 2.0
"""How much stronger than its conjugate acid, in pKa, an acid must be to spend a nucleophile."""


def _is_spent(attacker: Attacker, acid_pka: float | None) -> bool:
    return acid_pka is not None and attacker.pka - acid_pka > _SPENT_BY


def _activated_groups(doses: Iterable[Dose]) -> tuple[str, ...]:
    """Return the groups that activators make of a hydroxyl group; one whose partner is missing makes none."""
    doses = list(doses)
    present = {dose.reagent.name for dose in doses}
    found: Iterator[str] = (
        dose.reagent.activates
        for dose in doses
        if dose.reagent.activates and (not dose.reagent.needs or present & set(dose.reagent.needs))
    )
    return tuple(dict.fromkeys(found))
