"""A study under tolerances as HTML tables, for a page."""

from html import escape

from ..spread.study import MEANING
from . import studied
from .html_tables import table


def study_html(study) -> str:
    """The section of a page: chances, what to measure better first, how far off the cell may be, and what that means."""
    rows, first = studied.chance_rows(study), studied.sensitivity_rows(study)
    parts = [f"<h2>Under tolerances</h2><p><b>{escape(studied.verdict_words(study))}</b></p><p>{escape(studied.given_words(study))}</p>"]
    if study.dimensions:
        head = ("", "finding", "chance", "as stated", "at the worst")
        parts.append(_wide(table(head, rows)) if rows else "<p>No draw is flagged.</p>")
    if first:
        parts.append(f"<h2>{escape(studied.sensitivity_head(study))}</h2>{_wide(table(('dimension', 'of the variance', 'change', 'stated'), first))}")
        parts.append(f"<p>{escape(studied.sensitivity_check(study))}</p>")
    parts.append(f"<h2>{escape(studied.reserve_head(study))}</h2>{_wide(table(('dimension', 'one way', 'the other way'), studied.reserve_rows(study)))}")
    return "\n".join([*parts, *(f"<p>{escape(line)}</p>" for line in (*studied.together_lines(study), *MEANING))])


def _wide(content):
    return f'<div class="pa-wide">{content}</div>'
