"""Forecasts in words: shares and intervals as text, and where something is held to be out of the question."""

__all__ = ["OUT_OF_QUESTION", "expected_text", "percent_text"]

OUT_OF_QUESTION = 0.05
"""Upper end of an interval below which the engine cannot defend a mechanism, a course or a by-product."""


def percent_text(fraction: float) -> str:
    """Return a fraction as percent with the digits that mean something: a decimal where it is close to none or all.

    >>> percent_text(0.00002), percent_text(0.004), percent_text(0.07), percent_text(0.995), percent_text(0.9999)
    ('< 0.1 %', '0.4 %', '7 %', '99.5 %', '> 99.9 %')
    """
    percent = 100 * fraction
    if percent < 0.05:
        return "< 0.1 %"
    if percent > 99.9:
        return "> 99.9 %"
    return f"{percent:.1f} %" if percent < 0.95 or percent >= 99.05 else f"{percent:.0f} %"


def expected_text(fraction: float, interval: tuple[float, float]) -> str:
    """Return a fraction with its 90 % interval; alone where all three read alike.

    >>> expected_text(0.97, (0.9, 0.985)), expected_text(0.0, (0.0, 0.0001))
    ('97 % (90 to 98 %)', '< 0.1 %')
    """
    value, low, high = map(percent_text, (fraction, *interval))
    return value if value == low == high else f"{value} ({low.removesuffix(' %')} to {high})"
