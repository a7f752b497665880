"""How every command ends: its exit status, and errors in one wording.

0 done, 1 the computation failed, 2 the input is wrong, 130 interrupted. A traceback is never the
answer.
"""

from __future__ import annotations

import json
import os
import sys
import traceback
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import typer

from meanfree.errors import InputError, MeanfreeError, Problem

# typer carries its own copy of click or uses the installed one, by version: ask it.
_UsageError: type[Exception] = typer.BadParameter.__mro__[1]  # UsageError
INTERRUPTED = 130


def report_errors(call: Callable[[], Any], *, as_json: bool, commands: Sequence[str] = ()) -> int:
    """Make the call and return the exit status, having said what went wrong.

    With ``as_json`` input errors go to standard output as ``{"errors": [...]}``, else
    everything goes to standard error. ``commands`` are those that a mistyped one is compared with.
    """
    try:
        status = call()
        sys.stdout.flush()
    except InputError as error:
        return _tell_input(error.problems, as_json)
    except MeanfreeError as error:
        return _tell_failure(str(error), error.exit_status, as_json)
    except _UsageError as error:
        return _tell_input([_usage_problem(error, commands)], as_json)
    except typer.Exit as stop:
        return stop.exit_code
    except (KeyboardInterrupt, typer.Abort):
        print("Interrupted.", file=sys.stderr)  # noqa: T201
        return INTERRUPTED
    except BrokenPipeError:
        return _reader_gone()
    except SystemExit as stop:  # typer's own answer to a broken pipe, among others
        if isinstance(stop.__context__, BrokenPipeError):
            return _reader_gone()
        return stop.code if isinstance(stop.code, int) else 1
    except MemoryError:
        return _tell_failure("There is not enough memory for this.", 1, as_json)
    except Exception as error:  # noqa: BLE001 -- the last net: one line instead of a traceback
        return _tell_failure(_unexpected(error), 1, as_json)
    return status if isinstance(status, int) else 0


def _reader_gone() -> int:
    """The reader of our output (`| head`) has gone, which is no error of ours."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return 0


def problems_as_text(problems: Sequence[Problem]) -> str:
    """Problems for a reader: under each file, the key with what was found and expected."""
    lines: list[str] = []
    files = list(dict.fromkeys(problem.file for problem in problems))
    for file in files:
        here = [problem for problem in problems if problem.file == file]
        many = "1 problem" if len(here) == 1 else f"{len(here)} problems"
        lines.append(f"{file}: {many}" if file else many)
        for problem in here:
            lines.append(f"  {problem.key or 'the file'}")
            lines.append(f"    found     {problem.found}")
            lines.append(f"    expected  {problem.expected}")
    return "\n".join(_visible(line) for line in lines)


def _visible(line: str) -> str:
    """Control characters of a file name or a key as text, so that they cannot act on a terminal."""
    return "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in line)


def problems_as_json(problems: Sequence[Problem]) -> str:
    """Problems for a program."""
    entries = [
        {"file": p.file, "key": p.key, "found": p.found, "expected": p.expected} for p in problems
    ]
    return json.dumps({"errors": entries}, indent=2, ensure_ascii=False)


def _tell_input(problems: Sequence[Problem], as_json: bool) -> int:
    if as_json:
        print(problems_as_json(problems))  # noqa: T201
    else:
        print(problems_as_text(problems), file=sys.stderr)  # noqa: T201
    return InputError.exit_status


def _tell_failure(text: str, status: int, as_json: bool) -> int:
    if as_json:
        print(json.dumps({"failure": text}, ensure_ascii=False))  # noqa: T201
    print(text, file=sys.stderr)  # noqa: T201
    return status


def _unexpected(error: Exception) -> str:
    """One line that a developer can work with."""
    frames = traceback.extract_tb(error.__traceback__)
    place = f" at {Path(frames[-1].filename).name}, line {frames[-1].lineno}" if frames else ""
    what = " ".join(str(error).split())[:300]
    return (
        f"meanfree failed unexpectedly ({type(error).__name__}{place}: {what}). This is a fault "
        "of the program: please report this line together with the case file."
    )


def _shown(parameter: Any) -> str:
    """A parameter as the help shows it."""
    return str(getattr(parameter, "metavar", None) or getattr(parameter, "name", "argument"))


def _usage_problem(error: Exception, commands: Sequence[str]) -> Problem:
    """A mistake on the command line as a problem like any other."""
    message = " ".join(str(getattr(error, "message", "") or error).split()).rstrip(".")
    context = getattr(error, "ctx", None)
    where = str(context.command_path) if context is not None else "meanfree"
    listed = f'what "{where} --help" lists'
    option = getattr(error, "option_name", None)
    if message.startswith("No such command"):
        from difflib import get_close_matches

        word = message.split("'")[1] if "'" in message else message
        near = get_close_matches(word, commands, n=1)
        hint = f' (did you mean "{near[0]}"?)' if near else ""
        return Problem(where, f'an unknown command "{word}"', f"one of {', '.join(commands)}{hint}")
    if option is not None and message.startswith("No such option"):
        possible = sorted(getattr(error, "possibilities", None) or [])
        hint = f' (did you mean "{possible[0]}"?)' if possible else ""
        return Problem(where, f"an unknown option {option}", listed + hint)
    if option is not None:
        return Problem(where, f"{option} without its value", listed)
    if type(error).__name__ == "MissingParameter":
        name = _shown(getattr(error, "param", None))
        every = getattr(getattr(context, "command", None), "params", [])
        wanted = [_shown(p) for p in every if getattr(p, "param_type_name", "") == "argument"]
        return Problem(where, f"no {name}", " ".join([where, *(wanted or [name])]))
    extra = message.partition("unexpected extra argument")[2]
    if extra:
        return Problem(where, f"too many arguments: {extra.rpartition('(')[2][:-1]}", listed)
    return Problem(where, message[:1].lower() + message[1:], listed)
