"""What a command needs of the process it runs in: streams that take every letter, signals that
end it tidily, no settings of the user's that decide how figures are drawn.
"""

from __future__ import annotations

import codecs
import os
import signal
import sys
import unicodedata
from contextlib import suppress
from types import FrameType
from typing import IO

PLAIN = {
    "→": "->", "⇌": "<=>", "≥": ">=", "≤": "<=", "−": "-", "–": "-", "—": "-", "…": "...",
    "×": "x", "·": ".", "±": "+/-", "Å": "angstrom", "°": "deg ", "µ": "u", "μ": "u",
    "’": "'", "‘": "'", "“": '"', "”": '"', "∞": "infinity", "√": "sqrt", "÷": "/",
    "∑": "sum", "•": "*", "⊖": "o",
}  # fmt: skip
"""What stands for a letter where the terminal has no such letter."""

_FOR_READERS, _FOR_PROGRAMS = "meanfree-plain", "meanfree-escaped"


class Stopped(KeyboardInterrupt):
    """A signal other than Ctrl-C asked the command to end; it tidies up as for that."""


_received: list[int] = []


def prepare(*, as_json: bool) -> None:
    """Make the process fit for a command; to be called once, first."""
    _fill_gaps()
    _take_every_letter(as_json)
    _end_tidily()
    # Figures are drawn to files, so nobody's choice of a window system may stop them.
    os.environ["MPLBACKEND"] = "agg"
    # More threads bring our small matrices nothing, and where memory is short they wait for
    # each other for ever.
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")


def end() -> None:
    """The command is over: what interrupts the process now ends it without a word."""
    for name in ("SIGINT", "SIGTERM", "SIGHUP"):
        number = getattr(signal, name, None)
        if number is not None and signal.getsignal(number) is not signal.SIG_IGN:
            signal.signal(number, signal.SIG_DFL)


def interrupted_status() -> int:
    """The exit status of a command that a signal ended: 130 after Ctrl-C, 143 after a kill."""
    return 128 + (_received[0] if _received else int(signal.SIGINT))


def told(text: str, stream: IO[str] | None) -> None:
    """Write a line; a reader that has gone, or a full disk, is no reason to fail again."""
    try:
        print(text, file=stream, flush=True)
    except OSError:
        if stream is not None:
            silence(stream)


def silence(stream: IO[str]) -> None:
    """Nothing more goes out there; what waits to be written is dropped without a complaint."""
    with suppress(OSError, ValueError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, stream.fileno())
        os.close(nowhere)


def _fill_gaps() -> None:
    """Standard streams that were closed: else the next file opened would take their place."""
    while (descriptor := os.open(os.devnull, os.O_RDWR)) <= 2:
        os.set_inheritable(descriptor, True)
    os.close(descriptor)
    if sys.stdout is None:
        sys.stdout = open(1, "w", encoding="utf-8", closefd=False)  # noqa: SIM115
    if sys.stderr is None:
        sys.stderr = open(2, "w", encoding="utf-8", closefd=False)  # noqa: SIM115


def prepare_letters() -> None:
    """Make known what stands for letters that an encoding lacks."""
    codecs.register_error(_FOR_READERS, _plainly)
    codecs.register_error(_FOR_PROGRAMS, _escaped)


def _take_every_letter(as_json: bool) -> None:
    prepare_letters()
    for stream, handler in (
        (sys.stdout, _FOR_PROGRAMS if as_json else _FOR_READERS),
        (sys.stderr, _FOR_READERS),
    ):
        with suppress(AttributeError, OSError, ValueError):  # not a stream of Python's own
            stream.reconfigure(errors=handler)  # type: ignore[union-attr]


def _plainly(error: UnicodeError) -> tuple[str | bytes, int]:
    """Letters that the terminal lacks in letters that it has: ``→`` as ``->``, ``10⁻²`` as 10^-2.

    Bytes of a file's name that are no text are given back as they were.
    """
    assert isinstance(error, UnicodeEncodeError)
    text = error.object[error.start : error.end]
    if 0xDC80 <= ord(text[0]) <= 0xDCFF:
        return bytes([ord(text[0]) - 0xDC00]), error.start + 1
    letter = text[0]
    plain = PLAIN.get(letter)
    if plain is None:
        parts = unicodedata.normalize("NFKD", letter)
        plain = "".join(PLAIN.get(c, c) for c in parts)
        plain = plain.encode("ascii", "ignore").decode() or _greek(letter)
        before = error.object[error.start - 1 : error.start]
        if _is_raised(letter) and not _is_raised(before):
            plain = f"^{plain}"
    return plain, error.start + 1


def _greek(letter: str) -> str:
    """The name of a Greek letter, a question mark for any other.

    >>> _greek("Δ"), _greek("σ"), _greek("龍")
    ('Delta', 'sigma', '?')
    """
    kind, _, name = unicodedata.name(letter, "").rpartition(" LETTER ")
    if not kind.startswith("GREEK") or not name.isalpha():
        return "?"
    return name.capitalize() if kind.endswith("CAPITAL") else name.lower()


def _is_raised(letter: str) -> bool:
    return letter != "" and unicodedata.decomposition(letter).startswith("<super>")


def _escaped(error: UnicodeError) -> tuple[str | bytes, int]:
    """The same, such that JSON stays JSON and gives the letters back."""
    assert isinstance(error, UnicodeEncodeError)
    pairs = error.object[error.start].encode("utf-16-be", "surrogatepass").hex()
    words = [pairs[n : n + 4] for n in range(0, len(pairs), 4)]
    return "".join(f"\\u{word}" for word in words), error.start + 1


def _end_tidily() -> None:
    """Signals by which a shell, a batch system or a closed terminal ends a command."""
    for name in ("SIGTERM", "SIGHUP"):
        number = getattr(signal, name, None)
        # Whoever ignores one (nohup) or has a way of his own keeps it.
        if number is not None and signal.getsignal(number) is signal.SIG_DFL:
            signal.signal(number, _stop)


def _stop(number: int, frame: FrameType | None) -> None:
    # The second time is for those who cannot wait: the next command tidies up.
    _received.append(number)
    signal.signal(number, signal.SIG_DFL)
    raise Stopped
