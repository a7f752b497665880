"""`meanfree sweep CASE`: many conditions, in parts on disk, resumed where they stopped."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Literal

import typer

from meanfree.cli._common import AsJson, CasePath, Out, Quiet, Replace, Settings
from meanfree.errors import InputError, Problem

if TYPE_CHECKING:
    from meanfree.cli.sweep_work import Asked


def sweep(
    case: CasePath,
    design: Annotated[
        str | None,
        typer.Option(metavar="KIND", help="grid, list or quasi-random; else as under [sweep]."),
    ] = None,
    vary: Annotated[
        list[str] | None,
        typer.Option(
            metavar="ADDRESS=LOW..HIGH",
            help="A number and its range, such as temperature.value='400 K..600 K', in place of "
            "those under [sweep]. Further: ';11' points, ';log'. May be repeated.",
        ),
    ] = None,
    observe: Annotated[
        list[str] | None,
        typer.Option(
            metavar="WHAT",
            help="What is asked of every run, such as 'conversion of NO at 10 min', in place of "
            "what stands under [sweep]. May be repeated.",
        ),
    ] = None,
    samples: Annotated[
        int | None, typer.Option(metavar="N", help="Quasi-random conditions: a power of two.")
    ] = None,
    seed: Annotated[
        int | None, typer.Option(metavar="N", help="Seed of the quasi-random conditions.")
    ] = None,
    engine: Annotated[
        str, typer.Option(metavar="WHERE", help="local (all cores) or dask (a cluster).")
    ] = "local",
    scheduler: Annotated[
        str | None, typer.Option(metavar="ADDRESS", help="Of the cluster, such as tcp://host:8786.")
    ] = None,
    workers: Annotated[
        int | None, typer.Option(metavar="N", help="Processes here; else one for each core.")
    ] = None,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Run a case under many conditions: a grid, a list, or quasi-random points.

    What is finished is kept: the same command again goes on where it was stopped. --replace starts
    anew.
    """
    from meanfree.cli.sweep_work import Asked, carried_out

    asked = Asked(
        design, tuple(vary or ()), tuple(observe or ()), samples, seed, _engine(engine), scheduler,
        workers,
    )  # fmt: skip
    _refuse(asked, engine)
    typer.echo(
        carried_out(asked, case, settings, out=out, replace=replace, as_json=as_json, quiet=quiet)
    )


def _engine(word: str) -> Literal["local", "dask"]:
    return "dask" if word == "dask" else "local"


def _refuse(asked: Asked, engine: str) -> None:
    """Options that do not go together, all of them in one go."""
    problems = []
    if engine not in ("local", "dask"):
        problems.append(Problem("--engine", f'"{engine}"', 'one of "local", "dask"'))
    if asked.design not in (None, "grid", "list", "quasi-random"):
        expected = 'one of "grid", "list", "quasi-random"'
        problems.append(Problem("--design", f'"{asked.design}"', expected))
    if engine == "dask" and asked.scheduler is None:
        expected = "the address that dask scheduler prints, such as tcp://host:8786"
        problems.append(Problem("--scheduler", "nothing beside --engine dask", expected))
    if engine == "local" and asked.scheduler is not None:
        problems.append(Problem("--scheduler", "a scheduler alone", "--engine dask beside it"))
    if engine == "dask" and asked.workers is not None:
        expected = "no --workers: the cluster has its own"
        problems.append(Problem("--workers", "--workers beside --engine dask", expected))
    if asked.workers is not None and not 1 <= asked.workers <= 1024:
        problems.append(Problem("--workers", f"{asked.workers}", "a number from 1 to 1024"))
    if problems:
        raise InputError(problems)
