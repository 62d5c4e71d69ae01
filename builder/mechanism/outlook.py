"""Forecasts in words: shares and intervals as text, and where something is held to be out of the question."""

__all__ = ["OUT_OF_QUESTION", "expected_text", "percent_text"]

OUT_OF_QUESTION = 0.05
"""Upper end of an interval below which the engine cannot defend a mechanism, a course or a by-product."""


def percent_text(fraction: float) -> str:
    """Return a fraction as percent, with a decimal where it is close to none or all.

    >>> percent_text(0.00002), percent_text(0.034), percent_text(0.5), percent_text(0.9999)
    ('< 0.1 %', '3.4 %', '50 %', '> 99.9 %')
    """
    percent = 100 * fraction
    if percent < 0.05:
        return "< 0.1 %"
    if percent > 99.95:
        return "> 99.9 %"
    return f"{percent:.1f} %" if percent < 9.95 or percent >= 99 else f"{percent:.0f} %"


def expected_text(fraction: float, interval: tuple[float, float]) -> str:
    """Return a fraction with its 90 % interval; alone where all three read alike.

    >>> expected_text(0.97, (0.9, 0.99)), expected_text(0.0, (0.0, 0.0001))
    ('97 % (90 % to 99.0 %)', '< 0.1 %')
    """
    value, low, high = map(percent_text, (fraction, *interval))
    return value if value == low == high else f"{value} ({low} to {high})"
