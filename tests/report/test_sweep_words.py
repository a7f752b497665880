"""Observables in words, as a reader finds them along an axis."""

from __future__ import annotations

from laboratory import experiment, step

from meanfree.integrate.observables import At, EndTime, HalfLife, Peak, ReactionTime
from meanfree.report.sweep.naming import in_words


def test_every_observable_in_words() -> None:
    case = experiment([step("A -> B", 1.0)], {"A": 1.0})
    asked = [
        ReactionTime("A", 0.125),
        HalfLife("A"),
        HalfLife("A", 2),
        HalfLife("A", 4),
        Peak("B"),
        At("concentration", "A", 600.0),
        At("conversion", "A"),
        At("total pressure"),
        At("volume", "", 3600.0),
        EndTime(),
    ]
    assert in_words(asked, case) == {
        "reaction_time_A_0.125_s": "Time of A to 12.5 % (s)",
        "half_life_A_1_s": "Half-life of A (s)",
        "half_life_A_2_s": "2nd half-life of A (s)",
        "half_life_A_4_s": "4th half-life of A (s)",
        "peak_time_B_s": "Time of most B (s)",
        "peak_amount_B_mol": "Most B (mol)",
        "c_A_at_600_s_mol_per_m3": "Concentration of A at 10 min (mol/m³)",
        "X_A": "Conversion of A at the end",
        "p_total_Pa": "Total pressure at the end (Pa)",
        "V_at_3600_s_m3": "Volume at 60 min (m³)",
        "end_s": "Length of the run (s)",
    }
