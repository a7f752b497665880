"""The constants in use against the published values.

Sources: SI brochure, 9th edition (2019), table 1, for the exact ones; CODATA 2018 and 2022
(from memory) for the measured ones; IUPAC Green Book, 3rd edition, for atm, torr and cal.
"""

from __future__ import annotations

import pytest
from validation import Checked

from meanfree import constants


@pytest.mark.parametrize(
    ("name", "published"),
    [
        ("N_A", 6.02214076e23),
        ("k_B", 1.380649e-23),
        ("h", 6.62607015e-34),
        ("c", 299792458.0),
        ("e", 1.602176634e-19),
        ("STANDARD_PRESSURE", 1e5),
        ("ATMOSPHERE", 101325.0),
        ("CALORIE", 4.184),
        ("ZERO_CELSIUS", 273.15),
        ("ANGSTROM", 1e-10),
    ],
)
def test_exact_constants(name: str, published: float) -> None:
    # Exact by definition: nothing but the last bit of a float may differ.
    assert getattr(constants, name) == pytest.approx(published, rel=4e-16)


@pytest.mark.parametrize(
    ("name", "published"),
    [
        ("R", 8.314462618),
        ("eps0", 8.8541878e-12),
        ("m_u", 1.66053907e-27),
        ("TORR", 133.322368),
    ],
)
def test_constants_to_the_digits_written(name: str, published: float, checked: Checked) -> None:
    # Nine significant digits are written above, eight for epsilon_0: half a unit of the last.
    source = "CODATA 2018 and 2022 (from memory); IUPAC Green Book"
    ours = getattr(constants, name)
    checked("R, ε₀, m_u, torr", ours, f"{published!r}", "", source, rel=6e-9)
