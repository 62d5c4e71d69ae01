"""What is asked of a writer: on a terminal by prompts, elsewhere not at all."""

import signal
from collections.abc import Callable, Sequence
from textwrap import fill
from typing import Protocol, TypeVar

import click

from builder.mechanism.asking import AskingError
from builder.records.quantities import QuantityError

__all__ = ["Dialogue", "Prompts", "Silence"]

Read = TypeVar("Read")


class Dialogue(Protocol):
    """Somebody to ask; or nobody, and then what can stay open stays open."""

    @property
    def is_live(self) -> bool:
        """Say whether anybody answers."""

    def tell(self, text: str) -> None:
        """Say something that needs no answer."""

    def must_choose(self, question: str, options: Sequence[str], mend: str) -> int:
        """Return the place of the option that was chosen.

        Raises AskingError where nobody answers; mend: what to state beforehand.
        """

    def may_choose(self, question: str, options: Sequence[str]) -> int | None:
        """Return the place of the option that was chosen; None where it was left open."""

    def may_say(self, question: str, read: Callable[[str], Read]) -> Read | None:
        """Return an answer as `read` takes it; None where it was left open.

        read: raises AskingError or QuantityError for what it cannot take, and the question comes again.
        """

    def agrees(self, question: str, *, by_enter: bool = True) -> bool:
        """Return whether the answer is yes; no where nobody answers.

        by_enter: what an empty answer means.
        """


WIDTH = 100


def _wrapped(text: str) -> str:
    """Return a text of one line over as many as it takes; its indent stays."""
    indent = text[: len(text) - len(text.lstrip())]
    return fill(text.strip(), WIDTH, initial_indent=indent, subsequent_indent=f"{indent}    ", break_long_words=False)


def _let_interrupts_through() -> None:
    """Install the handler of Ctrl-C again, as Python does it.

    RDKit puts it back so that the system resumes a read after it: a prompt would wait for Enter before it ends.
    """
    handler = signal.getsignal(signal.SIGINT)
    if handler is not None:
        signal.signal(signal.SIGINT, handler)


class Silence:
    """Nobody to ask. What is told goes to standard error."""

    is_live = False

    def tell(self, text: str) -> None:
        """Print a text to standard error."""
        click.echo(_wrapped(text), err=True)

    def must_choose(self, question: str, options: Sequence[str], mend: str) -> int:
        """Refuse to choose."""
        raise AskingError(f"{question.rstrip('?')}: {', '.join(options)}", mend)

    def may_choose(self, question: str, options: Sequence[str]) -> int | None:  # noqa: ARG002 - nobody is asked
        """Leave it open."""
        return None

    def may_say(self, question: str, read: Callable[[str], Read]) -> Read | None:  # noqa: ARG002 - nobody is asked
        """Leave it open."""
        return None

    def agrees(self, question: str, *, by_enter: bool = True) -> bool:  # noqa: ARG002 - nobody is asked
        """Take nothing for granted."""
        return False


class Prompts:
    """Prompts on a terminal, on standard error; an empty answer leaves a question open, Ctrl-C ends it all."""

    is_live = True

    def tell(self, text: str) -> None:
        """Print a text to standard error."""
        click.echo(_wrapped(text), err=True)

    def must_choose(self, question: str, options: Sequence[str], mend: str) -> int:  # noqa: ARG002 - it is asked
        """Ask until one of the options is chosen."""
        while True:
            place = self.may_choose(question, options)
            if place is not None:
                return place

    def may_choose(self, question: str, options: Sequence[str]) -> int | None:
        """List the options with numbers, and ask for one by number or in words."""
        self.tell(question)
        for number, option in enumerate(options, start=1):
            self.tell(f"  {number}  {option}")

        def read(answer: str) -> int:
            words = ((str(place + 1), option, option.partition(" (")[0]) for place, option in enumerate(options))
            places = [place for place, spellings in enumerate(words) if answer in spellings]
            if not places:
                raise AskingError(f'"{answer}" is none of them', f"type a number from 1 to {len(options)}")
            return places[0]

        return self.may_say("Number", read)

    def may_say(self, question: str, read: Callable[[str], Read]) -> Read | None:
        """Ask until the answer can be read, or is empty."""
        while True:
            _let_interrupts_through()
            answer = click.prompt(question, default="", show_default=False, err=True).strip()
            if not answer:
                return None
            try:
                return read(answer)
            except AskingError as fault:
                self.tell(f"  {fault}")
            except QuantityError as fault:
                self.tell(f"  {fault.message}; {fault.mend}")

    def agrees(self, question: str, *, by_enter: bool = True) -> bool:
        """Ask for yes or no."""
        _let_interrupts_through()
        return click.confirm(question, default=by_enter, err=True)
