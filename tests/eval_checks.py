"""What the checks catch and what they leave alone: the second half of `make eval`.

usage: python -m tests.eval_checks [--misses]

1. Mistakes made on purpose in sound records: by kind, how many were caught by the right rule at the right place.
2. Honest records, rounded as people round: how many are complained of.
3. Slips of the keyboard put into every entry of the book: how many `check --fix` mends to the byte.
4. What blocks until a safety review names it in its scope.
5. A messy sheet: what is named of it, and what comes back after export and another import.
"""

import sys
from collections import Counter, defaultdict
from collections.abc import Sequence

from tests import keyboard_slips
from tests.blocking import blocking_table
from tests.honest_records import COUNT, honest_records
from tests.import_table import import_table
from tests.mistakes import complaints, found_instead, mistaken_records

SEED = 20261201


def print_mistakes(*, misses: bool) -> None:
    """Print, for each kind of mistake, how many were made and caught."""
    made, caught = Counter[str](), Counter[str]()
    missed: defaultdict[str, list[str]] = defaultdict(list)
    for each in mistaken_records(SEED):
        instead = found_instead(each)
        made[each.mistake.name] += 1
        caught[each.mistake.name] += instead is None
        if instead is not None:
            missed[each.mistake.name].append(f"{each.entry}:{each.line}:{each.column} {instead or 'nothing found'}")
    print(f"Mistakes, caught by the right rule at the right line and column: {caught.total()} of {made.total()}")
    for name in made:
        print(f"  {name:<40}{caught[name]:4} of {made[name]}")
        if misses:
            print("".join(f"      {line}\n" for line in missed[name]), end="")


def print_honest(*, misses: bool) -> None:
    """Print how many honest records are complained of."""
    found = {n: lines for n, honest in enumerate(honest_records(SEED, range(COUNT))) if (lines := complaints(honest))}
    print(f"\nHonest records, rounded to two, three or four digits: {COUNT - len(found)} of {COUNT} stay silent")
    if misses:
        print("".join(f"      {line}\n" for lines in found.values() for line in lines), end="")


def main(words: Sequence[str]) -> int:
    """Print everything."""
    if set(words) - {"--misses"}:
        print(__doc__)
        return 2
    misses = "--misses" in words
    print_mistakes(misses=misses)
    print_honest(misses=misses)
    for table in (keyboard_slips.table(), blocking_table(), import_table()):
        print(f"\n{table}", end="")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
