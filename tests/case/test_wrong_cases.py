"""Wrong cases, each with its whole messages; and files that are no case at all."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest
from small_cases import BASES, GOOD, edited, load_text

from meanfree.case import load_case
from meanfree.case.text import LARGEST
from meanfree.errors import InputError

WRONG: list[dict[str, Any]] = tomllib.loads(
    (Path(__file__).parent / "wrong_cases.toml").read_text(encoding="utf-8")
)["case"]


def said(error: InputError, path: Path) -> list[str]:
    """Every message, each of which must begin with the file."""
    messages = str(error).splitlines()
    assert all(message.startswith(f"{path}: ") for message in messages)
    return [message.removeprefix(f"{path}: ") for message in messages]


@pytest.mark.parametrize("case", WRONG, ids=[case["name"] for case in WRONG])
def test_a_wrong_case_says_everything_that_is_wrong(case: dict[str, Any], tmp_path: Path) -> None:
    text = edited(BASES[case["base"]], case["edits"])
    with pytest.raises(InputError) as caught:
        load_text(tmp_path, text)
    assert said(caught.value, tmp_path / "case.toml") == case["problems"]
    assert [path.name for path in tmp_path.iterdir()] == ["case.toml"]


def test_all_problems_come_in_one_go(tmp_path: Path) -> None:
    """Edits that do not touch each other: together they give what each gives alone."""
    names = [
        "comma in a number",
        "bare number",
        "gauge pressure",
        "unbalanced step",
        "until nonsense",
        "step name with a dot",
    ]
    chosen = [case for case in WRONG if case["name"] in names]
    assert len(chosen) == len(names)
    text = edited(GOOD, [edit for case in chosen for edit in case["edits"]])
    with pytest.raises(InputError) as caught:
        load_text(tmp_path, text)
    alone = {problem for case in chosen for problem in case["problems"]}
    # The step has lost its name, so that its other problems go by its place in the file.
    expected = {message.replace("steps.decomposition.", "steps.0.") for message in alone}
    assert set(said(caught.value, tmp_path / "case.toml")) == expected


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "title: found nothing; expected title = \u2026, a title in one line"),
        (
            b'title = "\xff"',
            "found bytes on line 1 that are not UTF-8; expected a text file in UTF-8",
        ),
        (
            b"# " + b"x" * LARGEST,
            "found a file larger than 1 MiB; expected a case file of at most 1 MiB",
        ),
        (
            b"a = " + b"[" * 100_000,
            "found tables or lists nested too deeply to read; "
            "expected a case file in TOML 1.0 (texts stand in quotes)",
        ),
        (
            b"a = " + b"9" * 5000,
            "found a number with thousands of digits; expected numbers that a person could read",
        ),
        (
            b"title = 'a'\ntitle = 'b'\n",
            "found what is not TOML: Cannot overwrite a value (at line 2, column 12); "
            "expected a case file in TOML 1.0 (texts stand in quotes)",
        ),
    ],
    ids=["empty", "not UTF-8", "too large", "deep nesting", "5,000 digits", "a key twice"],
)
def test_a_file_that_is_no_case(content: bytes, message: str, tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_bytes(content)
    with pytest.raises(InputError) as caught:
        load_case(path)
    assert said(caught.value, path)[0] == message


def test_a_path_that_is_no_file(tmp_path: Path) -> None:
    (tmp_path / "bulb.toml").write_text(GOOD)
    names = {
        "": "found a folder; expected the name of a case file, such as bulb.toml",
        "bulb.tml": "found no such file; expected the name of a case file"
        ' (did you mean "bulb.toml"?)',
        "else/where": "found no such file; expected the name of a case file",
    }
    for name, message in names.items():
        path = tmp_path / name
        with pytest.raises(InputError) as caught:
            load_case(path)
        assert said(caught.value, path) == [message]


def test_a_name_that_no_file_can_have() -> None:
    with pytest.raises(InputError) as caught:
        load_case("bulb\0.toml")
    (problem,) = caught.value.problems
    assert problem.found == "a name that cannot be printed"
    assert problem.expected == "a name in plain letters, such as bulb.toml"


@pytest.mark.parametrize(
    ("settings", "message"),
    [
        (
            {"temperature.value": "500"},
            'temperature.value: found "500", which has no unit (from --set); '
            'expected a temperature such as "480 K"',
        ),
        (
            {"steps.decomp.Ea": "100 kJ/mol"},
            "--set: found steps.decomp, which is not in the case; expected one of decomposition"
            ' (did you mean "decomposition"?)',
        ),
        (
            {"steps.7.Ea": "100 kJ/mol"},
            "--set: found steps.7, which is not in the case; expected one of decomposition",
        ),
        (
            {"temperature.value.x": "3"},
            '--set: found "temperature.value.x"; '
            "expected temperature.value itself, which is a value",
        ),
        (
            {"vessel..volume": "3 L"},
            '--set: found "vessel..volume"; expected an address such as temperature.value',
        ),
        (
            {"vessel.volme": "3 L"},
            "vessel.volme: found an unknown key (from --set); expected one of holds, volume, "
            "pressure, rated_pressure, gauge_resolution, shape, dead_space "
            '(did you mean "volume"?)',
        ),
    ],
)
def test_a_wrong_setting(settings: dict[str, str], message: str, tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        load_text(tmp_path, GOOD, settings)
    assert said(caught.value, tmp_path / "case.toml") == [message]
