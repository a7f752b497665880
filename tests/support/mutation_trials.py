"""Running a few tests against one wrong, in a process forked for it.

Where the wrong is in a function that only tests call, everything is imported and collected once and
the fork changes that function's code: `in_session`. Where it is in what runs at import, the fork
imports the package anew with the wrong in it: `try_anew`.
"""

from __future__ import annotations

import ast
import gc
import importlib
import importlib.abc
import importlib.util
import inspect
import json
import os
import shutil
import signal
import sys
import time
import traceback
from collections import defaultdict
from collections.abc import Callable, Iterator, Sequence
from functools import _lru_cache_wrapper
from importlib.machinery import ModuleSpec, SourceFileLoader
from pathlib import Path
from types import CodeType, FunctionType
from typing import Any

import pytest

SLOW_TO_IMPORT = (
    "numpy", "scipy.constants", "scipy.integrate", "scipy.interpolate", "scipy.linalg",
    "scipy.optimize", "scipy.sparse.linalg", "scipy.special", "scipy.stats", "sympy", "mpmath",
    "pandas", "pydantic", "pint", "chemicals", "numba", "hypothesis", "matplotlib.figure",
)  # fmt: skip
MEMORY = 6 * 2**30
MAKE_MACHINE_CODE = ("meanfree.kernel.vector", "meanfree.kernel.interpreter")
"""Modules whose work is kept on disk: a wrong in them shows only where nothing is kept."""

Trial = Callable[[], int]


class Map:
    """Which tests run a line, and how long each test took."""

    def __init__(self, seconds: dict[str, float], tests_of: dict[str, dict[str, list[str]]]):
        self.seconds = seconds
        self.tests_of = tests_of

    def runs_at_import(self, file: str, first: int, last: int) -> bool:
        """Whether a line runs while modules, or those of the tests, are imported."""
        lines = self.tests_of.get(file, {})
        return any("" in lines.get(str(line), ()) for line in range(first, last + 1))

    def covering(self, file: str, first: int, last: int) -> list[str]:
        """Tests that run a line from first to last of a file, the quickest first."""
        lines = self.tests_of.get(file, {})
        tests = {test for line in range(first, last + 1) for test in lines.get(str(line), ())}
        tests.discard("")
        return self.ordered(tests)

    def ordered(self, tests: set[str] | None = None) -> list[str]:
        """Tests, or all of them, the quickest first."""
        chosen = self.seconds if tests is None else tests
        return sorted(chosen, key=lambda test: (self.seconds[test], test))

    def within(self, tests: Sequence[str], seconds: float) -> list[str]:
        """The first tests, as many as take no longer together; one at least."""
        total, few = 0.0, []
        for test in tests:
            total += self.seconds[test]
            if few and total > seconds:
                break
            few.append(test)
        return few


def import_what_is_slow(without_compiler: bool) -> None:
    """Import the libraries that every fork needs."""
    # What the README says of our own values would notice any wrong: here it is not asked.
    os.environ["MEANFREE_VALIDATION"] = "write"
    if without_compiler:
        os.environ["NUMBA_DISABLE_JIT"] = "1"
    for name in SLOW_TO_IMPORT:
        importlib.import_module(name)
    from hypothesis import Phase, settings

    # The same examples every time, none kept, and no time spent on making a failure small.
    phases = (Phase.explicit, Phase.generate)
    settings.register_profile("trial", derandomize=True, database=None, phases=phases)
    settings.load_profile("trial")


def stand_in_for_intrinsics() -> None:
    """Without the compiler: what the kernel says in machine terms, said in Python.

    The interpreter of phases stays machine code; the driver around it is Python then.
    """
    if os.environ.get("NUMBA_DISABLE_JIT") != "1":
        return
    import ctypes

    import numpy as np

    from meanfree.kernel import vector

    def call_address(address: int, base: int, code: int) -> None:
        ctypes.CFUNCTYPE(None, ctypes.c_int64, ctypes.c_int64)(int(address))(int(base), int(code))

    def positive_lanes(base: int, slot: int, lanes: int) -> int:
        row = (ctypes.c_double * lanes).from_address(int(base) + 8 * int(slot) * lanes)
        return sum(1 << lane for lane, value in enumerate(row) if value > 0)

    np.seterr(all="ignore")  # as machine code does
    stand_ins = {"call_address": call_address, "positive_lanes": positive_lanes}
    for name, function in {**stand_ins, "unowned": lambda array: array}.items():
        setattr(vector, name, function)


