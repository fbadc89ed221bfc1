"""The look: tints by oxidation state, told apart in grey and by colour-blind eyes; numbers and formulas as set."""

import numpy as np
import pytest
from matplotlib.colors import to_rgb

from gley.drawing import field_colour, style
from gley.drawing.symbols import symbols
from gley.formula import typeset

# Machado, Oliveira & Fernandes 2009, IEEE Trans. Vis. Comput. Graph. 15: 1291-1298, severity 1.0 (from memory)
EYES = {
    "normal": np.eye(3),
    "protan": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
    "deutan": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
    "tritan": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
}
TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])  # IEC 61966-2-1


def lab(colour, eye="normal"):
    """CIE 1976 L*a*b* (D65) of an sRGB colour as an eye sees it."""
    rgb = np.array(to_rgb(colour))
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    xyz = TO_XYZ @ np.clip(np.array(EYES[eye]) @ linear, 0, 1) / [0.9505, 1.0, 1.089]
    f = np.where(xyz > 0.008856, np.cbrt(xyz), 7.787 * xyz + 16 / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


ENDS = {"Fe": ("II", "III"), "Mn": ("II", "IV"), "As": ("III", "V")}


@pytest.mark.parametrize("element", ENDS)
def test_the_four_tints_of_an_element_differ_in_grey(element):
    tints = [style.tint(element, state, kind) for state in ENDS[element] for kind in ("dissolved", "solid")]
    lightness = sorted(lab(colour)[0] for colour in tints)
    assert np.diff(lightness).min() >= 5.0
    assert lightness[0] >= 60.0, "black points must stand out"


@pytest.mark.parametrize("eye", EYES)
@pytest.mark.parametrize("element", ENDS)
def test_the_four_tints_differ_for_every_eye(element, eye):
    seen = [lab(style.tint(element, state, kind), eye) for state in ENDS[element] for kind in ("dissolved", "solid")]
    apart = [np.linalg.norm(a - b) for k, a in enumerate(seen) for b in seen[k + 1 :]]
    assert min(apart) >= 8.0  # 2.3 is just noticeable side by side (Mahy and others 1994, from memory)


def test_oxidised_is_warm_and_reduced_is_cool():
    for kind in ("dissolved", "solid"):
        red, _, blue = to_rgb(style.tint("Fe", "Fe(III)", kind))
        assert red > blue
        red, _, blue = to_rgb(style.tint("Fe", "Fe(II)", kind))
        assert blue > red


def test_a_tint_hangs_on_state_and_kind_alone():
    assert field_colour("siderite") == field_colour("mackinawite") == style.tint("Fe", "II", "solid")
    assert field_colour("H2AsO4^-") == field_colour("HAsO4^2-") != field_colour("H3AsO3(aq)")
    assert field_colour("CH4 or so") is None


@pytest.mark.parametrize(
    ("state", "number"),
    [("III", 3), ("IV", 4), ("-II", -2), ("VII", 7), ("0", 0), ("II,III", 2.5), ("IX", 9)],
)
def test_oxidation_numbers(state, number):
    assert style.oxidation_number(state) == number


def test_amounts_carry_a_fitting_prefix_and_the_mass():
    assert style.amount_text(1e-6, "As") == "1.0\u00a0µmol/L (75\u00a0µg/L)"  # 74.92 g/mol
    assert style.amount_text(5e-3) == "5.0\u00a0mmol/L"
    assert style.amount_text(2.5e-5, "Fe") == "25\u00a0µmol/L (1.4\u00a0mg/L)"  # 55.845 g/mol
    assert style.amount_text(9.9996e-4) == "1.0\u00a0mmol/L"


def test_formulas_have_their_charge_raised_and_counts_lowered():
    assert typeset("HAsO4^2-") == r"$\mathregular{HAsO_{4}^{2{−}}}$"
    assert typeset("Fe(OH)3") == r"$\mathregular{Fe(OH)_{3}}$"
    assert style.shown_name("FeSO4(aq)", "FeSO4", "dissolved") == ("", r"$\mathregular{FeSO_{4}}$(aq)")


def test_symbols_are_unlike_each_other_and_those_not_assigned_hollow():
    names = ["O2", "NO3", "Fe(III)", "SO4", "CH4", "undetermined", "", "O2-Mn(IV)", "suboxic", "Mn(IV)"]
    found = symbols(names)
    looks = [(mark.fill, mark.marker) for mark in found.values()]
    assert len(set(looks)) == len(names)
    assert found[""].fill is None
    assert found["undetermined"].fill is None
    assert next(iter(found)) == "O2"
    assert list(found)[-1] == "undetermined"


def test_symbols_of_fields_differ_in_shape_where_the_tint_is_one():
    found = symbols(["H2AsO4^-", "HAsO4^2-", "siderite", "mackinawite"])
    assert len({mark.marker for mark in found.values()}) == 4
    assert found["siderite"].fill == found["mackinawite"].fill
