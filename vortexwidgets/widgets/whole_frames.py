"""ipympl's canvas, which here sends whole frames instead of differences."""

from __future__ import annotations

from typing import Any

from ipympl.backend_nbagg import Canvas, FigureManager

from vortexwidgets.widgets.frame import png_of


class WholeFrameCanvas(Canvas):
    """A canvas that never leaves holes.

    ipympl sends what changed since the last frame, and its front end drops a frame that is followed too closely by the
    next one: what changed in the dropped frame alone would be missing from then on. A whole frame at the lowest
    compression also takes less time than finding and packing the difference at the usual one.

    Parameters
    ----------
    figure : Figure
        It is shown without header and footer.
    """

    _png_is_old: Any

    def __init__(self, figure: Any) -> None:
        super().__init__(figure)
        FigureManager(self, 0)
        self.header_visible = False
        self.footer_visible = False
        self.toolbar_position = "right"
        self.syncing_data_url = False  # the panel keeps a picture of its own for readers without a kernel

    def get_diff_image(self) -> bytes | None:
        """Return the frame as a PNG picture, None when it has not changed."""
        if not self._png_is_old:
            return None
        self.set_image_mode("full")
        self._png_is_old = False
        return png_of(self)

    def close(self) -> None:
        """Free the canvas and its toolbar."""
        if self.manager is not None:
            self.manager.toolbar.close()
        super().close()