class _WrongLoader(SourceFileLoader):
    tree: ast.Module

    def get_code(self, fullname: str) -> CodeType:
        return compile(self.tree, self.path, "exec", dont_inherit=True)


class WrongModule(importlib.abc.MetaPathFinder):
    """Imports one module from a syntax tree instead of from its file."""

    def __init__(self, name: str, path: Path, tree: ast.Module) -> None:
        self.name, self.path, self.tree = name, path, tree

    def find_spec(self, fullname: str, path: Any, target: Any = None) -> ModuleSpec | None:
        """The module, where it is the one."""
        if fullname != self.name:
            return None
        loader = _WrongLoader(fullname, str(self.path))
        loader.tree = self.tree
        places = [str(self.path.parent)] if self.path.name == "__init__.py" else None
        return importlib.util.spec_from_file_location(
            fullname, self.path, loader=loader, submodule_search_locations=places
        )


class _Chosen:
    """Keeps the chosen tests only, in the order given."""

    def __init__(self, tests: Sequence[str]) -> None:
        self.rank = {test: place for place, test in enumerate(tests)}

    @pytest.hookimpl(trylast=True)
    def pytest_collection_modifyitems(self, items: list[pytest.Item]) -> None:
        items[:] = [item for item in items if item.nodeid in self.rank]
        items.sort(key=lambda item: self.rank[item.nodeid])


class _Mapper:
    """Notes for each test its time, its success and the lines it runs, caches emptied before."""

    def __init__(self, coverage: Any) -> None:
        self.coverage = coverage
        self.seconds: dict[str, float] = defaultdict(float)
        self.failed: list[str] = []

    @pytest.hookimpl(hookwrapper=True)
    def pytest_runtest_protocol(self, item: pytest.Item) -> Iterator[None]:
        for name, module in list(sys.modules.items()):
            if name.startswith("meanfree"):
                for thing in vars(module).values():
                    if isinstance(thing, _lru_cache_wrapper):
                        thing.cache_clear()
        self.coverage.switch_context(item.nodeid)
        yield
        self.coverage.switch_context("")

    def pytest_runtest_logreport(self, report: pytest.TestReport) -> None:
        self.seconds[report.nodeid] += report.duration
        if report.failed:
            self.failed.append(report.nodeid)


def _pytest(arguments: Sequence[str], plugin: object) -> int:
    fixed = ["-q", "-p", "no:cacheprovider", "-p", "no:xdist", "-p", "no:cov", "-m", "not slow"]
    fixed += ["-W", "ignore::pytest.PytestAssertRewriteWarning"]
    return int(pytest.main([*fixed, "--basetemp=.trial", *arguments], plugins=[plugin]))


def places_of(room: str) -> list[str]:
    """Where the tests of a room are: its folder, and the docstrings of its modules."""
    return [f"tests/{room}", f"meanfree.{room}"]


def map_tests(room: str, result: Path) -> int:
    """Run all fast tests of a room once (in a fork) and write the `Map`; 1 where one fails."""
    from coverage import Coverage

    coverage = Coverage(data_file=None, source_pkgs=[f"meanfree.{room}"], config_file=False)
    mapper = _Mapper(coverage)
    coverage.start()
    stand_in_for_intrinsics()
    _pytest(places_of(room), mapper)
    coverage.stop()
    for test in mapper.failed:
        print("fails unharmed and is left out:", test)
        del mapper.seconds[test]
    if not mapper.seconds:
        return 1
    data = coverage.get_data()
    tests_of = {}
    for path in data.measured_files():
        file = Path(path).relative_to(Path.cwd()).as_posix()
        contexts = data.contexts_by_lineno(path)
        tests_of[file] = {
            str(line): [test for test in names if test in mapper.seconds or not test]
            for line, names in contexts.items()
        }
    result.write_text(json.dumps({"seconds": mapper.seconds, "tests_of": tests_of}))
    return 0


