"""Reading integrands from text: a small grammar, read by recursive descent; nothing is evaluated as code."""

from __future__ import annotations

import re
from collections.abc import Callable

from ..errors import InputError
from ..exact import ZERO, Exact
from ..ratios import shown
from .algebra import Integrand, Powers, Term, monomial, parke_taylor

MAX_TEXT = 1_000_000
MAX_DEPTH = 100

# ASCII only; blanks separate.  A fraction is read as a division, which is the same for every left-to-right product.
_TOKEN = re.compile(
    r"(?P<number>(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?[ij]?)|(?P<name>PT|z[0-9]*)|(?P<power>\*\*|\^)"
    r"|(?P<sign>[-+*/(),])",
    re.ASCII,
)
_BLANK = re.compile(r"[ \t\r\n]*")
_GRAMMAR = "sums and products of numbers, PT(1,2,...), z(1,2) or z12, with integer powers ^"


def parse_integrand(text: str) -> Integrand:
    """Read an integrand from text; nothing is ever evaluated as code.

    Numbers (``2``, ``1/3``, ``0.25``, ``1e-3``, ``2j``), Parke-Taylor factors ``PT(1,2,3)``, differences ``z(1,2)`` or,
    for labels below ten, ``z12``; joined by ``+ - * /``, integer powers ``^`` (or ``**``), and brackets.

    Raises
    ------
    InputError
        With the position of what could not be read.

    Examples
    --------
    >>> print(parse_integrand("2*PT(1,2)*PT(3,4) - 1/3*z12^-2*z34^-2"))
    5/3*z12^-2*z34^-2
    """
    if not isinstance(text, str):
        raise InputError("integrand", shown(text), "text: " + _GRAMMAR)
    return _Parser(text).parse()


class _Parser:
    """Recursive descent over the tokens of one text."""

    def __init__(self, text: str) -> None:
        if len(text) > MAX_TEXT:
            raise InputError("integrand", f"a text of {len(text)} characters", f"at most {MAX_TEXT} characters")
        self.text = text
        self.tokens: list[tuple[str, str, int]] = []
        self.at = 0
        self.depth = 0
        position = 0
        while True:
            blank = _BLANK.match(text, position)
            position = blank.end() if blank else position
            if position >= len(text):
                break
            match = _TOKEN.match(text, position)
            if match is None:
                raise self.error(position, _GRAMMAR)
            self.tokens.append((str(match.lastgroup), match.group(), position))
            position = match.end()
        self.tokens.append(("end", "", len(text)))

    def error(self, position: int, expected: str) -> InputError:
        rest = self.text[position : position + 20]
        found = f"{rest!r}" if rest else "the end of the text"
        return InputError("integrand", f"{found} at character {position + 1}", expected)

    def next_is(self, *texts: str) -> bool:
        kind, text, _ = self.tokens[self.at]
        return kind in ("sign", "power") and text in texts

    def take(self) -> tuple[str, str, int]:
        token = self.tokens[self.at]
        self.at += 1
        return token

    def require(self, text: str) -> None:
        if not self.next_is(text):
            raise self.error(self.tokens[self.at][2], repr(text))
        self.at += 1

    def parse(self) -> Integrand:
        result = self.sum()
        kind, _, position = self.tokens[self.at]
        if kind != "end":
            raise self.error(position, "an operator, or the end of the text")
        return result

    def sum(self) -> Integrand:
        collected: dict[Powers, Exact] = {}
        negative = False
        while True:
            for term in self.product().terms:
                c = -term.coefficient if negative else term.coefficient
                collected[term.powers] = collected.get(term.powers, ZERO) + c
            if not self.next_is("+", "-"):
                return Integrand(Term(c, powers) for powers, c in collected.items())
            negative = self.take()[1] == "-"

    def product(self) -> Integrand:
        result = self.factor()
        while self.next_is("*", "/"):
            _, operator, position = self.take()
            kind, text, start = self.tokens[self.at]
            if operator == "/" and kind == "number" and text[-1] in "ij":
                # "1/2j" is 1/(2j) by the rules of division and j/2 in the notation for numbers: refuse both readings
                raise self.error(start, "brackets around an imaginary divisor, or the unit in front: 1j/2")
            right = self.factor()
            times = operator == "*"
            result = self.guarded(position, _multiplier(right) if times else _divider(right), result)
        return result

    def factor(self) -> Integrand:
        negative = False
        while self.next_is("+", "-"):
            negative ^= self.take()[1] == "-"
        result = self.atom()
        if self.next_is("^", "**"):
            position = self.take()[2]
            exponent = self.exponent()
            result = self.guarded(position, lambda a: a**exponent, result)
            if self.next_is("^", "**"):
                raise self.error(self.tokens[self.at][2], "brackets around a power that is raised again")
        return -result if negative else result

    def guarded(self, position: int, operation: Callable[[Integrand], Integrand], value: Integrand) -> Integrand:
        try:
            return operation(value)
        except InputError as error:
            raise InputError("integrand", f"{error.found} at character {position + 1}", error.expected) from None

    def exponent(self) -> int:
        bracket = self.next_is("(")
        self.at += bracket
        negative = self.next_is("+", "-") and self.take()[1] == "-"
        kind, text, position = self.take()
        if kind != "number" or not text.isdigit() or len(text) > 9:
            raise self.error(position, "an integer exponent")
        if bracket:
            self.require(")")
        return -int(text) if negative else int(text)

    def atom(self) -> Integrand:
        kind, text, position = self.take()
        if kind == "number":
            return self.guarded(position, lambda one: one * text, monomial({}))
        if kind == "name":
            if text == "PT":
                labels = self.labels()
                return self.guarded(position, lambda _: parke_taylor(*labels), _NONE)
            if len(text) == 1:
                labels = self.labels()
            elif len(text) == 3:
                labels = [int(text[1]), int(text[2])]
            else:
                raise self.error(position, "z12 (two labels below ten) or z(1,2)")
            if len(labels) != 2:
                raise self.error(position, "two labels: z(1,2)")
            return self.guarded(position, lambda _: monomial({(labels[0], labels[1]): 1}), _NONE)
        if (kind, text) == ("sign", "("):
            self.depth += 1
            if self.depth > MAX_DEPTH:
                raise self.error(position, f"brackets at most {MAX_DEPTH} deep")
            inner = self.sum()
            self.require(")")
            self.depth -= 1
            return inner
        raise self.error(position, _GRAMMAR)

    def labels(self) -> list[int]:
        self.require("(")
        found = []
        while True:
            kind, text, position = self.take()
            if kind != "number" or not text.isdigit() or len(text) > 6:
                raise self.error(position, "a label: an integer from 1 on")
            found.append(int(text))
            if self.next_is(")"):
                self.at += 1
                return found
            self.require(",")


def _multiplier(right: Integrand) -> Callable[[Integrand], Integrand]:
    return lambda left: left * right


def _divider(right: Integrand) -> Callable[[Integrand], Integrand]:
    return lambda left: left / right


_NONE = Integrand()
