"""What a canvas shows, as a PNG picture to send."""

from __future__ import annotations

import io
from typing import Any

import numpy as np
from PIL import Image


def png_of(canvas: Any) -> bytes:
    """Return what an Agg canvas shows as a PNG picture, packed for speed and not for size."""
    buffer = io.BytesIO()
    Image.fromarray(np.asarray(canvas.buffer_rgba())).save(buffer, format="png", compress_level=1)
    return buffer.getvalue()
