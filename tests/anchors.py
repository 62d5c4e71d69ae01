"""What the engine gives for each anchor, in the unit of its expected number."""

import math
from collections.abc import Mapping, Sequence
from statistics import linear_regression

from builder.mechanism.ionising_power import Scale, ionising_power
from builder.mechanism.log_rate import GAS_CONSTANT
from builder.mechanism.observations.tables import Anchor, AnchorKind, Channel, Known, Mixture, Share, ShareKind
from builder.mechanism.observing import see_channel, see_share_value
from builder.mechanism.rate_terms import Parameters

__all__ = ["CUMYL_SIGMA_PLUS", "activation_enthalpy_kj", "anchor_value", "rho_plus"]

CUMYL_SIGMA_PLUS: Mapping[str, float] = {
    "COc1ccc(C(C)(C)Cl)cc1": -0.778,
    "Cc1ccc(C(C)(C)Cl)cc1": -0.311,
    "CC(C)(Cl)c1ccc(F)cc1": -0.073,
    "CC(C)(Cl)c1ccccc1": 0.0,
    "CC(C)(Cl)c1ccc(Cl)cc1": 0.114,
    "CC(C)(Cl)c1ccc(Br)cc1": 0.150,
    "Cc1cccc(C(C)(C)Cl)c1": -0.066,
    "COc1cccc(C(C)(C)Cl)c1": 0.047,
    "CC(C)(Cl)c1cccc(Cl)c1": 0.399,
    "CC(C)(Cl)c1ccc([N+](=O)[O-])cc1": 0.790,
}
"""σ+ of cumyl chlorides: Brown and Okamoto, J. Am. Chem. Soc. 1958, 80, 4979 (from memory)."""

_HALF_SPAN_K = 10.0
"""Half of the range of temperature over which an activation enthalpy is measured."""


def anchor_value(anchor: Anchor, parameters: Parameters) -> float:
    """Return the number the engine gives. Raises SilentError where it has no pathway of the kind asked for."""
    if anchor.kind in {AnchorKind.N_T, AnchorKind.Y_CL}:
        return ionising_power([(part.name, share) for part, share in anchor.solvent], Scale(anchor.kind.value)).value
    if anchor.kind is AnchorKind.ACTIVATION_ENTHALPY:
        return activation_enthalpy_kj(anchor, parameters)
    if anchor.kind is AnchorKind.RHO:
        return rho_plus(anchor.solvent, anchor.temperature_c, parameters)
    if anchor.kind not in {AnchorKind.LOG_K, AnchorKind.LOG_RATIO}:
        return see_share_value(_as_share(anchor), parameters)
    first = _log_k(anchor, anchor.substrate, anchor.nucleophile, anchor.solvent, anchor.temperature_c, parameters)
    if anchor.kind is AnchorKind.LOG_K:
        return first
    solvent = anchor.second_solvent or ()
    return first - _log_k(
        anchor, anchor.second_substrate, anchor.second_nucleophile, solvent, anchor.temperature_c, parameters
    )


def _log_k(
    anchor: Anchor,
    substrate: str | None,
    nucleophile: str | None,
    solvent: Mixture,
    temperature_c: float,
    parameters: Parameters,
) -> float:
    if substrate is None or anchor.channel is None:
        raise ValueError(f"{anchor.id} is no rate")
    return see_channel(substrate, nucleophile, solvent, temperature_c, anchor.channel, parameters).value


def activation_enthalpy_kj(anchor: Anchor, parameters: Parameters) -> float:
    """Return ΔH‡ in kJ/mol as it is measured: the slope of ln(k/T) on 1/T over twenty kelvin."""
    points = []
    for step in (-_HALF_SPAN_K, _HALF_SPAN_K):
        t_c = anchor.temperature_c + step
        log_k = _log_k(anchor, anchor.substrate, anchor.nucleophile, anchor.solvent, t_c, parameters)
        kelvin = t_c + 273.15
        points.append((1 / kelvin, log_k * math.log(10) - math.log(kelvin)))
    (cold, low), (warm, high) = points
    return -GAS_CONSTANT * (high - low) / (warm - cold) / 1000


def rho_plus(solvent: Mixture, temperature_c: float, parameters: Parameters) -> float:
    """Return the slope of log10 k of ionisation on published σ+ over the cumyl chlorides."""
    logs: Sequence[float] = [
        see_channel(smiles, None, solvent, temperature_c, Channel.IONISATION, parameters).value
        for smiles in CUMYL_SIGMA_PLUS
    ]
    return linear_regression(list(CUMYL_SIGMA_PLUS.values()), logs).slope


def _as_share(anchor: Anchor) -> Share:
    if anchor.substrate is None:
        raise ValueError(f"{anchor.id} is no share")
    return Share(
        id=anchor.id,
        substrate=anchor.substrate,
        nucleophile=anchor.nucleophile,
        solvent=anchor.solvent,
        temperature_c=anchor.temperature_c,
        concentration_m=anchor.concentration_m,
        kind=ShareKind(anchor.kind.value),
        product=anchor.product,
        value=anchor.expected if 0 <= anchor.expected <= 1 else 0.0,
        error=0.1,
        source=anchor.source,
        how=Known(anchor.how),
        note="",
    )
