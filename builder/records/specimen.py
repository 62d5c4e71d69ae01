"""Two good records: the specimen, on which the examples of rules are played, and a sample to be shown."""

import re
from functools import cache
from importlib import resources

__all__ = ["GAP", "SPECIMEN_FILE", "outcome_example", "sample_text", "specimen_text", "with_example"]

SPECIMEN_FILE = "NS4T9XQ2N.yml"
_BLOCK = re.compile(r"^(?P<key>[A-Za-z_]+):.*(?:\n(?:[ \-].*|$))*", re.MULTILINE)
_WITHOUT = re.compile(r"^# without (?P<key>[a-z_]+)$", re.MULTILINE)


GAP = "TO FILL IN"
"""What a skeleton leaves to the writer; a record that still holds it is not finished."""

ONE_PRODUCT = "{label: A, name: 2-azidobutane, smiles: 'CCC(C)N=[N+]=[N-]', use: desired}"
TWO_PRODUCTS = f"{ONE_PRODUCT}, {{label: B, name: but-1-ene, smiles: 'C=CCC', use: by-product}}"


def outcome_example(*lines: str, products: str = ONE_PRODUCT, more: str = "") -> str:
    """Return an example outcome of the specimen: measurement lines, products, and further keys of the outcome."""
    extra = "".join(f"  {line}\n" for line in more.splitlines())
    measured = f"  measured: [{', '.join(lines)}]" if lines else ""
    return f"outcome:\n  result: [substitution]\n{extra}  products: [{products}]\n{measured}".rstrip("\n")


def sample_text() -> str:
    """Return the YAML of a record as people keep them, invented, of substances one may well imitate."""
    return resources.files("builder.records").joinpath("sample.yml").read_text("utf-8")


@cache
def specimen_text() -> str:
    """Return the YAML of the specimen."""
    return resources.files("builder.records").joinpath("specimen.yml").read_text("utf-8")


def with_example(example: str) -> str:
    """Return the specimen with the top-level keys of `example` in place of its own.

    example: YAML text of one or more top-level keys. A line `# without KEY` takes a key away.
    """
    dropped = {match["key"] for match in _BLOCK.finditer(example)} | set(_WITHOUT.findall(example))
    kept = [match[0] for match in _BLOCK.finditer(specimen_text()) if match["key"] not in dropped]
    added = _WITHOUT.sub("", example).strip("\n")
    return "\n".join(kept).rstrip("\n") + "\n" + (added + "\n" if added else "")
