"""The gates of the engine, listed by hand in id order."""

from functools import lru_cache

from builder.mechanism.rules.addition import ADDITION_GATES
from builder.mechanism.rules.elimination import ELIMINATION_GATES
from builder.mechanism.rules.gate import Gate, Situation
from builder.mechanism.rules.substitution import SUBSTITUTION_GATES
from builder.records.vocabulary import Mechanism

__all__ = ["GATES", "Gate", "Situation", "closing_gates"]

GATES: tuple[Gate, ...] = (*ADDITION_GATES, *ELIMINATION_GATES, *SUBSTITUTION_GATES)


def closing_gates(mechanism: Mechanism, situation: Situation) -> tuple[Gate, ...]:
    """Return the gates that close a mechanism in this situation; empty where it is open."""
    return tuple(gate for gate in _shut(situation) if mechanism in gate.closes)


@lru_cache(maxsize=1024)
def _shut(situation: Situation) -> tuple[Gate, ...]:
    return tuple(gate for gate in GATES if gate.fires(situation))
