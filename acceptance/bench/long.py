"""Very long logs of delimited text, read in pieces: hashed, taken apart and packed in one pass, in bounded memory.

Pieces that are plain are taken apart by threads: the C reader and numpy let each other run. Odd lines are cut out
of the others and walked one by one, as the reader does that takes a log whole. Where only all rows together can
tell what a cell is, the log is left to that reader, so that there is one answer and not two.
"""

from __future__ import annotations

import codecs
import hashlib
import os
import warnings
from collections import deque
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import BinaryIO

import numpy as np

from acceptance.bench.digits import spots
from acceptance.bench.gathered import Gathered
from acceptance.bench.headings import Vocabulary
from acceptance.bench.memory import keep_freed_memory
from acceptance.bench.outline import Start, outline_of
from acceptance.bench.pieces import Odd, Piece, take_apart
from acceptance.bench.table import Source
from acceptance.bench.text import SEPARATORS, describe_source, wide_encoding
from acceptance.bench.threads import processors
from acceptance.errors import LogError

__all__ = ["LONG", "read_long"]

LONG = 50_000_000  # bytes from which on a log is read in pieces
_PIECE = 2 << 20  # larger ones fall out of a processor's own memory, smaller ones keep the threads waiting
_HEAD = 2 << 20  # notes, headings and first rows lie in here
_END = 1 << 16  # the last piece holds at least this much, so that the end of the log can be looked at
_LONGEST_LINE = 8 << 20

Progress = Callable[[int], None]


def read_long(
    path: Path,
    file: str,
    vocabulary: Vocabulary,
    *,
    piece: int = _PIECE,
    workers: int | None = None,
    progress: Progress | None = None,
) -> tuple[Source, str, int] | None:
    """The tables of a long log, the SHA-256 of the bytes they were read from, and their number.

    None where the file must be read as a whole.

    Parameters
    ----------
    piece
        Bytes taken at a time; lines are never cut.
    workers
        Threads that take pieces apart; by default one for every processor: reading and hashing leave one half idle.
    progress
        Called with the number of bytes read so far.

    Raises
    ------
    LogError
        If no line ends in the first megabytes, the file changes while it is read, it holds no table of readings, or
        at the first line that does not fit its headings.
    """
    keep_freed_memory()
    with path.open("rb") as stream:
        before = os.fstat(stream.fileno())
        text = _Text(stream, before.st_size, progress)
        try:
            head = text.read(_HEAD)
            start = _start_of(head, text, file, vocabulary)
            if start is None:
                return None
            gathered = Gathered(start, file)
            told = _pieces(text, head[start.first :], piece, file)
            size = before.st_size // text.width - start.first
            fault = _gather(gathered, told, start, size, workers or processors())
        except UnicodeDecodeError:
            return None
        read, after = stream.tell(), os.fstat(stream.fileno())
    whole = not gathered.is_plain or read == before.st_size
    if not whole or (after.st_size, after.st_mtime_ns) != (before.st_size, before.st_mtime_ns):
        raise LogError(file, "the file changed while it was read", "read it when the logger has closed it")
    if not gathered.is_plain:
        return None
    if fault is not None:
        raise fault
    outline = start.outline
    dialect = f"{SEPARATORS[outline.separator]}, {{}}, {gathered.encoding}"
    source = describe_source(gathered.source, gathered.tables, outline.layout, dialect)
    return source, text.digest.hexdigest(), read


