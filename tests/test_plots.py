"""Plots are redrawn in place, say their units, fit their figures and stay readable without full colour vision."""

import itertools

import numpy as np
import pytest
from colour_vision import JUST_NOTICEABLE, VISION, cielab, contrast, linear
from matplotlib.backend_bases import MouseButton, MouseEvent
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from vortexwidgets.fitting.ranking import rank_models
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.plots import PlanePlot, ProfilePlot, SurveyPlot
from vortexwidgets.plots.style import (
    LINE_STYLES,
    THEMES,
    label_axis,
    legend_rows,
    limits_around,
    theme_in_use,
    theme_named,
    use_theme,
)
from vortexwidgets.survey.survey import Survey


@pytest.mark.parametrize("theme", THEMES.values(), ids=list(THEMES))
def test_colours_reach_the_contrast_that_wcag_asks_for(theme):
    assert all(contrast(colour, theme.background) >= 3.0 for colour in theme.colours)  # graphics, WCAG 1.4.11
    assert all(contrast(colour, theme.background) >= 4.5 for colour in (theme.text, theme.quiet, theme.warning))


@pytest.mark.parametrize("vision", VISION)
@pytest.mark.parametrize("theme", THEMES.values(), ids=list(THEMES))
def test_colours_stay_apart_in_every_colour_vision(theme, vision):
    seen = [cielab(np.asarray(VISION[vision]) @ linear(colour)) for colour in theme.colours]
    nearest = min(float(np.linalg.norm(one - other)) for one, other in itertools.combinations(seen, 2))
    assert nearest > 10.0 * JUST_NOTICEABLE


def test_every_colour_has_a_line_style_of_its_own():
    assert len(set(LINE_STYLES)) == len(LINE_STYLES) == len(THEMES["light"].colours) == len(THEMES["dark"].colours)


def test_a_theme_that_there_is_not_is_refused():
    with pytest.raises(ValueError, match="light, dark, got 'sepia'"):
        theme_named("sepia")


def test_a_theme_is_in_use_only_inside_its_block():
    with use_theme("dark"):
        assert theme_in_use() is THEMES["dark"]
    assert theme_in_use() is THEMES["light"]


# Axes -----------------------------------------------------------------------------------------------------------------


def axes_between(low: float, high: float, unit: str):
    figure = Figure(figsize=(6.0, 3.0))
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    axes.set_ylim(low, high)
    label_axis(axes, "y", "what", unit)
    figure.canvas.draw()
    return axes


@pytest.mark.parametrize(
    ("low", "high", "unit", "shown", "wanted"),
    [
        (0.0, 0.06, "m", "what [mm]", ["0", "20", "40", "60"]),
        (0.0, 300.0, "m", "what [m]", ["0", "100", "200", "300"]),
        (-30e3, 30e3, "Pa", "what [kPa]", ["−20", "0", "20"]),
        (0.0, 250.0, "Pa", "what [Pa]", ["0", "100", "200"]),
        (0.0, 1.0, "", "what", ["0.0", "0.2", "0.4"]),
    ],
)
def test_ticks_are_round_numbers_of_the_unit_shown_while_the_data_stay_in_si(low, high, unit, shown, wanted):
    axes = axes_between(low, high, unit)
    assert axes.yaxis.label.get_text() == shown
    texts = [label.get_text() for label in axes.get_yticklabels()]
    assert set(wanted) <= set(texts)
    assert axes.get_ylim() == (low, high)


def test_very_large_numbers_share_a_power_of_ten():
    axes = axes_between(0.0, 4e6, "1/s")
    assert axes.yaxis.get_offset_text().get_text() == "×10⁶"
    assert {"1", "2", "3"} <= {label.get_text() for label in axes.get_yticklabels()}


def test_limits_hold_the_values_and_take_zero_in_when_it_is_near():
    low, high = limits_around([1.0, np.nan, 9.0, np.inf])
    assert low < 0.0 < 9.0 < high
    low, high = limits_around([100.0, 101.0])
    assert 99.0 < low < 100.0
    assert limits_around([]) == (0.0, 1.0)


