"""How the kernel's errors lie over random mechanisms and conditions.

``--minutes N`` works out references by collocation of order 13 (`compiled_reference`), with
``--radau`` by scipy's Radau, spread over 200 mechanisms of `plain_mechanisms` with 50 conditions
each; what was worked out is kept in ``--store`` and a rerun goes on from there. Without
``--minutes`` it compares the answers of `integrate.many` with what there is and prints the errors.
"""

from __future__ import annotations

import argparse
import hashlib
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np

HERE = Path(__file__).parent
SUPPORT = HERE.parent / "support"
sys.path.insert(0, str(SUPPORT))

FRACTIONS = (0.9, 0.5, 0.1)
"""Of what was filled: conversions of 10 and 90 % and the first half-life."""

MECHANISMS, ROWS, CHUNK = 200, 50, 10
"""Mechanisms, conditions of each, and how many are worked out at a time."""

QUANTILES = (0.5, 0.9, 0.99, 0.999, 1.0)


def levels_of(plain):
    """(gas, fraction) of every event of a mechanism."""
    filled = [i for i, c in enumerate(plain.fill) if c > 0]
    return np.array([[i, f] for i in filled for f in FRACTIONS])


def default_store() -> Path:
    """A folder named after what the references depend on."""
    digest = hashlib.sha256()
    for name in ("plain_mechanisms.py", "compiled_reference.py"):
        digest.update((SUPPORT / name).read_bytes())
    return Path(tempfile.gettempdir()) / f"meanfree-references-{digest.hexdigest()[:12]}"


@dataclass(frozen=True)
class Reference:
    """Of one mechanism: states at the end [rows, size], events [rows, n, 2]."""

    ends: np.ndarray
    events: np.ndarray


def collocated(store: Path, seed: int, chunk: int, compute: bool) -> Reference | None:
    """Of one chunk of the conditions: from the store, or worked out now."""
    from compiled_reference import solve
    from plain_mechanisms import condition, conditions, random_mechanism

    file = store / f"collocation-{seed}-{chunk}.npz"
    if not file.is_file():
        if not compute:
            return None
        plain = random_mechanism(seed)
        table, levels = conditions(plain, ROWS, seed), levels_of(plain)
        rows = range(CHUNK * chunk, CHUNK * (chunk + 1))
        found = [solve(condition(plain, table, row), levels) for row in rows]
        np.savez(file, ends=[f[0] for f in found], events=[f[1] for f in found])
    kept = np.load(file)
    return Reference(kept["ends"], kept["events"])


def by_radau(store: Path, seed: int, row: int, rtol: float, compute: bool):
    """End and times of one condition by scipy's Radau; None where it is not there."""
    from plain_mechanisms import condition, conditions, random_mechanism
    from radau_reference import scipy_radau

    file = store / f"radau-{rtol:.0e}-{seed}-{row}.npz"
    if not file.is_file():
        if not compute:
            return None
        plain = random_mechanism(seed)
        table = conditions(plain, ROWS, seed)
        end, times = scipy_radau(condition(plain, table, row), levels_of(plain), rtol)
        np.savez(file, end=end, times=times)
    kept = np.load(file)
    return kept["end"], kept["times"]


@dataclass(frozen=True)
class Answers:
    """The kernel's answers to the conditions of one mechanism, as the references give theirs."""

    ends: np.ndarray
    volumes: np.ndarray
    times: np.ndarray
    endings: np.ndarray


def answered(plain, table, rtol: float) -> Answers:
    """Through the door that everybody uses."""
    from plain_mechanisms import experiment_of

    from meanfree.integrate.many import ENDING, many
    from meanfree.integrate.observables import At, HalfLife, ReactionTime

    levels = levels_of(plain)
    asked = [At("amount", name) for name in plain.names] + [At("temperature"), At("volume")]
    times = [
        HalfLife(plain.names[int(g)]) if f == 0.5 else ReactionTime(plain.names[int(g)], 1 - f)
        for g, f in levels
    ]
    frame = many(experiment_of(plain), table, [*asked, *times], rtol=rtol, workers=1)
    columns = np.stack([frame[o.columns[0]].to_numpy() for o in (*asked, *times)], axis=1)
    n = len(plain.names)
    ends = columns[:, : n + 1] if plain.mode == "adiabatic" else columns[:, :n]
    return Answers(ends, columns[:, n + 1], columns[:, n + 2 :], frame[ENDING].to_numpy(str))


@dataclass
class Study:
    """Errors over the tolerance, one a condition (ends) or an event (times)."""

    rtol: float
    ends: list[np.ndarray]
    times: list[np.ndarray]
    labels: list[np.ndarray]
    bad: dict[str, int]
    one_sided: int = 0


