"""The real command on a machine that stops it, fills up, or is set up oddly."""

from __future__ import annotations

import os
import random
import resource
import shutil
import signal
import subprocess
from collections.abc import Mapping
from pathlib import Path

import pytest
from sweeps import CASE, contents
from unlucky import STOPPED, begun, carried_out, ended, hidden, killed, whole_results

ROOT = Path(__file__).parents[2]
RUN = ("run", "case.toml", "--quiet")
EARLIER = (*RUN, "--set", "temperature.value=510 K")
posix_only = pytest.mark.skipif(os.name != "posix", reason="signals, limits and links of POSIX")
pytestmark = posix_only


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Mapping[str, str]]:
    """What the two commands leave where nothing goes wrong."""
    folder = tmp_path_factory.mktemp("calm")
    (folder / "case.toml").write_text(CASE)
    found: dict[str, Mapping[str, str]] = {}
    for name, arguments in (("earlier", EARLIER), ("now", RUN)):
        assert carried_out(folder, arguments)[0] == 0
        found[name] = contents(folder / "outputs" / "case" / "run")
        shutil.copytree(folder / "outputs" / "case" / "run", folder / name)
    assert found["earlier"] != found["now"]
    found["folder"] = {"earlier": str(folder / "earlier")}
    return found


@pytest.fixture
def here(tmp_path: Path, results: dict[str, Mapping[str, str]]) -> Path:
    """A case with earlier results."""
    (tmp_path / "case.toml").write_text(CASE)
    shutil.copytree(results["folder"]["earlier"], tmp_path / "outputs" / "case" / "run")
    return tmp_path


# --- stopped --------------------------------------------------------------------------------


def stopped(here: Path, results: dict[str, Mapping[str, str]], number: signal.Signals,
            chance: random.Random, arguments: tuple[str, ...] = RUN) -> str:  # fmt: skip
    """Stop a run, and hold what is left against what may be; what became of it, in a word."""
    known = (results["earlier"], results["now"])
    target = here / "outputs" / "case" / "run"
    before = hidden(here / "outputs")
    status, _, complaint = killed(here, arguments, number, chance, longest=6.0)
    # what a SIGKILL left between two renames stands aside until the next command puts it back
    assert whole_results(target, known) or (
        (before or number == signal.SIGKILL)
        and whole_results(target.parent / ".run.meanfree" / "old", known)
    )
    if status == 0:
        assert contents(target) == results["now"]
        return "done"
    assert status in (STOPPED[number], -number)
    if status == -number:  # by SIGKILL, or before Python had begun with the command
        return "killed"
    assert complaint == "Interrupted.\n"
    assert set(hidden(here / "outputs")) <= set(before)
    return "stopped"


def test_a_run_that_is_ended_while_it_writes(
    here: Path, results: dict[str, Mapping[str, str]]
) -> None:
    """A batch system's SIGTERM: nothing half-written, and another command finds nothing odd."""

    class WhileWriting(random.Random):
        def random(self) -> float:
            return 0.0

    assert stopped(here, results, signal.SIGTERM, WhileWriting(1)) in ("stopped", "done")


@pytest.mark.slow
def test_runs_stopped_at_random_moments(
    here: Path, results: dict[str, Mapping[str, str]], size: str
) -> None:
    """Every signal, again and again; then left alone: the same bytes as without."""
    chance, counts = random.Random(20261201), dict.fromkeys(("done", "killed", "stopped"), 0)
    earlier = Path(results["folder"]["earlier"])
    for turn in range(4 if size == "small" else 100):
        number = list(STOPPED)[turn % len(STOPPED)]
        counts[stopped(here, results, number, chance)] += 1
        if chance.random() < 0.3:
            shutil.rmtree(here / "outputs")
            shutil.copytree(earlier, here / "outputs" / "case" / "run")
    print(counts)
    assert counts["killed"] + counts["stopped"] > 0
    assert carried_out(here, RUN)[0] == 0
    assert contents(here / "outputs" / "case" / "run") == results["now"]
    assert hidden(here / "outputs") == []


