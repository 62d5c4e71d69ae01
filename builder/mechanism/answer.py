"""A forecast as the plain values of the `predict` contract (design: command line)."""

import math
from collections.abc import Sequence
from typing import Any

from builder.mechanism.asking import Read
from builder.mechanism.forecast import Forecast
from builder.mechanism.improve import Improvement

__all__ = ["answer_of", "change_of", "how_read"]


def answer_of(forecast: Forecast, cautions: Sequence[dict[str, str]] = ()) -> dict[str, Any]:
    """Return a forecast as JSON-ready values; infinite and unknown times are null."""
    return {
        "mechanism": forecast.mechanism.value,
        "shares": {m.value: round(share, 6) for m, share in forecast.shares.items()},
        "share_intervals": {m.value: [round(low, 6), round(high, 6)] for m, (low, high) in forecast.intervals.items()},
        "log_k": {label: round(value, 3) for label, value in forecast.log_k.items()},
        "log_k_errors": {label: round(value, 2) for label, value in forecast.log_k_errors.items()},
        "half_life_s": _finite(forecast.half_life_s),
        "t95_s": _finite(forecast.t95_s),
        "t99_s": _finite(forecast.t99_s),
        "conversion": round(forecast.conversion, 4),
        "conversion_interval": [round(c, 4) for c in forecast.conversion_interval],
        "products": [
            {
                "smiles": p.structure.smiles,
                "share": round(p.share, 4),
                "mechanism": p.mechanism.value,
                "course": p.course.value,
                "rearranged": p.rearranged,
                "path": list(p.path),
            }
            for p in forecast.products
        ],
        "course": forecast.course.value,
        "stereo": forecast.course.value.replace(" ", "_"),
        "rearranged": forecast.rearranged,
        "covered": forecast.is_covered,
        "reasons": [
            {
                "rule": r.rule,
                "text": r.text,
                "value": None if r.value is None else round(r.value, 3),
                "error": None if r.error is None else round(r.error, 3),
                "source": r.source,
            }
            for r in forecast.reasons
        ],
        "cautions": list(cautions),
    }


def how_read(read: Read) -> dict[str, Any]:
    """Return how the words of a question were taken and what was assumed, JSON-ready."""
    return {"read": [reading._asdict() for reading in read.readings], "assumed": sorted(read.assumed)}


def change_of(improvement: Improvement) -> dict[str, Any]:
    """Return a change that would help, JSON-ready."""
    return {
        "what": [kind.value for kind in (improvement.what, *improvement.also)],
        "change": improvement.change,
        "effort": improvement.effort,
        "share_before": round(improvement.share_before, 4),
        "share_after": round(improvement.share_after, 4),
        "conversion_before": round(improvement.conversion_before, 4),
        "conversion_after": round(improvement.conversion_after, 4),
        "reaches": improvement.reaches,
        "mechanism": improvement.forecast.mechanism.value,
    }


def _finite(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else float(f"{value:.5g}")