def compare(study: Study, plain, table, reference: Reference, seed: int) -> None:
    """Add one mechanism."""
    from compiled_reference import numbers_of
    from plain_mechanisms import VOLUME, condition

    from meanfree.kernel.status import SENTENCES, Ending

    found = answered(plain, table, study.rtol)
    n, rows = len(plain.names), len(found.ends)
    good = np.isin(found.endings, [SENTENCES[e] for e in Ending if e.is_good])
    for ending in found.endings[~good]:
        study.bad[ending] = study.bad.get(ending, 0) + 1
    ends = np.full(rows, np.nan)
    for row in np.flatnonzero(good):
        first = numbers_of(condition(plain, table, row))[0].setting
        volume = VOLUME
        if plain.holds == "pressure":
            T = condition(plain, table, row).T
            volume *= T / plain.T_fill * (1 + plain.dead * plain.T_fill / 300.0)
            volume -= VOLUME * plain.dead * T / 300.0
        exact = reference.ends[row].copy()
        exact[:n] *= volume
        scale = study.rtol * np.abs(exact)
        scale[:n] += 1e-20 * first[7] * volume
        ends[row] = np.max(np.abs(found.ends[row] - exact) / scale)
    study.ends.append(ends)
    exact, pace = reference.events[..., 0], reference.events[..., 1]
    error = np.abs(found.times - exact) / (study.rtol * (exact + pace))
    error[~good] = np.nan
    one = np.isnan(found.times) != np.isnan(exact)
    study.one_sided += int(one[good].sum())
    study.times.append(error)
    study.labels.append(np.array([f"{seed} {plain.holds} {plain.mode}"] * rows))


def main() -> None:
    """Compute what is missing, or compare and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--minutes", type=float, default=0.0, help="for references not there yet")
    parser.add_argument("--radau", action="store_true", help="spend them on scipy's Radau")
    parser.add_argument("--store", type=Path, default=default_store())
    chosen = parser.parse_args()
    chosen.store.mkdir(parents=True, exist_ok=True)
    compute(chosen.store, chosen.minutes, chosen.radau)
    if chosen.minutes == 0:
        report(chosen.store)


def compute(store: Path, minutes: float, radau: bool) -> None:
    """References that are not there yet, spread over all mechanisms, until the time is over."""
    stop = time.monotonic() + 60 * minutes
    # At 1e-10 a run costs a fifth; at 1e-12 as many follow as there is time for.
    jobs = [(0, 1e-10), *((row, 1e-12) for row in range(1, ROWS))] if radau else []
    for row, rtol in jobs:
        for seed in range(MECHANISMS):
            if time.monotonic() < stop:
                by_radau(store, seed, row, rtol, True)
    for chunk in range(0 if radau else ROWS // CHUNK):
        for seed in range(MECHANISMS):
            if time.monotonic() < stop:
                collocated(store, seed, chunk, True)


def report(store: Path) -> None:
    """Compare the kernel with what there is."""
    from plain_mechanisms import conditions, random_mechanism

    for rtol in (1e-6, 1e-8):
        study = Study(rtol, [], [], [], {})
        for seed in range(MECHANISMS):
            plain = random_mechanism(seed)
            table = conditions(plain, ROWS, seed)
            for chunk in range(ROWS // CHUNK):
                reference = collocated(store, seed, chunk, False)
                if reference is not None:
                    part = {a: v[CHUNK * chunk : CHUNK * (chunk + 1)] for a, v in table.items()}
                    compare(study, plain, part, reference, seed)
        print(summary(study))


def radau_line(chosen, references) -> str:
    """How far the two references lie apart."""
    differences, times = [], []
    for seed, reference in references.items():
        for row in range(chosen.rows):
            found = by_radau(chosen.store, seed, row, chosen.rows, False)
            if found is not None:
                exact = np.abs(found[0])
                total = reference.ends[row].max()
                differences.append(
                    np.max(np.abs(found[0] - reference.ends[row]) / (exact + 1e-16 * total))
                )
                if np.any(np.isfinite(found[1])):
                    times.append(np.nanmax(np.abs(reference.events[row, :, 0] / found[1] - 1)))
    if not differences:
        return "no conditions by Radau"
    return (
        f"Radau: {len(differences)} conditions, ends differ by "
        f"{np.quantile(differences, QUANTILES)}, times by {np.quantile(times, QUANTILES)}"
    )


def summary(study: Study) -> str:
    ends = np.concatenate(study.ends)
    times = np.concatenate([t.ravel() for t in study.times])
    labels = np.concatenate(study.labels)
    good = np.isfinite(ends)
    lines = [f"rtol {study.rtol:g}: {len(ends)} conditions, without result {study.bad}"]
    lines.append(f"one-sided events {study.one_sided}")
    for name, values in (("ends", ends[good]), ("times", times[np.isfinite(times)])):
        lines.append(f"{name} {len(values)} {np.quantile(values, QUANTILES)}")
    for mode in ("isothermal", "adiabatic", "program"):
        for holds in ("volume", "pressure"):
            here = good & np.char.endswith(labels, f"{holds} {mode}")
            if here.any():
                lines.append(f"{holds} {mode} {np.quantile(ends[here], QUANTILES)}")
    worst = np.argsort(np.where(good, ends, 0))[::-1][:10]
    lines += [f"{labels[i]} row {i % len(study.ends[0])}: {ends[i]:.3g}" for i in worst]
    return "\n".join(lines)


if __name__ == "__main__":
    main()
