"""How alike two structures are."""

from functools import cache, lru_cache

from rdkit import DataStructs
from rdkit.Chem import rdFingerprintGenerator

from builder.chemistry.structure import Structure

__all__ = ["similarity"]

FINGERPRINT_RADIUS = 2
"""Bonds looked at around each atom."""
FINGERPRINT_BITS = 2048


@cache
def _fingerprints() -> rdFingerprintGenerator.FingerprintGenerator64:
    return rdFingerprintGenerator.GetMorganGenerator(radius=FINGERPRINT_RADIUS, fpSize=FINGERPRINT_BITS)


@lru_cache(maxsize=512)
def _fingerprint(structure: Structure) -> DataStructs.ExplicitBitVect:
    found: DataStructs.ExplicitBitVect = _fingerprints().GetFingerprint(structure.mol)
    return found


def similarity(one: Structure, other: Structure) -> float:
    """Return the Tanimoto coefficient of circular fingerprints of radius 2: 0 for nothing in common, 1 at best.

    Stereochemistry does not count.
    Source: Rogers and Hahn, J. Chem. Inf. Model. 2010, 50, 742 (from memory).
    """
    return float(DataStructs.TanimotoSimilarity(_fingerprint(one), _fingerprint(other)))