def test_a_legend_takes_more_rows_in_a_narrow_figure():
    texts = ["Lamb-Oseen", "Kaufmann (rejected)", "Vatistas, n = 2.0", "set aside (3)"]
    assert legend_rows(texts, 9.0) == 1
    assert legend_rows(texts, 4.0) > 1
    assert legend_rows([], 9.0) == 0


# Reading figures ------------------------------------------------------------------------------------------------------


def figure_of(width: int, height: int) -> Figure:
    figure = Figure(figsize=(width / 100.0, height / 100.0), dpi=100)
    FigureCanvasAgg(figure)
    return figure


def texts_of(figure: Figure):
    """Every text that is seen, with its box in pixels."""
    figure.canvas.draw()
    renderer = figure.canvas.get_renderer()
    texts = [text for legend in figure.legends for text in legend.get_texts()]
    for axes in figure.axes:
        if not axes.get_visible():
            continue
        for which, axis in (("x", axes.xaxis), ("y", axes.yaxis)):
            low, high = sorted(axes.get_xlim() if which == "x" else axes.get_ylim())
            slack = 1e-9 * (high - low)
            texts.append(axis.label)
            texts += [tick.label1 for tick in axis.get_major_ticks() if low - slack <= tick.get_loc() <= high + slack]
            texts += [tick.label2 for tick in axis.get_major_ticks() if low - slack <= tick.get_loc() <= high + slack]
    seen = [text for text in texts if text.get_visible() and text.get_text()]
    return [(text.get_text(), text.get_window_extent(renderer)) for text in seen]


def assert_readable(figure: Figure) -> None:
    """No text is cut by the edge of the figure, none lies on another."""
    width, height = figure.get_size_inches() * figure.dpi
    boxes = texts_of(figure)
    for text, box in boxes:
        within = box.x0 >= 0.0 and box.y0 >= 0.0 and box.x1 <= width and box.y1 <= height
        assert within, f"{text!r} is cut off"
    for (one, first), (other, second) in itertools.combinations(boxes, 2):
        apart = first.x1 <= second.x0 or second.x1 <= first.x0 or first.y1 <= second.y0 or second.y1 <= first.y0
        assert apart, f"{one!r} lies on {other!r}"


SIZES = [(960, 320), (700, 320), (640, 620), (620, 480), (1400, 500)]
VORTICES = [
    Vortex("lamb-oseen", circulation=0.36, core_radius=0.005),
    Vortex("kaufmann", circulation=-0.36, core_radius=0.004),
    Vortex("vatistas", circulation=0.36, core_radius=0.005, exponent=2.04),
    Vortex("free", circulation=0.36),
]


# Profiles -------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("theme", THEMES)
def test_profile_texts_fit_and_do_not_overlap(size, theme):
    plot = ProfilePlot(figure_of(*size), theme=theme)
    for vortices in (VORTICES, VORTICES[:1], [Vortex("lamb-oseen", circulation=2e4, core_radius=50.0)]):
        plot.update(vortices, 998.0)
        plot.settle()
        assert_readable(plot.figure)


def test_profiles_show_the_vortex_in_si_with_units_on_every_axis():
    plot = ProfilePlot(figure_of(960, 320))
    vortex = VORTICES[0]
    plot.update([vortex], 998.0)
    plot.settle()
    for axes, curve in (
        (plot.swirl, vortex.swirl),
        (plot.vorticity, vortex.vorticity),
        (plot.pressure_drop, lambda r: vortex.pressure_drop(r, density=998.0)),
    ):
        radius, shown = axes.lines[0].get_data()
        np.testing.assert_array_equal(shown, curve(radius))
        assert radius[0] == 0.0
        assert "[mm]" in axes.get_xlabel()
    labels = [axes.get_ylabel() for axes in (plot.swirl, plot.vorticity, plot.pressure_drop)]
    assert [label.split("[")[1] for label in labels] == ["m/s]", "1/s]", "kPa]"]


