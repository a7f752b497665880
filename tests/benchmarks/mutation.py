"""Would the tests notice? Mutation testing of the rooms whose numbers decide what is right.

``python tests/benchmarks/mutation.py collisions rates --sample 150 --seed 1`` copies the sources
aside, puts one small wrong into a module at a time (`mutants`), runs the fast tests of the room
that run the wrong line, the quickest first, until one fails, and prints the share of wrongs that
were noticed. What was tried already with the same sources (and, where nothing was noticed, the
same tests) is not tried again: a stopped run goes on where it was. Wrongs that change nothing that
could be seen stand with the reason in tests/data/equivalent_mutants.toml and are not counted.
The quickest ``--seconds`` of tests are run against each. The room kernel is run without its
compiler.
"""

from __future__ import annotations

import argparse
import hashlib
import json
import os
import random
import shutil
import sys
import tempfile
import tomllib
from collections import Counter
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "tests" / "support"))

from mutants import Mutant, mutants, mutated  # noqa: E402
from mutation_trials import (  # noqa: E402
    Collected,
    Map,
    WrongModule,
    import_what_is_slow,
    in_fork,
    in_session,
    map_tests,
    try_anew,
)

ROOMS = ("collisions", "rates", "experiment", "equations", "integrate", "kernel")
EQUIVALENT = ROOT / "tests" / "data" / "equivalent_mutants.toml"
NOTICED = ("failed", "took too long")


@dataclass(frozen=True)
class Place:
    """A wrong and the file it is for."""

    file: str
    mutant: Mutant

    @property
    def key(self) -> str:
        """What it is called in the results and in the list of equivalents."""
        return f"{self.file} | {self.mutant.key}"