class _Text:
    """A file's bytes, hashed as they are read; those of UTF-16 are given in UTF-8."""

    def __init__(self, stream: BinaryIO, size: int, progress: Progress | None) -> None:
        self.digest = hashlib.sha256()
        self.encoding = ""  # that the text was in, where it is given in another
        self.width = 1  # bytes of a character in the file, mostly
        self._stream, self._left, self._progress = stream, size, progress
        self._decoder: codecs.IncrementalDecoder | None = None
        self._has_begun = False

    def read(self, size: int) -> bytes:
        """The next bytes, about so many; a UnicodeDecodeError where they are not in the encoding of the first."""
        raw = self._stream.read(min(size, self._left))  # no farther than the file went at first: it may grow
        self._left -= len(raw)
        self.digest.update(raw)
        if self._progress is not None:
            self._progress(self._stream.tell())
        if not self._has_begun:
            self._begin(raw)
        if self._decoder is None:
            return raw
        data = self._decoder.decode(raw, final=self._left <= 0 or not raw).encode("utf-8", errors="replace")
        return data or (self.read(size) if raw else data)

    @property
    def is_at_end(self) -> bool:
        """Whether all of the file was read."""
        return self._left <= 0

    def _begin(self, raw: bytes) -> None:
        self._has_begun = True
        codec, encoding = wide_encoding(raw)
        if codec:
            self.encoding, self.width = encoding, 2
            self._decoder = codecs.getincrementaldecoder(codec)()


def _start_of(head: bytes, text: _Text, file: str, vocabulary: Vocabulary) -> Start | None:
    """What the first lines tell; None where the file must be read as a whole."""
    if b"\x00" in head:
        return None
    if b"\n" not in head:
        if b"\r" in head or text.is_at_end:
            return None
        raise _endless(file, 1)
    lines = head if text.is_at_end else head[: head.rfind(b"\n") + 1]
    return outline_of(lines, file, vocabulary, encoding=text.encoding)


def _endless(file: str, line: int) -> LogError:
    found = f"{'this' if line else 'a'} line does not end within {_LONGEST_LINE >> 20} MB"
    return LogError(file, found, "expected delimited text, one line a sample", line=line, column=1)


# --- pieces ---------------------------------------------------------------------------------------------------------


def _pieces(stream: _Text, rest: bytes, size: int, file: str) -> Iterator[tuple[bytes, bool]]:
    """The file from its first row on in whole lines, and whether a piece is the last one.

    The last piece is no shorter than its end, unless the whole is.
    """
    held = rest
    end = min(_END, size)
    while True:
        more = stream.read(size)
        if not more:
            break
        held += more
        cut = held.rfind(b"\n", 0, max(0, len(held) - end)) + 1
        if cut > size // 2:
            yield held[:cut], False
            held = held[cut:]
        elif len(held) > size + end + _LONGEST_LINE:
            raise _endless(file, 0)
    while len(held) > 2 * size + end:
        cut = held.rfind(b"\n", 0, size) + 1 or held.find(b"\n", 0, len(held) - end) + 1
        if not cut:
            break
        yield held[:cut], False
        held = held[cut:]
    yield held, True


def _gather(
    gathered: Gathered, pieces: Iterator[tuple[bytes, bool]], start: Start, size: int, workers: int
) -> LogError | None:
    """Take all pieces in, in order, until one cannot be told by itself; returns the first fault met."""
    from concurrent.futures import Future, ThreadPoolExecutor

    looked_at = np.array(spots(size), dtype=np.int64)
    waiting: deque[Future[list[Piece | Odd]]] = deque()
    fault: LogError | None = None

    def take_in() -> bool:
        nonlocal fault
        parts = waiting.popleft().result()
        if fault is not None:
            return gathered.look_over(parts)
        try:
            return gathered.take(parts) and (bool(waiting) or gathered.end())
        except LogError as problem:
            fault = problem
            return True

    with warnings.catch_warnings(), ThreadPoolExecutor(workers) as pool:
        warnings.simplefilter("error")  # of what it leaves out, the C reader only warns
        try:
            begin = 0
            for body, is_last in pieces:
                at = (looked_at[(looked_at >= begin) & (looked_at < begin + len(body))] - begin).tolist()
                begin += len(body)
                waiting.append(pool.submit(take_apart, body, start.outline, at, is_last=is_last))
                if len(waiting) > workers + 1 and not take_in():
                    return None
            while waiting:
                if not take_in():
                    return None
        finally:
            pool.shutdown(cancel_futures=True)
    return fault