def test_the_peak_is_marked_where_lamb_oseen_has_it():
    # 1.1209 core radii, the root of exp(x²) = 1 + 2x²: W. J. Devenport et al., J. Fluid Mech. 312 (1996) 67-106.
    plot = ProfilePlot(figure_of(960, 320))
    plot.update([VORTICES[0]], 998.0)
    marks = [line for line in plot.swirl.lines if line.get_marker() == "o" and len(line.get_xdata())]
    assert marks[0].get_xdata()[0] == pytest.approx(1.1209 * 0.005, rel=1e-4)


def test_artists_are_kept_and_limits_rest_until_settled():
    plot = ProfilePlot(figure_of(960, 320))
    plot.update(VORTICES[:2], 998.0)
    plot.settle()
    before, limits = [id(artist) for artist in plot.artists], (plot.swirl.get_xlim(), plot.swirl.get_ylim())
    plot.update([Vortex("lamb-oseen", circulation=3.6, core_radius=0.05)], 998.0)
    assert [id(artist) for artist in plot.artists] == before
    assert (plot.swirl.get_xlim(), plot.swirl.get_ylim()) == limits
    plot.settle()
    assert plot.swirl.get_xlim()[1] == pytest.approx(5.0 * 1.1209 * 0.05, rel=1e-3)
    assert plot.figure.legends[0].get_texts()[0].get_text() == "Lamb-Oseen"
    assert len(plot.figure.legends) == 1


def test_a_vortex_without_a_core_is_drawn_without_its_infinite_axis():
    plot = ProfilePlot(figure_of(960, 320))
    for vortex in (Vortex("free", circulation=0.36), Vortex("forced", rotation_rate=3.0)):
        plot.update([vortex], 998.0)
        plot.settle()
        assert np.isfinite(plot.swirl.get_ylim()).all()
        plot.figure.canvas.draw()


def test_a_fifth_vortex_is_refused():
    plot = ProfilePlot(figure_of(960, 320))
    with pytest.raises(ValueError, match="at most 4 vortices, got 5"):
        plot.update([VORTICES[0]] * 5, 998.0)


# Surveys --------------------------------------------------------------------------------------------------------------

TRUTH = Vortex("lamb-oseen", circulation=0.36, core_radius=0.005, centre=(0.0017, 0.0009))
LINE = np.concatenate([np.linspace(-0.06, -0.01, 12), np.linspace(-0.0095, 0.0095, 21), np.linspace(0.01, 0.06, 12)])


@pytest.fixture(scope="module")
def traverse() -> Survey:
    survey = Survey.simulated(TRUTH, position=LINE, along=True, noise=0.15, seed=3)
    return survey.without([3], reason="by hand").without([50], reason="by hand")


@pytest.fixture(scope="module")
def ranking(traverse):
    return rank_models(traverse)


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("with_curves", [True, False])
def test_survey_texts_fit_and_do_not_overlap(traverse, ranking, size, with_curves):
    plot = SurveyPlot(figure_of(*size))
    plot.update(traverse, ranking if with_curves else None)
    plot.settle()
    assert plot.residual_axes.get_visible() == with_curves
    assert_readable(plot.figure)


def test_a_picked_point_has_the_index_of_its_sample(traverse):
    plot = SurveyPlot(figure_of(640, 520))
    plot.update(traverse)
    plot.settle()
    plot.figure.canvas.draw()
    picked = []
    plot.figure.canvas.mpl_connect("pick_event", lambda event: picked.append(list(event.ind)))
    for index in (0, 3, 22, 50, 80):  # across, set aside, in the core, along and set aside, along
        x, y = plot.axes.transData.transform((traverse.x[index], traverse.velocity[index]))
        event = MouseEvent("button_press_event", plot.figure.canvas, x, y, MouseButton.LEFT)
        plot.figure.canvas.callbacks.process("button_press_event", event)
        plot.figure.pick(event) if not picked else None
        assert index in picked[-1]
        picked.clear()