def try_anew(tests: Sequence[str], wrong: WrongModule) -> int:
    """Run tests until one fails (in a fork); pytest's exit status."""
    sys.meta_path.insert(0, wrong)
    if wrong.name in MAKE_MACHINE_CODE:
        shutil.rmtree(".fresh", ignore_errors=True)
        os.environ["MEANFREE_CACHE"] = str(Path(".fresh").resolve())
    stand_in_for_intrinsics()
    files: dict[str, None] = {}
    for test in tests:
        file = test.split("::")[0]
        if file.startswith("src/"):
            file = file[len("src/") :].removesuffix(".py").removesuffix("/__init__")
            file = file.replace("/", ".")
        files[file] = None
    return _pytest(["-x", *files], _Chosen(tests))


class _Session:
    """Collects, and then does something else than run all tests."""

    def __init__(self, instead: Callable[[Collected], None]) -> None:
        self.instead = instead

    @pytest.hookimpl(tryfirst=True)
    def pytest_runtestloop(self, session: pytest.Session) -> bool:
        self.instead(Collected(session))
        return True


class Collected:
    """All tests of a room and all functions of the package, ready to be forked."""

    def __init__(self, session: pytest.Session) -> None:
        self.items = {item.nodeid: item for item in session.items}
        self.failed = False
        session.config.pluginmanager.register(self)
        self.functions: dict[tuple[str, str], list[FunctionType]] = defaultdict(list)
        for thing in gc.get_objects():
            if isinstance(thing, FunctionType) and str(thing.__module__).startswith("meanfree."):
                self.functions[thing.__module__, thing.__code__.co_qualname].append(thing)

    def pytest_runtest_logreport(self, report: pytest.TestReport) -> None:
        self.failed = self.failed or report.failed

    def try_changed(self, tests: Sequence[str], wrong: WrongModule) -> int:
        """`try_tests` with functions changed."""
        code = compile(wrong.tree, str(wrong.path), "exec", dont_inherit=True)
        for new in _outermost(code):
            for function in self.functions[wrong.name, new.co_qualname]:
                if function.__code__ != new:
                    function.__code__ = new
        return self.try_tests(tests)

    def try_tests(self, tests: Sequence[str]) -> int:
        """Run tests (in a fork) until one fails: 1, or 0."""
        items = [self.items[test] for test in tests]
        for item, following in zip(items, [*items[1:], None], strict=True):
            item.ihook.pytest_runtest_protocol(item=item, nextitem=following)
            if self.failed:
                return 1
        return 0


def _outermost(code: CodeType) -> Iterator[CodeType]:
    """Functions and methods of a module, not those inside functions."""
    for constant in code.co_consts:
        if isinstance(constant, CodeType):
            is_class = not constant.co_flags & inspect.CO_OPTIMIZED
            yield from _outermost(constant) if is_class else (constant,)


def in_session(room: str, instead: Callable[[Collected], None]) -> None:
    """Collect the fast tests of a room and hand them over."""
    stand_in_for_intrinsics()
    _pytest(["-s", *places_of(room)], _Session(instead))


def in_fork(trial: Trial, seconds: float, output: Path) -> int | None:
    """Exit status of a trial in a process of its own; None where it took too long."""
    pid = os.fork()
    if pid == 0:
        status = 99
        try:
            import resource  # where there are forks, there is this

            os.setsid()
            resource.setrlimit(resource.RLIMIT_DATA, (MEMORY, MEMORY))
            written = os.open(output, os.O_WRONLY | os.O_CREAT | os.O_TRUNC)
            os.dup2(written, 1)
            os.dup2(written, 2)
            status = trial()
        except BaseException:  # noqa: BLE001 - whatever it is, the fork must end here and say it
            traceback.print_exc()
        finally:
            sys.stdout.flush()
            sys.stderr.flush()
            os._exit(status)
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        done, status = os.waitpid(pid, os.WNOHANG)
        if done:
            return os.waitstatus_to_exitcode(status)
        time.sleep(0.01)
    os.killpg(pid, signal.SIGKILL)
    os.waitpid(pid, 0)
    return None
