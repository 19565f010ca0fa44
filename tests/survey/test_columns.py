import pytest

from vortexwidgets.survey.columns import is_unit, understand, usual_unit


@pytest.mark.parametrize(
    ("text", "role", "of", "unit", "per"),
    [  # headings as people write them: common practice
        ("position [mm]", "position", "", "mm", ""),
        ("Position (m)", "position", "", "m", ""),
        ("x_mm", "x", "", "mm", ""),
        ("U_mps", "u", "", "m/s", ""),
        ("V (m/s)", "v", "", "m/s", ""),
        ("position mm", "position", "", "mm", ""),
        ("velocity m/s", "velocity", "", "m/s", ""),
        ("velocity, m/s", "velocity", "", "m/s", ""),
        ("velocity [m s⁻¹]", "velocity", "", "m/s", ""),
        ("r / mm", "radius", "", "mm", ""),
        ("v/(m/s)", "v", "", "m/s", ""),
        ("v_theta [m/s]", "swirl", "", "m/s", ""),
        ("vθ [m/s]", "swirl", "", "m/s", ""),
        ("v_m_s", "v", "", "m/s", ""),
        ("radius", "radius", "", None, ""),
        ("r/c", "radius", "", "", "c"),
        ("x/c", "x", "", "", "c"),
        ("V/U∞", "v", "", "", "U∞"),
        ("v_theta/Uinf", "swirl", "", "", "Uinf"),
        ("V/U [%]", "v", "", "%", "U"),
        ("velocity [-]", "velocity", "", "", "scale"),
        ("uncertainty [m/s]", "uncertainty", "", "m/s", ""),
        ("velocity uncertainty [m/s]", "uncertainty", "", "m/s", ""),
        ("uncertainty of u [m/s]", "uncertainty", "u", "m/s", ""),
        ("sigma_u [m/s]", "uncertainty", "u", "m/s", ""),
        ("u(v) [m/s]", "uncertainty", "v", "m/s", ""),
        ("position uncertainty [mm]", "uncertainty", "position", "mm", ""),
        ("± [m/s]", "uncertainty", "", "m/s", ""),
        ("u rms [m/s]", "rms", "u", "m/s", ""),
        ("sdU_mps", "rms", "u", "m/s", ""),
        ("sdV_mps", "rms", "v", "m/s", ""),
        ("vrms [m/s]", "rms", "v", "m/s", ""),
        ("rms [m/s]", "rms", "", "m/s", ""),
        ("samples", "samples", "", None, ""),
        ("static pressure [kPa]", "pressure", "", "kPa", ""),
        ("mean velocity [m/s]", "velocity", "", "m/s", ""),
        ("remark", "remark", "", None, ""),
        ("CHC", "flag", "", None, ""),
        ("v_m", "", "", None, ""),  # a mean? metres? not guessed
        ("alpha [deg]", "", "", "deg", ""),
        ("", "", "", None, ""),
    ],
)
def test_headings_are_understood(text, role, of, unit, per):
    heading = understand(text)
    assert (heading.role, heading.of, heading.unit, heading.per) == (role, of, unit, per)


@pytest.mark.parametrize(("text", "coverage"), [("uncertainty (k=2) [m/s]", 2.0), ("uncertainty [m/s] (k = 2)", 2.0)])
def test_a_coverage_factor_in_a_heading_is_taken_out(text, coverage):
    heading = understand(text)
    assert (heading.role, heading.unit, heading.coverage) == ("uncertainty", "m/s", coverage)


def test_a_coverage_of_95_percent_is_1_96():
    assert understand("expanded uncertainty (95 %) [m/s]").coverage == 1.96  # JCGM 100:2008, table G.1


@pytest.mark.parametrize(
    ("text", "coverage"),
    [
        ("U95 [m/s]", None),
        ("U_95 [m/s]", None),
        ("velocity U95 [m/s]", None),
        ("expanded uncertainty [m/s]", None),
        ("expanded uncertainty (k=2) [m/s]", 2.0),
    ],
)
def test_an_expanded_uncertainty_is_known_as_one(text, coverage):
    heading = understand(text)
    assert (heading.role, heading.unit, heading.coverage, heading.expanded) == ("uncertainty", "m/s", coverage, True)


def test_a_coverage_factor_makes_u_an_uncertainty():
    assert (understand("U (k=2) [m/s]").role, understand("U (k=2) [m/s]").coverage) == ("uncertainty", 2.0)
    assert understand("U [m/s]").role == "u"
    assert not understand("uncertainty [m/s]").expanded


@pytest.mark.parametrize(
    ("written", "kind", "usual"),
    [("MM", "length", "mm"), ("FT", "length", "ft"), ("M/S", "velocity", "m/s"), ("mm", "velocity", None)],
)
def test_capitals_lead_to_the_usual_unit_of_the_kind(written, kind, usual):
    assert usual_unit(written, kind) == usual


def test_a_unit_given_separately_counts_more():
    assert understand("position [mm]", "cm").unit == "cm"
    assert understand("velocity", "1").per == "scale"


@pytest.mark.parametrize("cell", ["mm", "[m/s]", "(ft/s)", "-", "%", "", "knots"])
def test_units_of_a_row_of_units(cell):
    assert is_unit(cell)


def test_a_name_is_no_unit():
    assert not is_unit("velocity")
