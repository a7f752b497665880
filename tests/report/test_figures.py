"""Figures: the same bytes every time, apart for colour-blind readers, text taken literally."""

from __future__ import annotations

import itertools
import subprocess
import sys

import numpy as np
import pytest
from small_runs import dimerisation

from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.report.figures import draw, half_lives, profiles, style
from meanfree.report.figures.labels import spread
from meanfree.report.run_models import RunSummary
from meanfree.report.sampling import time_axis
from meanfree.report.summary import summarise

# Simulated loss of one kind of cone, in linear sRGB: Machado, Oliveira and Fernandes, IEEE
# Trans. Visual. Comput. Graphics 15, 1291 (2009), severity 1.0.
VISION = {
    "full": np.eye(3),
    "no red cones": [
        [0.152286, 1.052583, -0.204868],
        [0.114503, 0.786281, 0.099216],
        [-0.003882, -0.048116, 1.051998],
    ],
    "no green cones": [
        [0.367322, 0.860646, -0.227968],
        [0.280085, 0.672501, 0.047413],
        [-0.011820, 0.042940, 0.968881],
    ],
    "no blue cones": [
        [1.255528, -0.076749, -0.178779],
        [-0.078411, 0.930809, 0.147602],
        [0.004733, 0.691367, 0.303900],
    ],
}
# Linear sRGB to CIE XYZ (D65): IEC 61966-2-1.
TO_XYZ = np.array(
    [
        [0.4124564, 0.3575761, 0.1804375],
        [0.2126729, 0.7151522, 0.0721750],
        [0.0193339, 0.1191920, 0.9503041],
    ]
)


def linear(color: str) -> np.ndarray:
    parts = np.array([int(color[i : i + 2], 16) / 255 for i in (1, 3, 5)])
    return np.where(parts <= 0.04045, parts / 12.92, ((parts + 0.055) / 1.055) ** 2.4)


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIE 1976 L*a*b*."""
    t = TO_XYZ @ np.clip(rgb, 0, 1) / (TO_XYZ @ np.ones(3))
    f = np.where(t > 216 / 24389, np.cbrt(t), (24389 / 27 * t + 16) / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def summary_of(run: Run) -> RunSummary:
    return summarise(run, case="case.toml", case_sha256="0", version="0")


@pytest.mark.parametrize("vision", VISION)
def test_every_two_colours_are_apart(vision: str) -> None:
    # A difference of 2.3 is just noticed side by side; curves need far more. 15 is common
    # practice for small marks, no source.
    seen = [lab(np.array(VISION[vision]) @ linear(color)) for color in style.PALETTE]
    for one, other in itertools.combinations(seen, 2):
        assert np.linalg.norm(one - other) > 15


def test_every_colour_stands_out_from_paper() -> None:
    # WCAG 2.1, criterion 1.4.11: graphical objects need a contrast of 3 to 1.
    for color in (*style.PALETTE, style.GUIDE):
        luminance = float(TO_XYZ[1] @ linear(color))
        assert 1.05 / (luminance + 0.05) > 3


def test_curves_differ_in_dashes_too() -> None:
    looks = [style.style_of(n) for n in range(3 * len(style.PALETTE))]
    assert len({str(look) for look in looks}) == len(looks)
    assert len({str(look["linestyle"]) for look in looks[: len(style.PALETTE)]}) == 8


def test_the_same_run_gives_the_same_bytes(nocl_run: Run) -> None:
    summary = summary_of(nocl_run)
    first, second = draw(nocl_run, summary), draw(nocl_run, summary)
    assert list(first) == ["profiles", "half_lives", "rates"]
    assert first == second
    assert not any("<dc:date>" in svg for svg, _ in first.values())


def test_time_is_linear_for_one_time_scale_and_logarithmic_for_several(
    nocl_run: Run, dimer_run: Run
) -> None:
    assert not time_axis(nocl_run).logarithmic
    # second order to 99.9 % lasts hundreds of half-lives
    assert time_axis(dimer_run).logarithmic


def test_pressure_moves_in_the_bulb_and_volume_in_the_piston(nocl_run: Run, dimer_run: Run) -> None:
    for run, word, other in (
        (nocl_run, "Pressure\n(torr)", "Volume"),
        (dimer_run, "Volume\n(L)", "Pre"),
    ):
        with style.drawing():
            labels = [ax.get_ylabel() for ax in profiles.figure(run, summary_of(run)).axes]
        assert labels == ["Concentration (mol/m³)", word]
        assert not any(label.startswith(other) for label in labels)


def test_what_takes_no_part_is_not_drawn(nocl_run: Run) -> None:
    assert profiles.drawn_gases(nocl_run) == ["NOCl", "NO", "Cl2"]


def test_half_lives_are_marked_where_they_end(dimer_run: Run) -> None:
    summary = summary_of(dimer_run)
    with style.drawing():
        (ax,) = half_lives.figure(dimer_run, summary).axes
    hours = [
        float(np.asarray(line.get_xdata())[0])
        for line in ax.get_lines()
        if line.get_marker() == "o"
    ]
    answer = summary.gas("A")
    assert answer is not None
    done = np.cumsum([t for t in answer.half_lives_s if t is not None])[:4]
    assert hours == pytest.approx(done / 3600)
    words = [text.get_text() for text in ax.texts]
    assert "first: 48.7 min" in words


def test_names_are_drawn_as_they_stand() -> None:
    # As mathematics these would be set, or end in an error; as text they are glyphs, one each.
    for name in ("$x^2$", r"$\undefined{", "_hidden", "<script>", "a&b"):
        run = integrate(dimerisation(names=(name, "D")))
        with style.drawing():
            figure = profiles.figure(run, summary_of(run))
            svg, _ = style.rendered(figure)
        assert name in [text.get_text() for text in figure.axes[0].texts]
        assert not any(text.get_parse_math() for text in figure.axes[0].texts)
        assert "<script" not in svg


def test_a_script_that_the_font_lacks_is_no_failure() -> None:
    run = integrate(dimerisation(names=("水素", "D")))
    with style.drawing():
        _, png = style.rendered(profiles.figure(run, summary_of(run)))
    assert png.startswith(b"\x89PNG")


def test_labels_keep_their_order_and_their_distance() -> None:
    wanted = np.array([0.5, 0.1, 0.5, 0.52, 0.9])
    places = spread(wanted, 0.05)
    assert np.all(np.diff(np.sort(places)) >= 0.05 - 1e-12)
    assert np.all(np.argsort(places, kind="stable") == np.argsort(wanted, kind="stable"))
    # those that were free stay where they were; those that touched keep their mean
    assert places[[1, 4]] == pytest.approx([0.1, 0.9])
    assert places[[0, 2, 3]].mean() == pytest.approx(wanted[[0, 2, 3]].mean())


def test_drawing_needs_no_window_and_no_global_state() -> None:
    code = (
        "import sys, meanfree.report.figures.profiles, meanfree.report.figures.rates;"
        "import meanfree.report.figures.half_lives;"
        "sys.exit('matplotlib.pyplot' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
