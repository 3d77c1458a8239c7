"""A page with everything on it, its texts hostile."""

import numpy as np
import pytest

from wavegen.core.table import Table
from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.power import CcdfCurve, ccdf_figure, density_figure
from wavegen.reports.pages.page import Page, Section

HOSTILE = (
    '<script>document.title="broken"</script><img src=x onerror=alert(1)> & "quotes" </pre>'
    "' onmouseover='alert(2)' </title></svg></script>--> ]]> {{ 7 * 7 }} {% raw %} $x^{2 "
    "\u202eturned\u202c \u05d0\u05d1 \x07\x00 \udc80 \u2028 two\nlines " + "w" * 400
)
"""Whatever might act in HTML, SVG, script, template or formula; marks that turn the reading."""


def picture(name: str, title: str = HOSTILE) -> Picture:
    level = np.arange(-10, 12, 0.05)
    share = np.exp(-(10 ** (level / 10)))
    curve = CcdfCurve(name=HOSTILE, level_db=level, probability=share)
    plain = CcdfCurve(name="loop", level_db=level, probability=share)
    return Picture(
        name=name,
        figure=ccdf_figure([plain, curve], title=title),
        caption=HOSTILE,
        alternative=HOSTILE,
    )


@pytest.fixture(scope="session")
def hostile_page() -> Page:
    level = np.arange(-10, 12, 0.05)
    share = np.exp(-(10 ** (level / 10)))
    density = Picture(
        name="density",
        figure=density_figure(level, -np.gradient(share, level), 1 - share, title=HOSTILE),
        caption="Two panels.",
        alternative="Two curves.",
    )
    table = Table(title=HOSTILE, headings=("name", HOSTILE), rows=((HOSTILE, "1"),) * 40)
    return Page(
        title=HOSTILE,
        summary=(HOSTILE, "A second sentence."),
        verdict=f"agrees {HOSTILE}",
        standing="good",
        warnings=(HOSTILE,),
        cautions=(HOSTILE,),
        sections=(
            Section(heading="Power", pictures=(picture("ccdf"), density), tables=(table,)),
            Section(heading=HOSTILE, pictures=(picture("again"),), text=HOSTILE),
        ),
        origin=(("file", HOSTILE),),
    )


@pytest.fixture(scope="session")
def hostile() -> str:
    return HOSTILE
