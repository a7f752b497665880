"""Whatever is done to a case file, loading gives an experiment or says what is wrong."""

from __future__ import annotations

import tomllib
from pathlib import Path

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from small_cases import GOOD, LABELS, LAW, PISTON, edited

from meanfree.case import LoadedCase, load_case
from meanfree.case.meaning.reaction import ReactionError, parse_reaction
from meanfree.errors import InputError

COLLISION = edited(GOOD, [(LAW, 'law = "collision"\nEa = "102 kJ/mol"\nA_over_Z = 0.1\n')])
GIVEN = edited(GOOD, [(LAW, LAW + 'reverse = { Kp = "0.12 bar", at = "480 K" }\n')])
PIECES = st.sampled_from(
    ['"', "[", "]", "{", "}", "=", ",", ".", "-", "+", "M", "NO", "A", "0", "1e9", '"480 K"', "nan",
     "inf", "true", '"balance"', "[]", "{}", "\n", "\\", "#", "1979-05-27", "\u00e9", "\u0000"]
)  # fmt: skip
BASES = st.sampled_from([GOOD, PISTON, LABELS, COLLISION, GIVEN])


def outcome(path: Path, text: str) -> LoadedCase | InputError:
    path.write_text(text, encoding="utf-8", newline="")
    try:
        return load_case(path)
    except InputError as error:
        return error


def holds(found: LoadedCase | InputError) -> None:
    if isinstance(found, LoadedCase):
        assert sum(found.experiment.moles.values()) > 0
        assert found.experiment.initial_pressure > 0
        return
    for problem in found.problems:
        assert problem.file
        assert problem.found
        assert problem.expected
        assert len(str(problem)) < 3000


SETTINGS = settings(
    max_examples=150,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)


@given(
    base=BASES, edits=st.lists(st.tuples(st.floats(0, 1), st.integers(0, 12), PIECES), max_size=4)
)
@SETTINGS
def test_a_case_with_pieces_exchanged(
    tmp_path: Path, base: str, edits: list[tuple[float, int, str]]
) -> None:
    text = base
    for where, length, piece in edits:
        place = int(where * len(text))
        text = text[:place] + piece + text[place + length :]
    holds(outcome(tmp_path / "case.toml", text))


VALUES = st.sampled_from(
    ["3", "-3", "0", "1e400", "nan", '""', '"x"', '"480 K"', '"1 torr"', "[]", "{}", "[[]]", "true",
     '["0 s"]', '{ a = 1 }', "12:00:00", "9" * 40, '"-1e9 K"', '"\\u0000"', '"1 1/s"', '"A -> B"']
)  # fmt: skip


@given(base=BASES, where=st.floats(0, 1), value=VALUES)
@SETTINGS
def test_a_case_with_a_value_exchanged(tmp_path: Path, base: str, where: float, value: str) -> None:
    lines = base.splitlines()
    places = [i for i, line in enumerate(lines) if " = " in line]
    place = places[int(where * (len(places) - 1))]
    lines[place] = lines[place].partition(" = ")[0] + " = " + value
    text = "\n".join(lines)
    tomllib.loads(text)  # still TOML: what is wrong is the value
    holds(outcome(tmp_path / "case.toml", text))


WORDS = st.sampled_from(
    ["NO", "Cl2", "2", "0.5", "2NO", "+", "->", "\u2192", "M", "-", "0", "1e3", "(+M)", "e-", "NO+",
     "", "1,3-C4H6", "\u0410", "2 2", "=", "."]
)  # fmt: skip


@given(text=st.lists(WORDS, max_size=9).map(" ".join) | st.text(max_size=20))
@settings(max_examples=400, deadline=None, derandomize=True)
def test_any_text_is_a_reaction_or_refused(text: str) -> None:
    try:
        reaction = parse_reaction(text)
    except ReactionError as error:
        problems = error.problems
    else:
        problems = []
        assert reaction.gases
        assert all(number > 0 for _, number in (*reaction.reactants, *reaction.products))
    assert all(found and expected for found, expected in problems)


@given(address=st.lists(st.sampled_from(
    ["vessel", "volume", "steps", "decomposition", "0", "9", "Ea", "gases", "NOCl", "", "x", "fill"]
), max_size=4).map(".".join), value=VALUES)  # fmt: skip
@SETTINGS
def test_any_setting_is_put_in_or_refused(tmp_path: Path, address: str, value: str) -> None:
    path = tmp_path / "case.toml"
    path.write_text(GOOD, encoding="utf-8")
    try:
        holds(load_case(path, {address: value}))
    except InputError as error:
        holds(error)
