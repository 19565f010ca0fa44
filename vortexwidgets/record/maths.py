"""Formulas of the record: LaTeX as MathML, and the font that makes it readable everywhere."""

from __future__ import annotations

import base64
import html
import re
from functools import cache
from pathlib import Path
from xml.etree import ElementTree

_FONT = Path(__file__).parent / "fonts" / "stix-two-math-subset.woff2"
_NAMESPACE = "{http://www.w3.org/1998/Math/MathML}"

# Elements of MathML Core that formulas are made of. The converter passes text on unescaped, so what else it may hold is
# not let into a page.
_ELEMENTS = frozenset(
    ["math", "merror", "mfrac", "mi", "mmultiscripts", "mn", "mo", "mover", "mpadded", "mphantom", "mroot", "mrow",
     "mspace", "msqrt", "mstyle", "msub", "msubsup", "msup", "mtable", "mtd", "mtext", "mtr", "munder", "munderover"]
)  # fmt: skip


def mathml(latex: str, *, display: bool = True) -> str:
    """Return LaTeX as presentation MathML.

    Parameters
    ----------
    latex : str
        Without dollar signs.
    display : bool
        Whether it stands on a line of its own, with fractions and integrals in full size.

    Returns
    -------
    str
        One ``math`` element and nothing but formula in it. LaTeX that cannot be converted is shown as it is, escaped.

    Examples
    --------
    >>> mathml("v^2", display=False)
    '<math xmlns="http://www.w3.org/1998/Math/MathML" display="inline"><msup><mi>v</mi><mn>2</mn></msup></math>'
    """
    from latex2mathml.converter import convert

    try:
        found = ElementTree.fromstring(str(convert(_simpler(latex), display="inline")))
    except Exception:  # the converter's errors have no common ancestor below this one
        return _as_it_is(latex)
    if any(element.tag.removeprefix(_NAMESPACE) not in _ELEMENTS for element in found.iter()):
        return _as_it_is(latex)
    for element in found.iter():
        element.tag = element.tag.removeprefix(_NAMESPACE)
        text = element.text or ""
        if element.tag == "mo" and (text.isalpha() or text == "∞"):  # spaced as a name, not as an operator
            element.tag = "mtext" if len(text) == 1 and text.isalpha() else "mi"
    found.attrib = {"xmlns": _NAMESPACE[1:-1], **found.attrib}
    if display:
        found.set("displaystyle", "true")
    outer = list(found)
    if len(outer) == 1 and outer[0].tag == "mrow":
        found[:] = list(outer[0])
    return ElementTree.tostring(found, encoding="unicode", short_empty_elements=False)


def formulas(latex: str) -> list[str]:
    r"""Return LaTeX as one formula for each part between wide spaces, so that a narrow page can break the line there.

    Parameters
    ----------
    latex : str
        Parts are separated by ``\quad`` or ``\qquad``, outside of braces and environments.

    Returns
    -------
    list of str
        Each as from `mathml`.

    Examples
    --------
    >>> len(formulas(r"F(0) = 0, \quad K = \frac{1}{2}"))
    2
    """
    return [mathml(part) for part in _parts(latex)]


def _parts(latex: str) -> list[str]:
    parts, depth, start = [], 0, 0
    for found in re.finditer(r"\\\\|\\[{}]|[{}]|\\begin|\\end|\\(?:left|right)(?!arrow)|\\q?quad", latex):
        sign = found[0]
        if sign in ("{", "\\begin", "\\left"):
            depth += 1
        elif sign in ("}", "\\end", "\\right"):
            depth -= 1
        elif sign.endswith("quad") and depth == 0:
            parts.append(latex[start : found.start()])
            start = found.end()
    parts.append(latex[start:])
    return [part.strip().rstrip(",").strip() for part in parts if part.strip(" ,")]


def _simpler(latex: str) -> str:
    """LaTeX without what only moves things by a hair, which the converter does not know."""
    text = re.sub(r"\\(?:displaystyle|textstyle|limits|nolimits|!)(?![A-Za-z])", "", latex)
    text = re.sub(r"\\mathrm\{([A-Za-z]+)\}", r"\\text{\1}", text)  # the converter would set one letter in italics
    for old, new in ((r"\operatorname*", r"\operatorname"), (r"\dfrac", r"\frac"), (r"\tfrac", r"\frac")):
        text = text.replace(old, new)
    return text


def _as_it_is(latex: str) -> str:
    return f"<code>{html.escape(latex)}</code>"


@cache
def font_rule() -> str:
    """CSS rule that brings the maths font along, as a data URL."""
    data = base64.b64encode(_FONT.read_bytes()).decode("ascii")
    return (
        '@font-face{font-family:"Record Math";font-display:block;'
        f'src:url("data:font/woff2;base64,{data}") format("woff2")}}'
    )
