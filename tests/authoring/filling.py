"""A writer for tests: fills the gaps of a new record, as somebody would who knows nothing beyond what it asks for."""

from builder.records.specimen import GAP

__all__ = ["filled"]

_VALUES = {
    "title": "A record of the tests",
    "by": "bench-1",
    "stereo": "not determined",
    "mass": "1.00 g",
    "equivalents": "1.5",
    "volume": "20 mL",
    "concentration": "0.5 mol/L",
    "temperature": "60 °C",
    "time": "16 h",
    "yield": "30 %",
    "kind": "isolated",
    "ee": "80 %",
}


def filled(text: str, **values: str) -> str:
    """Return a record with its gaps filled: by `values` (keys as in the record), else with what is usual."""
    names = 0
    lines = []
    for line in text.splitlines():
        told, mark, hint = line.partition("  # ")
        if GAP in told and not told.lstrip().startswith("#"):
            key, _, _ = told.strip().removeprefix("- ").partition(":")
            names += key == "name"
            value = values.get(key) or _VALUES.get(key) or f"compound {names}"
            told = told.replace(GAP, value if key != GAP else "compound 1")
        lines.append(f"{told}{mark}{hint}")
    return "\n".join(lines) + "\n"