def main() -> None:
    """Rooms one after the other, each in a process of its own."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("rooms", nargs="*", default=ROOMS)
    parser.add_argument("--sample", type=int, default=150, help="wrongs a room; 0: all")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--seconds", type=float, default=15.0, help="tests against one wrong")
    parser.add_argument("--only", default="", help="modules, such as checks,events; default: all")
    parser.add_argument("--work", type=Path, default=Path(tempfile.gettempdir()) / "mutation")
    options = parser.parse_args()
    options.work = options.work.resolve()
    for room in options.rooms:
        copy = options.work / room
        _copy_sources(copy)
        status = in_fork(partial(_room, room, copy, options), 1e9, options.work / f"{room}.txt")
        print((options.work / f"{room}.txt").read_text(), end="", flush=True)
        if status:
            sys.exit(f"{room}: stopped")


def _copy_sources(copy: Path) -> None:
    copy.mkdir(parents=True, exist_ok=True)
    for name in ("src", "tests", "cases"):
        shutil.rmtree(copy / name, ignore_errors=True)
        shutil.copytree(ROOT / name, copy / name, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("pyproject.toml", "README.md"):
        shutil.copy(ROOT / name, copy)


def _room(room: str, copy: Path, options: Any) -> int:
    """Try the wrongs of one room and print what came of them."""
    os.chdir(copy)
    os.environ["MEANFREE_CACHE"] = str(copy / ".cache")
    sys.path.insert(0, str(copy / "src"))
    import_what_is_slow(without_compiler=room == "kernel")
    tests_hash = _hash(copy / "src" / "meanfree" / room, copy / "tests" / room)
    known = copy / f"map-{tests_hash}.json"
    if not known.exists():
        status = in_fork(partial(map_tests, room, known), 1800.0, copy / "map.txt")
        said = (copy / "map.txt").read_text().splitlines()
        print(*(line for line in said if line.startswith("fails unharmed")), sep="\n")
        if status:
            print(*said[-20:], sep="\n")
            return 1
    room_map = Map(**json.loads(known.read_text()))
    places = _places(copy, room)
    excused = _excused()
    wanted = set(filter(None, options.only.split(",")))
    chosen = [place for place in places if not wanted or Path(place.file).stem in wanted]
    if 0 < options.sample < len(chosen):
        chosen = random.Random(options.seed).sample(chosen, options.sample)
    trials = Trials(copy, room_map, f"{tests_hash}-{options.seconds:g}", options.seconds)
    outcomes = {place.key: "equivalent" for place in chosen if place.key in excused}
    open_places = [place for place in chosen if place.key not in excused]
    anew = [place for place in open_places if trials.must_be_anew(place)]
    changed = [place for place in open_places if not trials.must_be_anew(place)]
    outcomes |= {place.key: trials.outcome(place) for place in anew}

    def try_all(all_tests: Collected) -> None:
        if in_fork(
            partial(all_tests.try_tests, room_map.within(room_map.ordered(), options.seconds)),
            600.0,
            copy / "trial.txt",
        ):
            raise SystemExit(f"tests fail unharmed, see {copy / 'trial.txt'}")
        outcomes.update((place.key, trials.outcome(place, all_tests)) for place in changed)

    in_session(room, try_all)
    _report(room, len(places), outcomes)
    names = {place.key for place in places}
    for key in sorted(excused):
        if key.startswith(f"src/meanfree/{room}/") and key not in names:
            print(f"  no longer there: {key}")
    return 0


def _places(copy: Path, room: str) -> list[Place]:
    found = []
    for path in sorted((copy / "src" / "meanfree" / room).glob("*.py")):
        file = path.relative_to(copy).as_posix()
        found += [Place(file, mutant) for mutant in mutants(path.read_text())]
    return found


class Trials:
    """The trials of one room, with what is known of earlier ones."""

    def __init__(self, copy: Path, room_map: Map, tests_hash: str, seconds: float) -> None:
        self.copy, self.map, self.tests_hash, self.seconds = copy, room_map, tests_hash, seconds
        self.results = copy / "results.jsonl"
        self.earlier = _read(self.results, tests_hash)

    def must_be_anew(self, place: Place) -> bool:
        """True where the wrong is in what runs at import."""
        mutant = place.mutant
        return mutant.at_import or self.map.runs_at_import(place.file, mutant.line, mutant.end_line)

    def outcome(self, place: Place, all_tests: Collected | None = None) -> str:
        """What came of a wrong, now or earlier."""
        source = _hash(self.copy / place.file)
        known = self.earlier.get((place.key, source))
        if known is not None:
            return known
        outcome = self.tried(place, all_tests)
        line = {"key": place.key, "source": source, "tests": self.tests_hash, "outcome": outcome}
        with self.results.open("a") as sink:
            sink.write(json.dumps(line) + "\n")
        return outcome

    def tried(self, place: Place, all_tests: Collected | None) -> str:
        """Run the tests that may notice."""
        mutant, path = place.mutant, self.copy / place.file
        if all_tests is None:
            tests = self.map.ordered()
        else:
            tests = self.map.covering(place.file, mutant.line, mutant.end_line)
        if not tests:
            return "not run"
        few = self.map.within(tests, self.seconds)
        name = place.file.removeprefix("src/").removesuffix(".py").removesuffix("/__init__")
        wrong = WrongModule(name.replace("/", "."), path, mutated(path.read_text(), mutant))
        limit = 30.0 + 5.0 * sum(self.map.seconds[test] for test in few)
        trial = try_anew if all_tests is None else all_tests.try_changed
        status = in_fork(partial(trial, few, wrong), limit, self.copy / "trial.txt")
        if status is None:
            return "took too long"
        return "survived" if status == 0 else "failed"


def _hash(*paths: Path) -> str:
    digest = hashlib.sha256()
    for path in paths:
        files = [path] if path.is_file() else sorted(path.rglob("*.py"))
        files = [file for file in files if not file.name.startswith("muta")]
        for file in files:
            digest.update(file.read_bytes())
    return digest.hexdigest()[:16]


def _read(results: Path, tests_hash: str) -> dict[tuple[str, str], str]:
    """Outcomes that still hold: what one test noticed, more tests notice too."""
    if not results.exists():
        return {}
    lines = [json.loads(line) for line in results.read_text().splitlines()]
    return {
        (line["key"], line["source"]): line["outcome"]
        for line in lines
        if line["outcome"] in NOTICED or line["tests"] == tests_hash
    }


def _excused() -> dict[str, str]:
    """Reason by key of each wrong that changes nothing that could be seen."""
    if not EQUIVALENT.exists():
        return {}
    entries = tomllib.loads(EQUIVALENT.read_text())["equivalent"]
    return {key: entry["reason"] for entry in entries for key in entry["mutants"]}


def _report(room: str, possible: int, outcomes: dict[str, str]) -> None:
    counted = Counter(outcomes.values())
    tried = len(outcomes) - counted["equivalent"]
    noticed = sum(counted[outcome] for outcome in NOTICED)
    share = 100.0 * noticed / tried if tried else float("nan")
    rest = ", ".join(f"{n} {outcome}" for outcome, n in sorted(counted.items()))
    print(f"{room}: {noticed} of {tried} noticed, {share:.1f} % ({rest}; {possible} possible)")
    for key, outcome in sorted(outcomes.items()):
        if outcome in ("survived", "not run"):
            print(f"  {outcome}: {key}")


if __name__ == "__main__":
    main()