def shown(folder: Path) -> dict[str, str]:
    """What lies in a folder, without what a SIGKILL left aside."""
    return {name: text for name, text in contents(folder).items() if ".meanfree/" not in name}


LONG = {
    "fit": ("fit", "dimer-runs.toml", "--quiet", "--write", "fitted.toml", "--replace"),
    "window": ("window", "nocl-bulb.toml", "--quiet"),
    "schedule": ("schedule", "nocl-bulb.toml", "--samples", "4", "--quiet"),
    "size": ("size", "nocl-bulb.toml", "--conversion", "0.25", "--quiet"),
}


@pytest.mark.slow
@pytest.mark.parametrize("name", LONG)
def test_other_commands_stopped_at_random_moments(tmp_path: Path, name: str, size: str) -> None:
    if size == "small":
        pytest.skip("in the full size")
    shutil.copytree(ROOT / "cases", tmp_path, dirs_exist_ok=True)
    arguments, chance = LONG[name], random.Random(name)
    assert carried_out(tmp_path, arguments)[0] == 0
    calm = contents(tmp_path / "outputs")
    fitted = (tmp_path / "fitted.toml").read_text() if name == "fit" else ""
    for turn in range(12):
        number = list(STOPPED)[turn % len(STOPPED)]
        status, _, complaint = killed(tmp_path, arguments, number, chance, longest=12.0)
        assert status in (0, STOPPED[number], -number), complaint
        if status == STOPPED[number] and number != signal.SIGKILL:
            assert complaint == "Interrupted.\n"
            assert shown(tmp_path / "outputs") == calm
        if name == "fit":
            assert (tmp_path / "fitted.toml").read_text() == fitted
    assert carried_out(tmp_path, arguments)[0] == 0
    assert contents(tmp_path / "outputs") == calm
    assert hidden(tmp_path / "outputs") == []


SWEEP = (
    *("sweep", "case.toml", "--quiet", "--workers", "2", "--samples", "2048"),
    *("--vary", "steps.two.k=1 L/mol/s..4 L/mol/s", "--observe", "conversion of A"),
)  # fmt: skip


@pytest.mark.slow
def test_ctrl_c_reaches_all_processes_of_a_sweep(tmp_path: Path, size: str) -> None:
    """A terminal sends Ctrl-C to the workers too, also while they are starting: no tracebacks."""
    (tmp_path / "case.toml").write_text(CASE)
    chance = random.Random(7)
    for _ in range(1 if size == "small" else 20):
        sweep = begun(tmp_path, SWEEP)
        growing = tmp_path / "outputs" / "case" / "sweep.unfinished"
        while not growing.exists() and sweep.poll() is None:
            pass
        with pytest.raises(subprocess.TimeoutExpired):
            sweep.wait(chance.uniform(0.0, 1.0))
        os.killpg(sweep.pid, signal.SIGINT)
        status, _, complaint = ended(sweep)
        if status == -signal.SIGINT:  # it was done, and on its way out
            assert complaint == ""
            continue
        assert status == 130
        lines = complaint.splitlines()
        assert lines[-1] == "Interrupted."
        assert len(lines) <= 2
        assert hidden(tmp_path / "outputs") == []


# --- full, elsewhere, at once ---------------------------------------------------------------


@pytest.mark.slow
def test_a_disk_that_fills_up(here: Path, results: dict[str, Mapping[str, str]], size: str) -> None:
    """No file may grow beyond so many bytes, which a program sees as a full disk."""
    for limit in (20_000,) if size == "small" else (0, 10, 1000, 20_000, 100_000):
        status, printed, complaint = carried_out(
            here,
            RUN,
            before=lambda limit=limit: resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit)),
        )
        assert (status, printed) == (1, "")
        assert complaint.startswith("There is no room left for ")
        assert complaint.count("\n") == 1
        assert contents(here / "outputs" / "case" / "run") == results["earlier"]
        assert hidden(here / "outputs") == []


