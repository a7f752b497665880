"""Damaged inputs: each refused with file and key, or still valid; never more than that happens.

The thousands are tried with `pytest -m slow`; what came of them is printed with `-s`.
"""

from __future__ import annotations

import sys
from typing import Literal

import pytest
from attacked import ALL_COMMANDS, Place, Tally, attack, lay_out, prepared, said, watching
from damage import KINDS, Damage, damages, readings, shipped
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

pytestmark = pytest.mark.skipif(sys.platform == "win32", reason="pipes and links of its own kind")


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Place:
    return prepared(tmp_path_factory.mktemp("attack") / "there")


def test_a_few_hundred_damaged_inputs_are_refused_or_valid(place: Place) -> None:
    """Every kind of damage many times over; nothing is computed with those that stay valid."""
    tally = Tally()
    for damage in damages(seed=2026, count=120):
        attack(damage, place, tally, commands=())
    assert not tally.faults, "\n".join(tally.faults)
    assert tally.tried == tally.refused + tally.valid == 120
    # Damage that leaves most cases whole would test little, and so would one that leaves none.
    assert 50 < tally.refused < 110
    kinds = {kind.rpartition(" ")[0].replace("_", " ") for kind in tally.by_kind}
    assert kinds == {kind.replace("_", " ") for kind in KINDS}


@pytest.mark.slow
def test_thousands_of_damaged_inputs(place: Place, size: Literal["small", "full"]) -> None:
    """What stays valid is carried out by one of the commands: no code run, no stray file."""
    tally = Tally()
    count, commands = (2500, ALL_COMMANDS) if size == "full" else (24, ("run", "ceiling"))
    for damage in damages(seed=1, count=count):
        attack(damage, place, tally, commands)
    print(f"\n{tally}")
    assert not tally.faults, "\n".join(tally.faults)
    assert tally.tried == count
    assert tally.refused + tally.valid == count


PIECES = st.sampled_from(
    ['"', "'", "[", "]", "[[", "{", "}", "=", ",", ".", "\\", "#", "\n", "\r", "\0", "\ufeff",
     "\u202e", "1e999", "-", "nan", '"""', "\\u0000", "é", "\U0001f9ea", " -> ", "M", "%", "{0}"]
)  # fmt: skip
CUT = st.tuples(st.floats(0, 1), st.integers(0, 30), PIECES)


@given(name=st.sampled_from(sorted(shipped())), cuts=st.lists(CUT, min_size=1, max_size=3))
@settings(
    max_examples=20,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
def test_any_pieces_in_any_shipped_case(
    place: Place, name: str, cuts: list[tuple[float, int, str]]
) -> None:
    text = shipped()[name]
    for where, length, piece in cuts:
        at = int(where * len(text))
        text = text[:at] + piece + text[at + length :]
    plain = {file: content.encode() for file, content in readings().items()}
    tally = Tally()
    attack(Damage(name, "pieces", str(cuts), text.encode(), plain), place, tally, commands=())
    assert not tally.faults, "\n".join(tally.faults)


def test_the_shipped_cases_are_valid_before_they_are_damaged(place: Place) -> None:
    plain = {file: content.encode() for file, content in readings().items()}
    for name, text in shipped().items():
        lay_out(Damage(name, "none", "", text.encode(), plain), place)
        answer = said(["check", "case.toml", "--json"], place.lab)
        assert answer.status == 0, f"{name}: {answer.out}"


def test_the_watch_sees_what_it_should(place: Place) -> None:
    """An attack that found a way in would be seen: code, a stray file, a secret read."""
    with watching() as events:
        (place.lab / "x").write_text("")
        (place.sentinel / "secret.csv").read_bytes()
        compile("CANARY", "here", "eval")
        (place.lab / "x").unlink()
    seen = {event for event, _ in events}
    assert {"open", "compile", "os.remove"} <= seen
    assert any(str(args[0]).endswith("secret.csv") for event, args in events if event == "open")
