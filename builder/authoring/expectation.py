"""What a planned reaction is expected to give, as products a writer may confirm or delete."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from builder.checks.case import Case
from builder.chemistry.structure import Structure
from builder.mechanism.asking import AskingError, read_wish
from builder.mechanism.forecast import Forecast, Forecasted
from builder.mechanism.outlook import expected_text, percent_text
from builder.records.vocabulary import ELIMINATIONS, SUBSTITUTIONS, Mechanism, Result, StereoKind

__all__ = ["Expected", "Want", "expected_products", "forecast_line", "read_want"]

LEAST_SHARE = 0.05
"""Of what reacts, below which a by-product is not put down."""
MOST_BY_PRODUCTS = 5


@dataclass(frozen=True, slots=True)
class Want:
    """What is wanted: a product, or whatever one of these mechanisms gives."""

    product: Structure | None
    mechanisms: frozenset[Mechanism]


@dataclass(frozen=True, slots=True)
class Expected:
    """One product to confirm.

    stereo: as far as it follows from the substrate; None where the writer must say. said: why it stands here.
    """

    structure: Structure
    is_desired: bool
    stereo: StereoKind | None
    said: str


_WANTED_RESULTS = {
    Result.SUBSTITUTION: SUBSTITUTIONS,
    Result.ELIMINATION: ELIMINATIONS,
    Result.ADDITION: frozenset({Mechanism.ADE}),
}


def read_want(text: str) -> Want:
    """Return what "elimination", "E2" or a SMILES asks for.

    Raises AskingError for what is none of them.
    """
    word = text.strip().lower()
    for result, mechanisms in _WANTED_RESULTS.items():
        if word == result.value:
            return Want(None, mechanisms)
    try:
        wish = read_wish(text)
    except AskingError as fault:
        raise AskingError(fault.what, "write substitution, elimination, addition, a mechanism or a SMILES") from fault
    return Want(wish.product, frozenset() if wish.mechanism is None else frozenset({wish.mechanism}))


def forecast_line(case: Case, forecast: Forecast) -> str:
    """Return a forecast in one line: shares by mechanism, and what would have reacted in the time."""
    shown = [
        f"{mechanism.value} {expected_text(share, forecast.intervals[mechanism])}"
        for mechanism, share in forecast.shares.items()
        if share >= LEAST_SHARE
    ]
    stage = max(case.record.stages, key=lambda stage: stage.temperature.highest_c)
    conversion = expected_text(forecast.conversion, forecast.conversion_interval)
    how = f"at {stage.temperature} in {stage.time}: conversion {conversion}"
    return f"{', '.join(shown)}; {how}" if shown else how


def expected_products(
    forecast: Forecast | None, want: Want | None, drawn: Sequence[Structure], stereo: StereoKind | None
) -> tuple[Expected, ...]:
    """Return the products to put down, the wanted one first; empty where nobody knows any.

    drawn: products that the writer drew; they stand whatever is forecast. stereo: of the substrate.
    """
    pools = _pools(forecast.products) if forecast is not None else []
    stated = [*drawn, *([want.product] if want is not None and want.product is not None else [])]
    stated = list(dict.fromkeys(stated))
    first = [_stated(structure, pools, forecast, stereo, is_desired=not at) for at, structure in enumerate(stated)]
    left = [pool for pool in pools if not any(_is_same(structure, pool) for structure in stated)]
    if not stated and left:
        main = _wanted(left, want)
        left.remove(main)
        first = [_forecast_product(main, forecast, stereo, is_desired=True)]
    more = [pool for pool in left if _share(pool) >= LEAST_SHARE][:MOST_BY_PRODUCTS]
    return (*first, *(_forecast_product(pool, forecast, stereo, is_desired=False) for pool in more))


# --- pools: ways to one product, mirror images together -------------------------------------------------------

_Pool = list[Forecasted]


def _pools(products: Sequence[Forecasted]) -> list[_Pool]:
    """Return what is forecast by product, largest first; two mirror images are one product with an ee."""
    pools: dict[str, _Pool] = {}
    for product in products:
        either = min(product.structure.smiles, product.structure.mirror_image.smiles)
        pools.setdefault(either, []).append(product)
    return sorted(pools.values(), key=lambda pool: -_share(pool))


def _share(pool: _Pool) -> float:
    return math.fsum(product.share for product in pool)


def _is_same(structure: Structure, pool: _Pool) -> bool:
    flat = structure.without_counter_ions
    return any(flat in (product.structure, product.structure.mirror_image, product.structure.flat) for product in pool)


def _wanted(pools: Sequence[_Pool], want: Want | None) -> _Pool:
    if want is None or not want.mechanisms:
        return pools[0]
    fitting = (pool for pool in pools if any(product.mechanism in want.mechanisms for product in pool))
    return next(fitting, pools[0])


def _stated(
    structure: Structure,
    pools: Sequence[_Pool],
    forecast: Forecast | None,
    stereo: StereoKind | None,
    *,
    is_desired: bool,
) -> Expected:
    pool = next((pool for pool in pools if _is_same(structure, pool)), None)
    if pool is not None:
        return Expected(structure, is_desired, _stereo(structure, pool, stereo), _said(pool, forecast))
    said = "" if forecast is None else "not among the products forecast: confirm, or correct the drawing"
    return Expected(structure, is_desired, _stereo(structure, [], stereo), said)


def _forecast_product(
    pool: _Pool, forecast: Forecast | None, stereo: StereoKind | None, *, is_desired: bool
) -> Expected:
    structure = max(pool, key=lambda product: product.share).structure
    return Expected(structure, is_desired, _stereo(structure, pool, stereo), _said(pool, forecast))


def _said(pool: _Pool, forecast: Forecast | None) -> str:
    """Return what the forecast says of a product, with the interval of its mechanism."""
    assert forecast is not None  # noqa: S101 - pools come from a forecast
    mechanism = max(pool, key=lambda product: product.share).mechanism
    share, of_all = _share(pool), forecast.shares.get(mechanism, 0.0)
    interval = forecast.intervals.get(mechanism)
    said = f"{mechanism.value} {percent_text(share)}"
    if interval is not None and abs(share - of_all) < 0.005:
        said = f"{mechanism.value} {expected_text(of_all, interval)}"
    elif interval is not None:
        said += f" of what reacts, {mechanism.value} in all {expected_text(of_all, interval)}"
    rearranged = ", rearranged" if all(product.rearranged for product in pool) else ""
    return f"forecast {said}{rearranged}{_enantiomers(pool)}: confirm or delete"


def _enantiomers(pool: _Pool) -> str:
    parts: dict[str, float] = {}
    for product in pool:
        parts[product.structure.smiles] = parts.get(product.structure.smiles, 0.0) + product.share
    if len(parts) < 2 or min(parts.values()) < 0.01 * sum(parts.values()):
        return ""
    numbers = sorted((100 * part / sum(parts.values()) for part in parts.values()), reverse=True)
    return f", enantiomers {numbers[0]:.0f}:{numbers[1]:.0f}"


def _stereo(structure: Structure, pool: _Pool, of_substrate: StereoKind | None) -> StereoKind | None:
    """Return the kind of stereo that follows; None where it depends on what only the writer knows."""
    if structure.is_achiral:
        return StereoKind.ACHIRAL
    if not structure.stereocentres.total:
        return None
    if of_substrate in {StereoKind.RACEMATE, StereoKind.ACHIRAL} and structure.stereocentres.total == 1:
        return StereoKind.RACEMATE
    is_one = of_substrate is StereoKind.SINGLE_ENANTIOMER and not structure.stereocentres.unspecified
    return StereoKind.SINGLE_ENANTIOMER if is_one and pool and not _enantiomers(pool) else None
