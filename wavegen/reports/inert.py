"""Text from files and recipes, made fit for pages and pictures: nothing in it acts."""

from __future__ import annotations

from wavegen.reports.text import visible

_NO_CHARACTERS = str.maketrans({0xFFFE: "\\ufffe", 0xFFFF: "\\uffff"})
"""XML 1.0 (section 2.2) holds neither, though both are valid in Unicode text."""


def inert(text: str) -> str:
    r"""Return a text that can be written as XML and HTML, with all that acts spelt out.

    Parameters
    ----------
    text : str
        Anything, lone halves of surrogate pairs too, as names of files hold them.

    Returns
    -------
    str
        Line ends and tabs are kept. A mark that turns the direction of writing is spelt out: a
        figure behind one would be read backwards.

    Examples
    --------
    >>> inert("run\u202e7\x07")
    'run\\u202e7\\x07'
    """
    return visible(text).translate(_NO_CHARACTERS)


def one_line(text: str) -> str:
    r"""Return a text on one line, inert.

    Examples
    --------
    >>> one_line("two\n lines")
    'two lines'
    """
    return inert(" ".join(text.split()))