@pytest.mark.slow
def test_several_runs_into_one_folder(
    here: Path, results: dict[str, Mapping[str, str]], size: str
) -> None:
    for _ in range(1 if size == "small" else 5):
        runs = [begun(here, RUN) for _ in range(2 if size == "small" else 4)]
        assert {ended(each)[0] for each in runs} == {0}
        assert contents(here / "outputs" / "case" / "run") == results["now"]
        assert hidden(here / "outputs") == []


@pytest.mark.slow
def test_the_folder_goes_meanwhile(
    here: Path, results: dict[str, Mapping[str, str]], size: str
) -> None:
    """The results of before are removed, or a file put in their place, while the run goes on."""
    target = here / "outputs" / "case" / "run"
    run = begun(here, RUN)
    shutil.rmtree(here / "outputs")
    assert ended(run)[0] == 0
    assert contents(target) == results["now"]
    if size == "small":
        return
    run = begun(here, RUN)
    while run.poll() is None and not hidden(here / "outputs"):
        pass
    shutil.rmtree(target, ignore_errors=True)
    target.touch()
    status, _, complaint = ended(run)
    assert status in (0, 2)
    if status == 2:
        assert complaint.startswith("1 problem\n  --out\n")
        assert target.read_bytes() == b""


@pytest.mark.slow
@pytest.mark.parametrize("oddness", ["settings", "limits", "no JIT"])
def test_odd_surroundings_change_no_byte(
    here: Path, results: dict[str, Mapping[str, str]], oddness: str, size: str
) -> None:
    """A reader's own settings of figures, no home, other hashes, few files, one thread."""
    if size == "small" and oddness != "settings":
        pytest.skip("in the full size")
    (here / "matplotlibrc").write_text(
        "backend: TkAgg\nlines.linewidth: 40\ntext.usetex: True\nsavefig.bbox: tight\n"
        'svg.fonttype: none\naxes.prop_cycle: cycler("color", ["r"])\n'
    )
    changes: dict[str, str | None] = {
        "settings": {
            "MATPLOTLIBRC": str(here), "MPLBACKEND": "no such", "DISPLAY": None, "HOME": None,
            "PYTHONHASHSEED": "4", "LC_ALL": "de_DE.UTF-8", "LANG": "de_DE", "TERM": "dumb",
            "NO_COLOR": "1", "COLUMNS": "20", "XDG_CACHE_HOME": "elsewhere", "TZ": "Asia/Tokyo",
        },
        "limits": {
            "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1", "TMPDIR": "/no/such/folder",
            "HOME": "/proc/nowhere", "PYTHONHASHSEED": "0",
        },
        "no JIT": {"NUMBA_DISABLE_JIT": "1", "PYTHONHASHSEED": "77"},
    }[oddness]  # fmt: skip

    def few_files() -> None:
        if oddness == "limits":
            resource.setrlimit(resource.RLIMIT_NOFILE, (64, 64))

    status, _, complaint = carried_out(here, RUN, before=few_files, **changes)
    assert status == 0, complaint
    assert contents(here / "outputs" / "case" / "run") == results["now"]


@pytest.mark.slow
def test_little_memory_is_said(
    here: Path, results: dict[str, Mapping[str, str]], size: str
) -> None:
    """Down to where Python itself cannot begin: never half a result."""
    known = (results["earlier"], results["now"])
    for megabytes in (400,) if size == "small" else (150, 250, 300, 400, 500, 700, 1000):
        most = megabytes * 2**20
        carried_out(
            here,
            RUN,
            before=lambda most=most: resource.setrlimit(resource.RLIMIT_AS, (most, most)),
        )
        assert whole_results(here / "outputs" / "case" / "run", known)
        assert hidden(here / "outputs") == []
