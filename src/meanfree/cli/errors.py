"""How every command ends: its exit status, and errors in one wording.

0 done, 1 the computation failed, 2 the input is wrong, 130 interrupted (143 and 129 where it was
killed or its terminal closed). A traceback is never the answer.
"""

from __future__ import annotations

import errno
import json
import os
import sys
import traceback
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import typer

from meanfree.cli.process import interrupted_status, silence, told
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
        told("Interrupted.", sys.stderr)
        return interrupted_status()
    except BrokenPipeError:
        return _reader_gone()
    except SystemExit as stop:  # typer's own answer to a broken pipe, among others
        if isinstance(stop.__context__, BrokenPipeError):
            return _reader_gone()
        return stop.code if isinstance(stop.code, int) else 1
    except MemoryError:
        return _tell_failure("There is not enough memory for this.", 1, as_json)
    except ImportError as error:
        if not any(words in str(error) for words in ("map segment", "allocate memory")):
            return _tell_failure(_unexpected(error), 1, as_json)
        return _tell_failure("There is not enough memory for this.", 1, as_json)
    except OSError as error:
        return _tell_place(error, as_json)
    except Exception as error:  # noqa: BLE001 -- the last net: one line instead of a traceback
        if _comes_of_interruption(error):
            told("Interrupted.", sys.stderr)
            return interrupted_status()
        return _tell_failure(_unexpected(error), 1, as_json)
    return status if isinstance(status, int) else 0


def _comes_of_interruption(error: BaseException | None) -> bool:
    """True where Ctrl-C fell into code that made another error of it."""
    while error is not None:
        if isinstance(error, KeyboardInterrupt):
            return True
        error = error.__cause__ or error.__context__
    return False


def _reader_gone() -> int:
    """The reader of our output (`| head`) has gone, which is no error of ours."""
    silence(sys.stdout)
    return 0


def _while_printing(error: OSError) -> bool:
    # The call that prints, or the last flush here; what is refused of files comes from deeper.
    frames = traceback.extract_tb(error.__traceback__)
    return bool(frames) and frames[-1].name in ("echo", report_errors.__name__)


def _tell_place(error: OSError, as_json: bool) -> int:
    """What the system refuses that no room has put into words."""
    if _while_printing(error):
        # What waits for that stream would be refused once more at the end.
        silence(sys.stdout)
        text = f"Not all could be printed: {error.strerror}. What was left in files is whole."
        return _tell_failure(text, 1, as_json=False)
    if error.errno in (errno.ENOSPC, errno.EDQUOT, errno.EFBIG):
        where = error.filename or "a temporary file"
        return _tell_failure(f"There is no room left for {where} ({error.strerror}).", 1, as_json)
    try:
        os.getcwd()
    except OSError:
        found = "a working folder that has been removed"
        expected = "the command given again from a folder that exists"
        return _tell_input([Problem("", found, expected)], as_json)
    return _tell_failure(_unexpected(error), 1, as_json)


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
    return _escaped({"errors": entries})


def _escaped(content: object) -> str:
    """JSON in which no character can act on a terminal, or lack a place in an encoding."""
    text = json.dumps(content, indent=2, ensure_ascii=False)
    return "".join(c if c.isprintable() or c == "\n" else json.dumps(c)[1:-1] for c in text)


def _tell_input(problems: Sequence[Problem], as_json: bool) -> int:
    if as_json:
        told(problems_as_json(problems), sys.stdout)
    else:
        told(problems_as_text(problems), sys.stderr)
    return InputError.exit_status


def _tell_failure(text: str, status: int, as_json: bool) -> int:
    if as_json:
        told(_escaped({"failure": text}), sys.stdout)
    told("\n".join(_visible(line) for line in text.split("\n")), sys.stderr)
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
