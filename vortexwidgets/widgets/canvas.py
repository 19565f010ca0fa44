"""A matplotlib figure inside a widget, redrawn by blitting."""

from __future__ import annotations

import asyncio
import io
from collections.abc import Callable, Sequence
from importlib.util import find_spec
from typing import TYPE_CHECKING, Any, Generic, Literal, Protocol, TypeVar

import ipywidgets

from vortexwidgets.widgets.frame import png_of

if TYPE_CHECKING:
    from IPython.display import Image
    from matplotlib.artist import Artist
    from matplotlib.figure import Figure

Theme = Literal["auto", "light", "dark"]
FrontEnd = Literal["auto", "canvas", "image"]
_DOTS_PER_INCH = 100
_REST = 0.15  # s without a change after which the figure is drawn in full: longer than one step of a held key


class Plot(Protocol):
    """What can be shown live: artists that move, and a tidying of the axes once they rest."""

    @property
    def artists(self) -> Sequence[Artist]:
        """The artists that change with the value shown."""

    def settle(self) -> None:
        """Fit the axes to what is shown now."""


_Shown = TypeVar("_Shown", bound=Plot)


class LiveFigure(ipywidgets.Box, Generic[_Shown]):
    """A figure that follows a value: blitted while it moves, drawn once in full when it rests.

    The figure is made without pyplot, so nothing but this widget holds it, and `close` frees it.

    Parameters
    ----------
    make_plot : callable
        Called once with the empty figure and `theme`, "light" or "dark"; returns the plot to show.
    size : (int, int)
        Width and height. [px]
    theme : {"auto", "light", "dark"}
        Colours of the figure; "auto" draws a light one, whose lightness the browser turns round on a dark page.
    front_end : {"auto", "canvas", "image"}
        "canvas" is ipympl's canvas with zoom, pan and picking; "image" needs nothing beyond ipywidgets. "auto" shows an
        image until ipympl's front end answers that it is there, and the canvas from then on.
    rest : float
        Time without a change after which the figure is drawn in full. [s]

    Attributes
    ----------
    figure : matplotlib.figure.Figure
    plot : object
        What `make_plot` returned.
    """

    canvas: Any = None  # also before the constructor has finished and after close, which is then called once more
    _timer: asyncio.TimerHandle | None = None

    def __init__(
        self,
        make_plot: Callable[..., _Shown],
        *,
        size: tuple[int, int] = (620, 480),
        theme: Theme = "auto",
        front_end: FrontEnd = "auto",
        rest: float = _REST,
    ) -> None:
        super().__init__()
        if front_end not in ("auto", "canvas", "image"):
            raise ValueError(f"front_end must be 'auto', 'canvas' or 'image', got {front_end!r}.")
        self.add_class("vx-figure")
        if theme == "auto":
            self.add_class("vx-follow")
        self._size, self._rest = size, rest
        self._background: Any = None
        self.figure = _new_figure(size)
        self.canvas = _new_canvas(self.figure, front_end)
        self.plot = make_plot(self.figure, theme="dark" if theme == "dark" else "light")
        self._connection = self.canvas.mpl_connect("draw_event", self._on_draw)
        self._picture = ipywidgets.Image(format="png", width=size[0], height=size[1])
        self._picture.add_class("vx-picture")
        self.children: tuple[Any, ...] = (self.canvas if front_end == "canvas" else self._picture,)
        if front_end == "auto" and isinstance(self.canvas, ipywidgets.Widget):
            self.canvas.on_msg(self._on_front_end)
        self.redraw()

    @property
    def is_interactive(self) -> bool:
        """Whether ipympl's canvas is shown, where points can be picked."""
        return self.children == (self.canvas,)

    def moved(self) -> None:
        """Show the plot's moving artists as they are now, and everything else when they come to rest."""
        if self._background is None:
            self.redraw()
            return
        self.canvas.restore_region(self._background)
        self._paint()
        self._show_frame()
        try:
            loop = asyncio.get_running_loop()
        except RuntimeError:  # a plain script: nobody would call back
            self.redraw()
            return
        self._cancel()
        self._timer = loop.call_later(self._rest, self.redraw)

    def redraw(self) -> None:
        """Fit the axes to the plot and draw all of it."""
        self._cancel()
        for artist in self.plot.artists:
            artist.set_animated(True)
        self.plot.settle()
        self.canvas.draw()  # not draw_idle: that waits for a browser, and hides errors where there is none
        if not self.is_interactive:
            self._send_picture()

    def png(self, *, dots_per_inch: int = 150) -> bytes:
        """Return the figure as it is now as a PNG picture."""
        if self._timer is not None:  # what moved last has not come to rest yet, and the axes are those of before
            self.redraw()
        moving = list(self.plot.artists)
        for artist in moving:  # savefig leaves animated artists out
            artist.set_animated(False)
        try:
            buffer = io.BytesIO()
            self.figure.savefig(buffer, format="png", dpi=dots_per_inch)
        finally:
            for artist in moving:
                artist.set_animated(True)
        return buffer.getvalue()

    def freeze(self) -> Image:
        """Return a picture that stays in the saved notebook when there is no kernel any more."""
        from IPython.display import Image

        return Image(self.png(), format="png", width=self._size[0], alt="frozen picture of the panel")

    def on_pick(self, action: Callable[[int], object]) -> None:
        """Call `action` with the index of each point of the plot that is clicked."""
        self.canvas.mpl_connect("pick_event", lambda event: action(int(event.ind[0])))

    def close(self) -> None:
        """Disconnect, and free the figure and its widgets."""
        self._cancel()
        if self.canvas is not None:
            self.canvas.mpl_disconnect(self._connection)
            self.children = ()
            self._picture.close()
            if isinstance(self.canvas, ipywidgets.Widget):
                self.canvas.close()
            # The figure is not cleared: an interpreter that is shutting down comes here too, and could not do it.
            self.canvas = self.figure = self.plot = self._background = None  # type: ignore[assignment]
        super().close()

    def _cancel(self) -> None:
        if self._timer is not None:
            self._timer.cancel()
        self._timer = None

    def _paint(self) -> None:
        for artist in self.plot.artists:
            axes = getattr(artist, "axes", None)
            if axes is not None:
                axes.draw_artist(artist)

    def _on_draw(self, _: object) -> None:
        # Also after a zoom, a resize and a change of the screen's pixel ratio, which the canvas does by itself.
        self._background = self.canvas.copy_from_bbox(self.figure.bbox)
        self._paint()

    def _show_frame(self) -> None:
        if self.is_interactive:
            self.canvas.blit()
        else:
            self._send_picture()

    def _send_picture(self) -> None:
        self._picture.value = png_of(self.canvas)

    def _on_front_end(self, _: object, content: dict[str, Any], buffers: object) -> None:
        if content.get("type") == "initialized" and not self.is_interactive:
            self.children = (self.canvas,)


def _new_figure(size: tuple[int, int]) -> Figure:
    from matplotlib.figure import Figure

    return Figure(figsize=(size[0] / _DOTS_PER_INCH, size[1] / _DOTS_PER_INCH), dpi=_DOTS_PER_INCH)


def _new_canvas(figure: Figure, front_end: FrontEnd) -> Any:
    if front_end == "image" or (front_end == "auto" and find_spec("ipympl") is None):
        from matplotlib.backends.backend_agg import FigureCanvasAgg

        return FigureCanvasAgg(figure)
    from vortexwidgets.widgets.whole_frames import WholeFrameCanvas

    return WholeFrameCanvas(figure)
