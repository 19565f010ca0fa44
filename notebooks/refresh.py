"""Run the notebooks, and keep them as small files without machine traces: python notebooks/refresh.py [name ...]."""

from __future__ import annotations

import base64
import io
import sys
from pathlib import Path

_COLOURS = 64  # of a picture; line art needs no more, and the file is a third


def refresh(path: Path) -> None:
    """Execute a notebook in place, drop what only a running kernel can use, and shrink its pictures."""
    import nbformat
    from nbclient import NotebookClient

    notebook = nbformat.read(path, as_version=4)
    NotebookClient(notebook, timeout=120, resources={"metadata": {"path": str(path.parent)}}).execute()
    notebook.metadata = {
        "kernelspec": {"display_name": "Python 3", "language": "python", "name": "python3"},
        "language_info": {"name": "python"},
    }
    for cell in notebook.cells:
        cell.metadata.pop("execution", None)  # times of the run, different each time
        for output in cell.get("outputs", ()):
            data = output.get("data", {})
            if "image/png" in data:
                data["image/png"] = _smaller(data["image/png"])
    nbformat.validate(notebook)
    nbformat.write(notebook, path)


def _smaller(picture: str) -> str:
    from PIL import Image

    image = Image.open(io.BytesIO(base64.b64decode(picture))).convert("RGB")
    buffer = io.BytesIO()
    image.quantize(_COLOURS, dither=Image.Dither.NONE).save(buffer, format="png", optimize=True)
    return base64.b64encode(buffer.getvalue()).decode("ascii")


if __name__ == "__main__":
    here = Path(__file__).parent
    for name in sys.argv[1:] or sorted(path.stem for path in here.glob("*.ipynb")):
        refresh(here / f"{name}.ipynb")
