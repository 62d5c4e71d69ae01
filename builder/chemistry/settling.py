"""What an ion formed in the flask becomes, configurations kept: phosphonium of Arbuzov, acyloxonium, nitrilium."""

from builder.chemistry.ledger import Workbench
from builder.chemistry.structure import AtomId, Structure, parse_smiles

__all__ = ["dealkylated_phosphonium", "hydrated_acyloxonium", "hydrated_nitrilium"]


def dealkylated_phosphonium(structure: Structure, halide: Structure) -> Structure:
    """Return the P=O compound that an alkoxyphosphonium ion and a halide give, the Arbuzov step; others as they are.

    The alkyl group of the first P-O bond in canonical order leaves as alkyl halide.
    """
    atoms = structure.atoms
    for phosphorus in atoms:
        if phosphorus.symbol != "P" or phosphorus.charge != 1:
            continue
        for oxygen, _ in phosphorus.neighbours:
            alkyl = _alkyl_beyond(structure, oxygen, phosphorus.id)
            if alkyl is None:
                continue
            bench = Workbench(structure, halide)
            bench.cut(oxygen, alkyl)
            bench.add_charge(oxygen, -1)
            ion = bench.place(0, 1)
            bench.add_charge(ion, 1)
            bench.join(alkyl, ion, inverted=True)
            return next(piece.structure for piece in bench.settle() if phosphorus.id in piece.atoms)
    return structure


def _alkyl_beyond(structure: Structure, oxygen: AtomId, phosphorus: AtomId) -> AtomId | None:
    atoms = structure.atoms
    if atoms[oxygen].symbol != "O":
        return None
    for near, _ in atoms[oxygen].neighbours:
        if near != phosphorus and atoms[near].symbol == "C" and all(o == 1.0 for _, o in atoms[near].neighbours):
            return near
    return None


def hydrated_acyloxonium(structure: Structure) -> tuple[Structure, ...]:
    """Return the hydroxy esters that water gives with a cyclic acyloxonium ion, by SMILES; empty for any other ion.

    Water attacks the acyl carbon, so both carbons of the ring keep their configuration.
    """
    atoms = structure.atoms
    for carbon in atoms:
        oxygens = [n for n, _ in carbon.neighbours if atoms[n].symbol == "O"]
        if carbon.symbol != "C" or len(oxygens) != 2 or sum(atoms[n].charge for n in oxygens) != 1:
            continue
        return tuple(sorted({_opened(structure, carbon.id, leaving, oxygens) for leaving in oxygens}))
    return ()


def _opened(structure: Structure, carbon: AtomId, leaving: AtomId, oxygens: list[AtomId]) -> Structure:
    bench = Workbench(structure, parse_smiles("O"))
    water = bench.place(0, 1)
    charged = next(n for n in oxygens if bench.charge(n) == 1)
    bench.set_order(carbon, charged, 1)
    bench.add_charge(charged, -1)
    bench.cut(carbon, leaving)
    bench.take_hydrogen(water)
    bench.give_hydrogen(leaving)
    bench.release_proton(water)
    bench.join(carbon, water)
    bench.set_order(carbon, water, 2)
    return next(piece.structure for piece in bench.settle() if carbon in piece.atoms)


def hydrated_nitrilium(structure: Structure) -> Structure:
    """Return the amide that water makes of a nitrilium ion, last step of the Ritter reaction; others as they are."""
    for nitrogen in structure.atoms:
        if nitrogen.symbol != "N" or nitrogen.charge != 1:
            continue
        for carbon, order in nitrogen.neighbours:
            if order != 3.0:
                continue
            bench = Workbench(structure, parse_smiles("O"))
            water = bench.place(0, 1)
            bench.set_order(nitrogen.id, carbon, 1)
            bench.add_charge(nitrogen.id, -1)
            bench.release_proton(water)
            bench.take_hydrogen(water)
            bench.give_hydrogen(nitrogen.id)
            bench.join(carbon, water)
            bench.set_order(carbon, water, 2)
            return next(piece.structure for piece in bench.settle() if carbon in piece.atoms)
    return structure
