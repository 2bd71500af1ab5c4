"""A cross-check as one HTML page that needs nothing else."""

from __future__ import annotations

from html import escape
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from .cross_check import CrossCheck

_STYLE = """
body { font-family: sans-serif; margin: 2em; color: #111; }
table { border-collapse: collapse; }
th, td { border-bottom: 1px solid #bbb; padding: 0.3em 0.8em; text-align: left; }
td.number { font-family: monospace; text-align: right; }
tr.bad td { background: #fbe3d6; }
tr.none td { color: #777; }
p.verdict { font-size: 1.2em; }
"""


def page(check: CrossCheck) -> str:
    """The page; every text is escaped."""
    from .cross_check import EVIDENCE, _shown

    rows = []
    for row in check.rows:
        if row.value is None or row.error is None:
            cells = f"<td>{escape(row.route)}</td><td colspan='4'>{escape(row.note)}</td>"
            rows.append(f"<tr class='none'>{cells}<td>{escape(row.independent_of)}</td></tr>")
            continue
        digits = "reference" if row.agreement is None else f"{row.agreement:.1f}"
        doubt = f"<br>disagrees with {len(row.disagrees_with)}: {escape(', '.join(row.disagrees_with))}"
        rows.append(
            f"<tr{' class=' + chr(39) + 'bad' + chr(39) if row.disagrees_with else ''}>"
            f"<td>{escape(row.route)}{doubt if row.disagrees_with else ''}</td>"
            f"<td class='number'>{escape(_shown(row.value))}</td><td class='number'>{row.error:.1e}</td>"
            f"<td class='number'>{digits}</td><td class='number'>{row.seconds:.2f}</td>"
            f"<td>{escape(row.independent_of)}</td></tr>"
        )
    head = "".join(f"<th>{name}</th>" for name in ("route", "value", "error", "digits", "seconds", "independent of"))
    suspect = f"; suspect: {escape(check.suspect)}" if check.suspect else ""
    return (
        "<!DOCTYPE html>\n<html lang='en'><head><meta charset='utf-8'><title>Cross-check</title>"
        f"<style>{_STYLE}</style></head><body><h1>Cross-check</h1>"
        f"<p class='verdict'>{escape(check.verdict)}{suspect}</p>"
        f"<table><tr>{head}</tr>{''.join(rows)}</table><p>{escape(EVIDENCE)}</p></body></html>\n"
    )
