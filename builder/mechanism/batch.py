"""Many questions at once: lines of JSON in, lines of JSON out, in the same order, over several processes.

A line that cannot be answered gives an error in its place and the rest goes on, whatever is wrong with it: no JSON, a
word nobody knows, a fault of ours, even a process that dies over it. Only a few chunks of lines are in memory at once.
"""

import json
import os
import signal
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import Future, ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from itertools import chain, islice
from typing import Any, BinaryIO, NamedTuple

from builder.mechanism.answer import answer_of, how_read
from builder.mechanism.asking import AskingError, question_from_line
from builder.mechanism.engine import predict
from builder.mechanism.forecast import Forecast
from builder.mechanism.question import Question
from builder.mechanism.rate_terms import fitted_parameters

__all__ = ["MAX_LINE_BYTES", "Answer", "Line", "answer_line", "answers", "lines_of", "usual_processes"]

MAX_LINE_BYTES = 100_000
"""Longest line read; a question takes a few hundred bytes."""
CHUNK = 16
"""Lines a process is given at a time: long enough to hide what it costs to hand them over."""
AHEAD = 4
"""Chunks handed out for each process before the first answer is waited for."""
MOST_PROCESSES = 16

CautionsOf = Callable[[Question, Forecast], Iterable[dict[str, str]]]
"""Tells the cautions of a flask; a function of a module, since it goes to other processes."""


class Line(NamedTuple):
    """One line of a batch: its number from 1, its text, and its length in the file, blank lines before it included."""

    number: int
    text: bytes
    size: int


class Answer(NamedTuple):
    """One line of results, without its line end. size: of the line it answers, for the progress bar."""

    text: str
    is_error: bool
    size: int


def usual_processes() -> int:
    """Return how many processes a batch takes where nobody says: one for each processor, at most MOST_PROCESSES."""
    return max(1, min(os.cpu_count() or 1, MOST_PROCESSES))


def lines_of(file: BinaryIO) -> Iterator[Line]:
    """Yield the lines of a file that are not blank; of one longer than MAX_LINE_BYTES no more than its beginning."""
    number = size = 0
    while text := file.readline(MAX_LINE_BYTES + 1):
        number += 1
        size += len(text)
        last = text
        while len(last) > MAX_LINE_BYTES and not last.endswith(b"\n"):  # the rest of a line that is too long
            last = file.readline(MAX_LINE_BYTES + 1)
            size += len(last)
        if text.strip():
            yield Line(number, text.removeprefix(b"\xef\xbb\xbf") if number == 1 else text, size)
            size = 0


def answers(lines: Iterable[Line], processes: int, cautions_of: CautionsOf) -> Iterator[Answer]:
    """Yield the answer to every line, in order; the same whatever the number of processes.

    Raises ValueError, before any answer, where a table of the package is broken: that is no fault of a line.
    """
    fitted_parameters()
    chunks = _chunks(lines)
    first = list(islice(chunks, 2))
    if processes == 1 or len(first) < 2:
        for chunk in chain(first, chunks):
            yield from _answer_chunk(chunk, cautions_of)
        return
    yield from _answers_of_processes(chain(first, chunks), processes, cautions_of)


def answer_line(line: Line, cautions_of: CautionsOf) -> Answer:
    """Return the answer to one line, or its error; never raises."""
    identifier: object = None
    try:
        asked = _parsed(line)
        identifier = asked.get("id")
        read = question_from_line(asked)
        forecast = predict(read.question)
        found = {"id": identifier, **answer_of(forecast, tuple(cautions_of(read.question, forecast))), **how_read(read)}
        return Answer(_json(found), is_error=False, size=line.size)
    except AskingError as fault:
        return _error(line, identifier, str(fault))
    except Exception as fault:  # noqa: BLE001 - one line must not stop the others; it is reported as ours
        return _error(line, identifier, f"our fault: {type(fault).__name__}: {fault}")


def _parsed(line: Line) -> dict[str, Any]:
    if len(line.text) > MAX_LINE_BYTES:
        raise AskingError(f"line {line.number} is longer than {MAX_LINE_BYTES} bytes", "one question takes one line")
    try:
        asked = json.loads(line.text.decode("utf-8"))
    except UnicodeDecodeError as fault:
        raise AskingError(f"line {line.number} is not UTF-8", "save the file as UTF-8") from fault
    except (ValueError, RecursionError) as fault:
        raise AskingError(f"line {line.number} is no JSON: {fault}", "write one JSON object on each line") from fault
    if not isinstance(asked, dict):
        raise AskingError(f"line {line.number} is no JSON object", 'write {"id": ..., "substrate": ..., ...}')
    return asked


def _error(line: Line, identifier: object, what: str) -> Answer:
    try:
        text = _json({"id": identifier, "error": what})
    except (ValueError, RecursionError):
        text = json.dumps({"id": None, "error": f"line {line.number}: {what}"})
    return Answer(text, is_error=True, size=line.size)


def _json(value: object) -> str:
    """Return JSON that can be written. Raises ValueError for what cannot: not-a-number, half a surrogate pair."""
    text = json.dumps(value, ensure_ascii=False, allow_nan=False)
    text.encode("utf-8")
    return text


# --- over several processes -----------------------------------------------------------------------------------

_Chunk = tuple[Line, ...]


def _chunks(lines: Iterable[Line]) -> Iterator[_Chunk]:
    source = iter(lines)
    while chunk := tuple(islice(source, CHUNK)):
        yield chunk


def _answer_chunk(chunk: _Chunk, cautions_of: CautionsOf) -> list[Answer]:
    return [answer_line(line, cautions_of) for line in chunk]


def _answers_of_processes(chunks: Iterator[_Chunk], processes: int, cautions_of: CautionsOf) -> Iterator[Answer]:
    pool = _pool(processes)
    waiting: deque[tuple[_Chunk, Future[list[Answer]]]] = deque()
    try:
        while True:
            for chunk in islice(chunks, AHEAD * processes - len(waiting)):
                waiting.append((chunk, _submitted(pool, chunk, cautions_of)))
            if not waiting:
                return
            chunk, future = waiting.popleft()
            try:
                found = future.result()
            except BrokenProcessPool:  # over this chunk or another: each breaking costs one chunk its company
                pool.shutdown()
                found = [_answer_alone(line, cautions_of) for line in chunk]
                pool = _pool(processes)
                waiting = deque((each, _submitted(pool, each, cautions_of)) for each, _ in waiting)
            yield from found
    finally:
        pool.shutdown(cancel_futures=True)


def _submitted(pool: ProcessPoolExecutor, chunk: _Chunk, cautions_of: CautionsOf) -> Future[list[Answer]]:
    try:
        return pool.submit(_answer_chunk, chunk, cautions_of)
    except BrokenProcessPool as fault:
        broken: Future[list[Answer]] = Future()
        broken.set_exception(fault)
        return broken


def _answer_alone(line: Line, cautions_of: CautionsOf) -> Answer:
    """Return the answer to a line from a process of its own, which may die over it."""
    with _pool(1) as pool:
        try:
            return pool.submit(answer_line, line, cautions_of).result()
        except BrokenProcessPool:
            return _error(line, None, f"our fault: the process that worked on line {line.number} died")


def _pool(processes: int) -> ProcessPoolExecutor:
    return ProcessPoolExecutor(processes, initializer=_leave_interrupts_to_the_parent)


def _leave_interrupts_to_the_parent() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)