def test_samples_in_use_and_set_aside_differ_in_shape(traverse):
    plot = SurveyPlot(figure_of(640, 520))
    plot.update(traverse)
    plot.settle()
    shapes = {
        line.get_marker(): line.get_xdata()
        for line in plot.axes.lines
        if len(line.get_xdata()) and line.get_alpha() != 0
    }
    across = traverse.direction[:, 1] == 1.0
    np.testing.assert_array_equal(shapes["o"], traverse.x[across & traverse.included])
    np.testing.assert_array_equal(shapes["s"], traverse.x[~across & traverse.included])
    np.testing.assert_array_equal(shapes["x"], traverse.x[list(traverse.set_aside)])


def test_a_sample_far_off_is_shown_at_the_edge_and_does_not_squash_the_rest():
    swirl = TRUTH.swirl(LINE[LINE > 0.0])
    swirl[4] = 900.0
    survey = Survey.radial(radius=LINE[LINE > 0.0], swirl=swirl, uncertainty=0.1).without([4], reason="outlier")
    plot = SurveyPlot(figure_of(640, 520))
    plot.update(survey)
    plot.settle()
    assert plot.axes.get_ylim()[1] < 20.0
    (triangle,) = [line for line in plot.axes.lines if line.get_marker() == "^"]
    assert triangle.get_xdata() == [survey.x[4]]
    assert plot.axes.get_ylim()[0] < triangle.get_ydata()[0] < plot.axes.get_ylim()[1]
    assert "radius" in plot.axes.get_xlabel()
    assert plot.axes.get_xlim()[0] == 0.0


def test_curves_pass_through_what_the_fit_expects_at_the_samples(traverse, ranking):
    plot = SurveyPlot(figure_of(640, 520))
    plot.update(traverse, ranking)
    plot.settle()
    best = ranking.best.fit
    expected = best.fitted[traverse.direction[traverse.in_plane][:, 1] == 1.0]
    x = traverse.x[traverse.in_plane & (traverse.direction[:, 1] == 1.0)]
    curve = max(
        (line for line in plot.axes.lines if line.get_linestyle() == "-" and len(line.get_xdata()) > 100),
        key=lambda line: float(np.ptp(line.get_ydata())),
    )
    np.testing.assert_allclose(np.interp(x, *curve.get_data()), expected, atol=0.01)


def test_survey_artists_are_kept_while_points_go_in_and_out(traverse, ranking):
    plot = SurveyPlot(figure_of(640, 520))
    plot.update(traverse, ranking)
    plot.settle()
    before = [id(artist) for artist in plot.artists]
    plot.update(traverse.without([10], reason="by hand"), ranking)
    assert [id(artist) for artist in plot.artists] == before
    (residuals,) = [line for line in plot.residual_axes.lines if line.get_marker() == "o"]
    assert not len(residuals.get_xdata())  # those of another set of points are not shown


@pytest.fixture(scope="module")
def field() -> Survey:
    x, y = np.linspace(-0.03, 0.03, 25), np.linspace(-0.02, 0.02, 17)
    return Survey.simulated(TRUTH, x=x, y=y, noise=0.15, seed=3).without([3], reason="by hand")


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("with_curves", [True, False])
def test_field_texts_fit_and_circles_are_round(field, size, with_curves):
    plot = PlanePlot(figure_of(*size))
    plot.update(field, rank_models(field, ["lamb-oseen", "kaufmann"]) if with_curves else None)
    plot.settle()
    assert_readable(plot.figure)
    box = plot.axes.get_window_extent()
    across, up = np.ptp(plot.axes.get_xlim()) / box.width, np.ptp(plot.axes.get_ylim()) / box.height
    assert across == pytest.approx(up, rel=1e-6)


def test_a_field_marks_the_centre_and_the_indices_of_a_station(field):
    plot = PlanePlot(figure_of(640, 520))
    plot.update(field, rank_models(field, ["lamb-oseen"]))
    plot.settle()
    (cross,) = [line for line in plot.axes.lines if line.get_marker() == "+"]
    assert (cross.get_xdata()[0], cross.get_ydata()[0]) == pytest.approx(TRUTH.centre, abs=2e-4)
    np.testing.assert_array_equal(plot.points.get_xdata(), field.x)
    stations = field.x.size // 2
    assert (field.x[7], field.y[7]) == (field.x[7 + stations], field.y[7 + stations])
