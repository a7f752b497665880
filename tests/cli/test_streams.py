"""What every command does with its streams: any encoding, none at all, a reader that has gone."""

from __future__ import annotations

import json
import os
import subprocess
from pathlib import Path

import pytest
from sweeps import CASE
from unlucky import COMMAND, begun, environment

from meanfree.cli import process

pytestmark = pytest.mark.skipif(os.name != "posix", reason="a shell, and signals of POSIX")


@pytest.mark.parametrize(
    ("encoding", "text", "plain"),
    [
        ("ascii", "2 A ⇌ B → C₂", "2 A <=> B -> C2"),
        ("ascii", "10⁻²³ m³, σ = 3 Å², Δ°", "10^-23 m^3, sigma = 3 angstrom^2, Deltadeg "),
        ("ascii", "Übung “x” … 龍", 'Ubung "x" ... ?'),
        ("latin-1", "10⁻² m³ ±1 Å", "10^-\xb2 m\xb3 \xb11 \xc5"),
        ("cp1252", "ΔH − 5 µm · x", "DeltaH - 5 \xb5m \xb7 x"),
        ("utf-8", "→ ₂ 龍", "→ ₂ 龍"),
    ],
)
def test_letters_that_a_terminal_lacks(encoding: str, text: str, plain: str) -> None:
    process.prepare_letters()
    assert text.encode(encoding, "meanfree-plain").decode(encoding) == plain
    # for programs: JSON gives the same letters back
    quoted = f'"{text}"'.replace("“", "'").replace("”", "'")
    there = quoted.encode(encoding, "meanfree-escaped").decode(encoding)
    assert json.loads(there) == quoted[1:-1]


def test_a_name_that_is_no_text_comes_out_as_it_is() -> None:
    process.prepare_letters()
    assert os.fsdecode(b"a\xff\xfe.toml").encode("utf-8", "meanfree-plain") == b"a\xff\xfe.toml"
    assert "\U0001d54f".encode("ascii", "meanfree-escaped") == b"\\ud835\\udd4f"


@pytest.mark.parametrize("encoding", ["cp1252", "ascii"])
def test_output_in_another_encoding(tmp_path: Path, encoding: str) -> None:
    """As on a console of Windows, or where a program reads what was printed as plain ASCII."""
    (tmp_path / "case.toml").write_text(CASE)
    odd = {"PYTHONIOENCODING": encoding, "LC_ALL": "C.UTF-8", "PYTHONUTF8": "0"}
    begun_here = begun(tmp_path, ("check", "case.toml", "--json"), TERM="dumb", **odd)
    printed, complaint = begun_here.communicate()
    assert (begun_here.returncode, complaint) == (0, b"")
    assert json.loads(printed)["title"] == "Dimerisation"
    begun_here = begun(tmp_path, ("check", "Δ.toml"), **odd)
    _, complaint = begun_here.communicate()
    assert begun_here.returncode == 2
    assert complaint.decode(encoding).startswith("Delta.toml: 1 problem\n")


def shell(folder: Path, line: str, **changes: str | None) -> subprocess.CompletedProcess[str]:
    """A line of a shell in which ``meanfree`` is the command."""
    command = " ".join(f"'{word}'" for word in COMMAND)
    return subprocess.run(
        ["bash", "-c", f"meanfree() {{ {command} \"$@\"; }}; {line}"],
        cwd=folder, env=environment(changes), capture_output=True, text=True, check=False,
    )  # fmt: skip


@pytest.mark.parametrize(
    ("line", "status", "complaint"),
    [
        ("meanfree check case.toml | head -1; exit ${PIPESTATUS[0]}", 0, ""),
        ("meanfree check case.toml >&-", 0, ""),
        ("meanfree check none.toml 2>&-", 2, ""),
        ("meanfree check none.toml 2>/dev/full", 2, ""),
        ("meanfree check case.toml >/dev/full", 1,
         "Not all could be printed: No space left on device. What was left in files is whole.\n"),
        ("mkdir x; cd x; rmdir ../x; meanfree start new", 2,
         "1 problem\n  the file\n    found     a working folder that has been removed\n"
         "    expected  the command given again from a folder that exists\n"),
    ],
)  # fmt: skip
@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs /dev/full")
def test_streams_and_folders_that_are_gone(
    tmp_path: Path, line: str, status: int, complaint: str
) -> None:
    (tmp_path / "case.toml").write_text(CASE)
    done = shell(tmp_path, line)
    assert (done.returncode, done.stderr) == (status, complaint)


def test_nohup_stays_in_force(tmp_path: Path) -> None:
    """A signal that is ignored when the command begins stays ignored."""
    script = "import signal; from meanfree.cli import process; process.prepare(as_json=False); "
    script += "print(signal.getsignal(signal.SIGHUP) is signal.SIG_IGN)"
    done = shell(tmp_path, f"trap '' HUP; '{COMMAND[0]}' -c '{script}'")
    assert done.stdout == "True\n"
