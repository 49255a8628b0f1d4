"""How all charts look: white ground, our fonts, Okabe and Ito's colours for lines; and the name that a picture is saved under."""

from html import escape
from textwrap import wrap

from ..report.surfaces import FAINT, GREEN, INK, LINE, QUIET, SEVERITY, SOFT

__all__ = ["FAINT", "GREEN", "INK", "LINE", "QUIET", "SEVERITY", "SKY", "SOFT", "for_file", "image_options", "lines_of", "plain", "turned_out"]

SKY = "#56b4e9"
FONT = 'system-ui, "Helvetica Neue", Arial, sans-serif'
_LEGEND = 26  # px a line


def turned_out(figure, title, below, file_name, *, plot_height, top=0, bottom=54, legend=True, **layout):
    """The figure with title, the lines of text `below` it, margins in px around a plot of `plot_height` px, and a legend under all.

    top: px kept free above the plot for labels. file_name: what its picture is called, see `image_options`.
    """
    small = "".join(f'<br><span style="font-size:12px;color:{SOFT}">{line}</span>' for line in below)
    heading = {"text": plain(title) + small, "font": {"size": 16}, "x": 0, "xref": "paper", "xanchor": "left", "y": 1, "yanchor": "top", "pad": {"t": 20}}
    margin = {"l": 76, "r": 24, "t": 52 + 19 * len(below) + top, "b": bottom + (_LEGEND if legend else 0)}
    under = {"orientation": "h", "x": 0, "xanchor": "left", "y": -bottom / plot_height, "yanchor": "top", "traceorder": "normal"}
    figure.update_layout(title=heading, template="plotly_white", font={"family": FONT, "size": 12, "color": INK}, margin=margin, legend=under,
                         height=plot_height + margin["t"] + margin["b"], meta={"file_name": file_name}, showlegend=legend,
                         plot_bgcolor="rgba(0,0,0,0)", hoverlabel={"font": {"family": FONT, "size": 12}, "align": "left", "namelength": -1})
    figure.update_xaxes(title_font_size=12)
    figure.update_yaxes(title_font_size=12)
    return figure.update_layout(**layout)


def image_options(figure) -> dict:
    """What to hand to `figure.show(config=...)` or `figure.write_html(..., config=...)` so that the button of the mode bar saves the
    picture under a name that says what it shows, twice as fine as the screen.

    A figure cannot hold this itself: plotly keeps it apart from the figure.
    """
    name = (figure.layout.meta or {}).get("file_name", "chart")
    return {"displaylogo": False, "toImageButtonOptions": {"format": "png", "filename": name, "scale": 2}}


def plain(text):
    """A text that plotly shows as it is written, whatever signs a name holds."""
    return escape(str(text), quote=False)


def lines_of(text, width=100):
    """A text as lines of at most `width` signs, for headings and hover labels."""
    return [plain(line) for line in wrap(str(text), width)]


def for_file(*words):
    """A file name, without its ending, from words: letters, digits and dashes."""
    signs = "".join(sign if sign.isalnum() else "-" for sign in "-".join(str(word) for word in words))
    return "-".join(part for part in signs.split("-") if part)[:80]
