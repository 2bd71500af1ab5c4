"""How results look in a notebook and in a paper: HTML, LaTeX, tables.

The digits are those of :mod:`.text`: a value ends where its error begins.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from html import escape
from typing import TYPE_CHECKING, Any

from .text import value_with_error

if TYPE_CHECKING:
    from ..estimate import Estimate

_POWER = re.compile(r"(?P<digits>[\d.]+)e(?P<sign>[+-])0*(?P<power>\d+)")


def latex_number(text: str) -> str:
    r"""A number as this package prints it, in LaTeX (for math mode).

    >>> latex_number("(1.250 - 0.500j) +- 1e-3")
    '(1.250 - 0.500\\mathrm{i}) \\pm 10^{-3}'
    """

    def power(match: re.Match[str]) -> str:
        sign = "-" if match["sign"] == "-" else ""
        tens = f"10^{{{sign}{match['power']}}}"
        return tens if match["digits"] == "1" else rf"{match['digits']} \times {tens}"

    text = _POWER.sub(power, text)
    for ours, theirs in (("+-", r"\pm"), ("inf", r"\infty"), ("nan", r"\mathrm{nan}"), ("j", r"\mathrm{i}")):
        text = text.replace(ours, theirs)
    return text


def latex_of(estimate: Estimate) -> str:
    """The value with its error, in math mode; what is not ok is said beside it."""
    number = latex_number(value_with_error(estimate.value, estimate.error, estimate.digits))
    return f"${number}$" if estimate.ok else rf"${number}\quad\textsf{{({_latex_text(estimate.status.name)})}}$"


def html_of(estimate: Estimate) -> str:
    """A small table: value, error, and what to do where it is not ok."""
    number = value_with_error(estimate.value, estimate.error, estimate.digits)
    rows = [("value", f"<code>{escape(number.replace('+-', '±'))}</code>")]
    if not estimate.ok:
        rows += [("status", f"<b>{estimate.status.name}</b>"), ("advice", escape(estimate.status.advice))]
    rows += [("method", escape(estimate.method)), ("evaluations", str(estimate.evaluations))]
    return html_table((), rows)


def html_table(head: Iterable[str], rows: Iterable[Iterable[str]]) -> str:
    """A table of cells that are HTML already."""
    lines = "".join(f"<th>{name}</th>" for name in head)
    body = "".join("<tr>" + "".join(f"<td>{cell}</td>" for cell in row) + "</tr>" for row in rows)
    return "<table>" + (f"<tr>{lines}</tr>" if lines else "") + body + "</table>"


def latex_table(results: Any, caption: str | None = None, label: str | None = None) -> str:
    r"""Results as a LaTeX table, each value cut where its error begins.

    Parameters
    ----------
    results
        ``{name: Estimate}``, or a :class:`~kn_integrate.Scan`, whose coordinates become columns.
    caption, label
        For the table; without a caption it is a bare ``tabular``.

    Examples
    --------
    >>> from kn_integrate import Estimate, Status
    >>> print(latex_table({"$n = 5$": Estimate(25.914922073927123, 3.2e-12, Status.OK, "quadrature")}))
    \begin{tabular}{ll}
    \hline
     & value \\
    \hline
    $n = 5$ & $25.914922073927 \pm 4 \times 10^{-12}$ \\
    \hline
    \end{tabular}
    """
    if isinstance(results, Mapping):
        head = ["", "value"]
        rows = [[name, latex_of(estimate)] for name, estimate in results.items()]
    else:
        head = [*(_coordinate(name) for name in results.names), "value"]
        rows = [
            [*(_exact(row.coordinates.get(name, "")) for name in results.names), _row_value(row)] for row in results
        ]
    lines = [rf"\begin{{tabular}}{{{'l' * len(head)}}}", r"\hline", " & ".join(head) + r" \\", r"\hline"]
    lines += [" & ".join(row) + r" \\" for row in rows]
    lines += [r"\hline", r"\end{tabular}"]
    if caption is None:
        return "\n".join(lines)
    mark = [] if label is None else [rf"\label{{{label}}}"]
    return "\n".join([r"\begin{table}", r"\centering", *lines, rf"\caption{{{caption}}}", *mark, r"\end{table}"])


def _row_value(row: Any) -> str:
    if row.value is None:
        return rf"\textsf{{{_latex_text(row.status)}}}"
    number = latex_number(value_with_error(row.value, row.error, row.digits))
    return f"${number}$" if row.ok else rf"${number}$ \textsf{{({_latex_text(row.status)})}}"


def _coordinate(name: str) -> str:
    return f"$X_{{{name}}}$" if name[:1].isdigit() else _latex_text(name)


def _exact(text: str) -> str:
    """A coordinate: numbers in math mode, fractions upright on the line."""
    return f"${latex_number(text)}$" if re.fullmatch(r"[-+\d./ej]+", text) else _latex_text(text)


def _latex_text(text: str) -> str:
    return re.sub(r"([_%&#$])", r"\\\1", text)
