"""What careless and hostile people write in place of a value: texts, numbers, quantities, names."""

from __future__ import annotations

import random
import re
from typing import Any

CANARY = "CANARY"
"""What code hidden in a text would leave behind: a file of that name, or an attribute."""

HOSTILE_TEXTS = (
    "{0.__class__.__init__.__globals__}", "%s%s%s%n", "{title!r:>99999999}", f"$(touch {CANARY})",
    f"`touch {CANARY}`", f"; touch {CANARY} #", f"__import__('os').system('touch {CANARY}')",
    f"=cmd|' /C touch {CANARY}'!A1", "@SUM(1+1)*cmd|' /C calc'!A0",
    '=HYPERLINK("http://127.0.0.1/x","y")', "+1+1", "-2+3", "{{ 7*7 }}",
    "{% raw %}{{ config }}{% endraw %}", "${7*7}", "\\input{/etc/passwd}",
    "\\write18{touch CANARY}$\\frac{1}{0}$", "$\\undefined_{$",
    f"<script>document.title='{CANARY}'</script>",
    f"\"><img src=x onerror=document.title='{CANARY}'>", "</title></style><svg onload=alert(1)>",
    "<!--", "-->", "]]>", "</svg>", "&lt;b&gt;&#x26;", "<b>bold</b>", "\x1b[2J\x1b]0;CANARY\x07",
    "\x9b31m", "\x08\x08\x08", "\x7f", "a\nb\nc", "a\rb", "tab\there",
    "\x0b\x0c\x1c\x85\u2028\u2029", "http://127.0.0.1:9/CANARY", "file:///etc/passwd",
    "//127.0.0.1/share", "../../../../etc/passwd", "/dev/zero", "~", "NUL", "con.csv",
    "\u202edlroW", "a\u200bb", "a\ufeffb", "\U000e0041", "\ufffd\uffff", "e\u0301" * 40,
    "\u0391rgon", "\U0001f9ea", "\u05d0\u05d1", "\u0661\u0662", "", " ", "\u3000", "-", ".", "'",
    '"', "\\", "#", "]", "}", "=", "[x]", "None", "null", "true", "nan", "0", "pickle\x80\x04.",
    "!!python/object/apply:os.system ['touch CANARY']", "x" * 301, "x" * 2001, "<" * 300,
    "steps.decomposition.A", "__class__", "__proto__",
)  # fmt: skip
"""Each is tried in every place where a case may hold a text."""

WRONG_KINDS: tuple[Any, ...] = (
    0, 1, -1, 3, 10**40, 1.5, -0.0, 1e308, 5e-324, float("nan"), float("inf"), float("-inf"),
    True, False, [], {}, [[]], [[[]]], {"a": 1}, ["x"], [1, "x", {}], "", "x", [None] * 0,
    {"": ""}, {"value": "480 K"}, ["480 K"], [["0 s", "296 K"]], "480 K", "1 torr", "1 1/s",
)  # fmt: skip
"""Values of another kind than the one that belongs there."""

UNITS = (
    "", "K", "s", "torr", "L", "J/mol", "kJ", "1/s", "L/mol/s", "cm^3/s", "mol", "m", "psig", "%",
    "degC", "degree", "C", "F", "furlong", "\u212a", "to\u0433r", "TORR", "Torr ", "torr torr",
    "torr^9", "torr^-99", "torr/torr", "torr^1e3", "**", "*", "/", "(", "s)", "1/torr/min", "ppm",
    "count", "byte", "dB", "\u00b5\u03bc", "K K", "mol/mol", "L/mol/s/s", "cm\u00b3\u2070\u207b",
    "eV", "delta_degC",
)  # fmt: skip

NUMBERS = (
    "0", "-0", "-1", "1e-400", "1e400", "1e308", "1e300", "-1e300", "1e-300", "5e-324", "1e30",
    "1e-30", "nan", "inf", "-inf", "1,5", "1.234,5", "1,234.5", "1 234", "1_000", "1'000", "0x10",
    "1e", "e5", "1.5.2", "..5", "+-3", "\u0661\u0662", "\uff11", "\u00bd", "1\u00a0000",
    "\u22121", "1/2", "1**9", "10**10**10", "1+1", "1j", "1e+", "--5", "9" * 90, "9" * 200,
    "0." + "0" * 90 + "1", "five", "", "\u2159", "1\u200b5", "(5)",
)  # fmt: skip

GAS_NAMES = (
    "N\u041eCl", "\u0410r", "Ar\u200b", "\u200eAr", "A\u202er", "NOCl\u2060", "N\u00adOCl",
    "\uff21\uff52", "H\u2082", "Cl\u2082", "M", "hv", "total", "balance", "others", "", " ",
    "Ar ", " Ar", "2Ar", "A r", "Ar+Ar", "A.r", "ar", "AR", "NO C l", "N0Cl", "NOCI", "e-", "Ar+",
    "Xx", "__class__", "<b>", "=A", "A" * 61, "A" * 5000, "->", "M M", "H2O2H2O", "((((",
    "C" * 50, "C99999999999", "(((C)2)2)2", "1", "-", "NOCl;x", "{0}", "%s", "Ar\n", "A\x00r",
    "A\x1b[31mr", "\u00c5r", "label", "T", "t", "V", "p", "c_Ar", "x'y", 'q"q', "a`b", "$x$",
    "\\alpha", "D2O", "NO3", "HO", "lambda", "import", "pi", "I", "E", "S", "N",
)  # fmt: skip

_QUANTITY = re.compile(r"([+-]?[0-9.]+(?:[eE][+-]?[0-9]+)?)(\s*)(\S.*)?")


def quantity(text: str, chance: random.Random) -> str:
    """A quantity written wrongly, or as another one."""
    found = _QUANTITY.fullmatch(text)
    if found is None:
        return chance.choice(HOSTILE_TEXTS)
    number, space, unit = found[1], found[2], found[3] or ""
    way = chance.randrange(8)
    if way <= 1:
        return f"{chance.choice(NUMBERS)}{space}{unit}"
    if way == 2:
        return f"{number}{space}{chance.choice(UNITS)}"
    if way == 3:
        return f"{number}{chance.choice(['', '  ', chr(160), chr(9), ' * ', '(', ' in '])}{unit}"
    if way == 4:
        power = chance.choice([-300, -30, -12, -6, -3, 3, 6, 12, 30, 300])
        return f"{number}e{power}{space}{unit}" if "e" not in number.lower() else f"-{text}"
    if way == 5:
        return f"{number.replace('.', ',')}{space}{unit}"
    if way == 6:
        return f"{text}{chance.choice(['?', ' +- 3', ' # x', ';', ' ' + unit, chr(0), ' (abs)'])}"
    return f"{chance.choice(['-', '<', '~', '> ', 'ca. ', '$', '='])}{text}"
