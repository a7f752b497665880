"""Files damaged byte by byte, tables of readings row by row, and names that lead elsewhere."""

from __future__ import annotations

import gzip
import random

from damage_values import HOSTILE_TEXTS, NUMBERS

LINKS = ("out.csv", "loop.csv", "zero.csv", "pipe.csv", "folder.csv", "locked.csv", "socket.csv")
"""Made beside each case: links out of the folder, round in circles, to a device; a pipe, …"""

PATHS = (
    "../sentinel/secret.csv", "../../etc/passwd", "/etc/passwd", "/dev/zero", "/dev/stdin",
    "/proc/self/environ", "readings/../../sentinel/secret.csv", ".", "..", "", "readings",
    "case.toml", "nothing.csv", "~/x.csv", "$HOME/x.csv", "C:\\x.csv", "\\\\host\\x.csv",
    "file:///etc/passwd", "http://127.0.0.1:9/x.csv", "x\x00.csv", "x" * 290, "a/" * 140 + "x",
    "./" * 100 + "nothing.csv", "|touch CANARY", "readings/*.csv", "readings/\u202evsc.x", *LINKS,
)  # fmt: skip
"""Names given for files of readings."""


def bytes_damaged(text: str, chance: random.Random) -> tuple[str, bytes]:
    """A text file cut off, flipped, recoded, filled."""
    plain = text.encode()
    place = chance.randrange(len(plain) or 1)
    way = chance.randrange(14)
    if way == 0:
        return f"cut at byte {place}", plain[:place]
    if way == 1:
        spoilt = bytearray(plain)
        for _ in range(chance.randint(1, 6)):
            spoilt[chance.randrange(len(spoilt))] = chance.randrange(256)
        return "bytes flipped", bytes(spoilt)
    if way == 2:
        return "UTF-16", text.encode(chance.choice(["utf-16", "utf-16-le", "utf-16-be", "utf-32"]))
    if way == 3:
        return "a mark of byte order", chance.choice(
            [b"", b"\xef\xbb\xbf"]
        ) + b"\xef\xbb\xbf" + plain
    if way == 4:
        return f"a zero byte at {place}", plain[:place] + b"\0" + plain[place:]
    if way == 5:
        ends = chance.choice([b"\r\n", b"\r", b"\n\r", b"\x0b", b"\xe2\x80\xa8", b"\x85"])
        return f"line ends {ends!r}", plain.replace(b"\n", ends)
    if way == 6:
        return "Latin-1", (text.replace("e", "\xe9", 3)).encode("latin-1", "replace")
    if way == 7:
        return "compressed", gzip.compress(plain, mtime=0)
    if way == 8:
        return "random bytes", chance.randbytes(chance.randint(1, 400))
    if way == 9:
        lines = text.splitlines(keepends=True)
        chance.shuffle(lines)
        return "lines shuffled", "".join(lines).encode()
    if way == 10:
        cut = chance.randint(1, 40)
        return f"{cut} bytes missing at {place}", plain[:place] + plain[place + cut :]
    if way == 11:
        wild = chance.choice(HOSTILE_TEXTS).encode("utf-8", "replace")
        return f"{wild!r:.40} at {place}", plain[:place] + wild + plain[place:]
    if way == 12:
        return "twice over", plain + plain
    cut = text.replace('"', chance.choice(["'", "", "\u201c", '""', '"""']))
    return "quotes exchanged", cut.encode()


def readings_damaged(text: str, chance: random.Random) -> tuple[str, bytes]:
    """A table of readings spoilt: rows, columns, numbers, times, marks between the columns."""
    lines = text.splitlines()
    data = [n for n, line in enumerate(lines) if line[:1].isdigit()] or [0]
    mark = "\t" if "\t" in text else ","
    n = chance.choice(data)
    cells = lines[n].split(mark)
    way = chance.randrange(16)
    what = f"line {n + 1}: "
    if way == 0:
        cells[chance.randrange(len(cells))] = chance.choice(NUMBERS)
        what += "a number spoilt"
    elif way == 1:
        cells[chance.randrange(len(cells))] = chance.choice(HOSTILE_TEXTS).replace("\n", " ")
        what += "a text in a cell"
    elif way == 2:
        cells = cells[:-1]
        what += "a cell missing"
    elif way == 3:
        cells = [*cells, *cells] * chance.choice([1, 500])
        what += f"{len(cells)} cells"
    elif way == 4:
        cells[0] = "-" + cells[0]
        what += "a time below zero"
    elif way == 5:
        cells[-1] = "-" + cells[-1]
        what += "a reading below zero"
    elif way == 6:
        cells = [chance.choice([";", "|", " ", "\t"]).join(cells)]
        what += "another mark between columns"
    lines[n] = mark.join(cells)
    if way == 7:
        lines[n:n] = [lines[n]] * chance.choice([1, 3])
        what += "repeated"
    elif way == 8:
        return "empty", chance.choice([b"", b"\n\n", b"# nothing\n", b"\xef\xbb\xbf"])
    elif way == 9:
        return "heading alone", "\n".join(lines[: data[0]]).encode() + b"\n"
    elif way == 10:
        lines = [*lines[: data[0]], *lines[data[0] :][::-1]]
        what = "time backwards"
    elif way == 11:
        lines = [*lines[: data[0]], *[f"{i}{mark}600" for i in range(9)]]
        what = "all readings equal"
    elif way == 12:
        return "one reading", "\n".join(lines[: data[0] + 1]).encode()
    elif way == 13:
        return "decimal commas", "\n".join(lines).replace(".", ",").encode()
    elif way == 14:
        lines[0] = chance.choice(HOSTILE_TEXTS).replace("\n", " ") + mark + lines[0]
        what = "a hostile first line"
    elif way == 15:
        return bytes_damaged(text, chance)
    return what, "\n".join(lines).encode("utf-8", "replace") + b"\n"
