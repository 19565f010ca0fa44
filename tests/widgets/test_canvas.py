import asyncio
import gc
import io
import weakref

import numpy as np
import pytest
from PIL import Image

from vortexwidgets.widgets.canvas import LiveFigure


class Line:
    """A plot of one line, which counts how often it was settled."""

    def __init__(self, figure, theme):
        self.axes = figure.add_subplot()
        self.axes.set_xlim(0, 1)
        self.axes.set_ylim(0, 1)
        (self.line,) = self.axes.plot([0, 1], [0.5, 0.5], linewidth=5)
        self.artists = [self.line]
        self.settled = 0

    def settle(self):
        self.settled += 1


def pixels(png):
    return np.asarray(Image.open(io.BytesIO(png)).convert("RGB")).astype(int)


def dark_rows(png):
    """Rows that differ from the white of the axes at the middle column."""
    picture = pixels(png)
    middle = picture[:, picture.shape[1] // 2]
    return np.flatnonzero(abs(middle - 255).sum(axis=1) > 150)


@pytest.fixture
def live():
    figure = LiveFigure(Line, size=(300, 200), front_end="image")
    yield figure
    figure.close()


def test_the_image_shows_the_line(live):
    assert live.children == (live._picture,)
    assert dark_rows(live._picture.value).size > 0


def test_moved_blits_the_line_without_leaving_the_old_one_behind(live):
    async def drag():
        live.plot.line.set_ydata([0.8, 0.8])
        live.moved()

    before = dark_rows(live._picture.value)
    asyncio.run(drag())
    after = dark_rows(live._picture.value)
    assert after.max() < len(pixels(live._picture.value))
    inside = slice(3, -3)  # the first and last dark rows are the frame and the ticks
    assert set(after[inside]) != set(before[inside])
    live.redraw()
    np.testing.assert_array_equal(dark_rows(live._picture.value), after)


def test_a_dragged_figure_settles_once_at_rest(live):
    async def drag():
        start = live.plot.settled
        for _ in range(5):
            live.moved()
        assert live.plot.settled == start
        await asyncio.sleep(0.3)
        assert live.plot.settled == start + 1

    asyncio.run(drag())


def test_without_an_event_loop_the_figure_is_drawn_at_once(live):
    start = live.plot.settled
    live.moved()
    assert live.plot.settled == start + 1


def test_png_contains_the_moving_artists(live):
    rows = dark_rows(live.png(dots_per_inch=100))
    height = 200
    assert np.any(abs(rows - height / 2) < 20)
    assert live.plot.line.get_animated()


def test_freeze_returns_a_picture_for_the_notebook(live):
    frozen = live.freeze()
    data, _ = frozen._repr_mimebundle_()
    assert "image/png" in data


def test_auto_swaps_to_the_canvas_when_the_front_end_answers():
    live = LiveFigure(Line, size=(300, 200), front_end="auto")
    assert not live.is_interactive
    live.canvas._handle_custom_msg({"type": "initialized"}, [])
    assert live.is_interactive
    live.close()


def test_auto_does_without_ipympl(monkeypatch):
    monkeypatch.setattr("vortexwidgets.widgets.canvas.find_spec", lambda _: None)
    live = LiveFigure(Line, size=(300, 200), front_end="auto")
    assert not live.is_interactive
    live.moved()
    live.close()


def test_canvas_is_shown_when_asked_for():
    live = LiveFigure(Line, size=(300, 200), front_end="canvas")
    assert live.is_interactive
    live.close()


def test_an_unknown_front_end_is_refused():
    with pytest.raises(ValueError, match="'auto', 'canvas' or 'image', got 'paper'"):
        LiveFigure(Line, front_end="paper")


@pytest.mark.parametrize("front_end", ["canvas", "image"])
def test_close_frees_the_figure(front_end):
    live = LiveFigure(Line, size=(300, 200), front_end=front_end)
    figure = weakref.ref(live.figure)
    live.close()
    del live
    gc.collect()
    assert figure() is None


def test_no_figure_is_left_with_pyplot(live):
    from matplotlib import pyplot

    assert pyplot.get_fignums() == []
