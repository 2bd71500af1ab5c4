"""From text to nodes, by recursive descent.

Grammar (spaces are free)::

    sum     = product { ("+" | "-") product }
    product = signed { ("*" | "/") signed }
    signed  = [ "+" | "-" ] signed | power
    power   = atom [ ("^" | "**") signed ]
    atom    = number | "i" | "pi" | s12 | s.1.10 | X.1.2.3 | parameter | "(" sum ")" | function "(" arguments ")"
"""

from __future__ import annotations

import re
from collections.abc import Collection
from dataclasses import dataclass
from difflib import get_close_matches
from fractions import Fraction
from typing import NoReturn

from ...errors import InputError
from ...exact import Exact
from .nodes import Call, Invariant, Node, Number, Parameter, Pi, Power, Product, Sum

# name: (least, most) number of arguments; None for groups separated by semicolons
FUNCTIONS: dict[str, int | None] = {
    "gamma": 1,
    "beta": 2,
    "zeta": 1,
    "sin": 1,
    "cos": 1,
    "exp": 1,
    "log": 1,
    "hyp2f1": 4,
    "hyp3f2": 6,
    "pFq": None,
}
MAX_LENGTH = 20_000
MAX_DEPTH = 40
MAX_NUMBER = 60
MAX_EXPONENT = 300

_TOKEN = re.compile(
    r"(?P<space>[ \t\r\n]+)"
    r"|(?P<invariant>[sX](?:\.[0-9]{1,3})+|s[1-9][1-9](?![0-9A-Za-z_]))"
    r"|(?P<number>[0-9]+(?:\.[0-9]+)?(?:[eE][+-]?[0-9]+)?)"
    r"|(?P<name>[A-Za-z_][A-Za-z_0-9]*)"
    r"|(?P<operator>\*\*|[-+*/^(),;])"
)
_NAME = re.compile(r"[A-Za-z_][A-Za-z_0-9]*")


@dataclass(frozen=True)
class Token:
    """A piece of the text, with the position of its first character, counted from 1."""

    kind: str
    text: str
    position: int


def is_name(name: str) -> bool:
    """Whether a parameter may be called like this.

    >>> is_name("alpha"), is_name("s12"), is_name("pi")
    (True, False, False)
    """
    if not _NAME.fullmatch(name) or len(name) > 50:
        return False
    return name not in ("i", "pi", "s", "X") and name not in FUNCTIONS and not re.fullmatch(r"s[0-9]+", name)


def tokens(text: str, field: str) -> list[Token]:
    """The text in pieces, with an end token."""
    if len(text) > MAX_LENGTH:
        raise InputError(field, f"{len(text)} characters", f"at most {MAX_LENGTH}")
    found = []
    place = 0
    while place < len(text):
        match = _TOKEN.match(text, place)
        if match is None:
            hint = "; there are no attributes" if text[place] == "." else ""
            raise InputError(
                f"{field}, position {place + 1}",
                repr(text[place]),
                "a number, a name, an invariant or one of + - * / ^ ( ) , ;" + hint,
            )
        kind = str(match.lastgroup)
        if kind != "space":
            found.append(Token(kind, match.group(), place + 1))
        place = match.end()
    return [*found, Token("end", "the end", len(text) + 1)]


def parse(text: str, n: int, parameters: Collection[str] = (), field: str = "formula") -> Node:
    """Read a formula.

    Parameters
    ----------
    text
        See the module docstring.
    n
        Number of punctures; labels of invariants go from 1 to n.
    parameters
        The names that may be used.
    field
        What the text is called in error messages.

    Raises
    ------
    InputError
        With the position in the text (counted from 1), for anything outside the language or beyond its limits.

    Examples
    --------
    >>> parse("2*s12", 4)  # doctest: +ELLIPSIS
    Product(factors=(Number(value=Exact('2')), Invariant(labels=(1, 2))), inverse=(False, False))
    >>> parse("gamma(s12).real", 4)
    Traceback (most recent call last):
    ...
    kn_integrate.errors.InputError: formula, position 11: found '.'; expected a number, a name, an invariant or one of \
+ - * / ^ ( ) , ;; there are no attributes
    """
    if not isinstance(text, str):
        raise InputError(field, type(text).__name__, "text")
    reader = _Parser(tokens(text, field), n, frozenset(parameters), field)
    node = reader.sum(0)
    if reader.current.kind != "end":
        reader.refuse("an operator such as + - * / ^, or the end")
    return node


class _Parser:
    """A place in the list of tokens, and one method for each line of the grammar."""

    def __init__(self, found: list[Token], n: int, parameters: frozenset[str], field: str) -> None:
        self.tokens = found
        self.place = 0
        self.n = n
        self.parameters = parameters
        self.field = field

    @property
    def current(self) -> Token:
        return self.tokens[self.place]

    def refuse(self, expected: str, token: Token | None = None) -> NoReturn:
        at = token or self.current
        found = at.text if at.kind == "end" else repr(at.text if len(at.text) <= 60 else at.text[:57] + "...")
        raise InputError(f"{self.field}, position {at.position}", found, expected)

    def accept(self, *texts: str) -> Token | None:
        token = self.current
        if token.kind == "operator" and token.text in texts:
            self.place += 1
            return token
        return None

    def expect(self, text: str) -> None:
        if self.accept(text) is None:
            self.refuse(repr(text))

    def deeper(self, depth: int) -> int:
        if depth >= MAX_DEPTH:
            self.refuse(f"at most {MAX_DEPTH} levels of brackets, functions, powers and signs")
        return depth + 1

    def sum(self, depth: int) -> Node:
        terms, negative = [self.product(depth)], [False]
        while (sign := self.accept("+", "-")) is not None:
            terms.append(self.product(depth))
            negative.append(sign.text == "-")
        return terms[0] if len(terms) == 1 else Sum(tuple(terms), tuple(negative))

    def product(self, depth: int) -> Node:
        factors, inverse = [self.signed(depth)], [False]
        while (sign := self.accept("*", "/")) is not None:
            factors.append(self.signed(depth))
            inverse.append(sign.text == "/")
        return factors[0] if len(factors) == 1 else Product(tuple(factors), tuple(inverse))

    def signed(self, depth: int) -> Node:
        sign = self.accept("+", "-")
        if sign is None:
            return self.power(depth)
        inside = self.signed(self.deeper(depth))
        return inside if sign.text == "+" else Sum((inside,), (True,))

    def power(self, depth: int) -> Node:
        base = self.atom(depth)
        if self.accept("^", "**") is None:
            return base
        return Power(base, self.signed(self.deeper(depth)))

    def atom(self, depth: int) -> Node:
        token = self.current
        if self.accept("("):
            inside = self.sum(self.deeper(depth))
            self.expect(")")
            return inside
        if token.kind not in ("number", "name", "invariant"):
            self.refuse("a number, a name, an invariant or a bracket")
        self.place += 1
        if token.kind == "number":
            return Number(self.number(token))
        if token.kind == "invariant":
            return Invariant(self.labels(token))
        return self.name(token, depth)

    def number(self, token: Token) -> Exact:
        mantissa, _, exponent = token.text.lower().partition("e")
        if len(mantissa) > MAX_NUMBER or len(exponent) > 5 or abs(int(exponent or 0)) > MAX_EXPONENT:
            self.refuse(f"at most {MAX_NUMBER} digits and an exponent within +-{MAX_EXPONENT}", token)
        return Exact(Fraction(mantissa) * Fraction(10) ** int(exponent or 0))

    def labels(self, token: Token) -> tuple[int, ...]:
        dotted = "." in token.text
        found = [int(part) for part in (token.text.split(".")[1:] if dotted else token.text[1:])]
        pair = token.text[0] == "s"
        if any(not 1 <= label <= self.n for label in found) or len(set(found)) != len(found):
            self.refuse(f"different labels from 1 to {self.n}", token)
        if pair and len(found) != 2:
            self.refuse("two labels after s, such as s12 or s.1.10; a channel is written X.1.2.3", token)
        if not 2 <= len(found) <= self.n - 2:
            self.refuse(f"a channel of 2 to {self.n - 2} labels", token)
        return tuple(sorted(found))

    def name(self, token: Token, depth: int) -> Node:
        name = token.text
        follows = self.current.kind == "operator" and self.current.text == "("
        if name in FUNCTIONS and follows:
            return self.call(token, depth)
        if follows:
            self.refuse("one of the functions " + ", ".join(FUNCTIONS), token)
        if name in self.parameters:
            return Parameter(name, token.position)
        if name == "i":
            return Number(Exact(0, 1))
        if name == "pi":
            return Pi()
        known = ["i", "pi", *sorted(self.parameters), *FUNCTIONS]
        close = get_close_matches(name, known, n=1)
        hint = f"; did you mean {close[0]}?" if close else ""
        self.refuse(
            "an invariant (s12, s.1.10, X.1.2.3), i, pi, a parameter or a function with its bracket" + hint, token
        )

    def call(self, token: Token, depth: int) -> Node:
        inner = self.deeper(depth)
        self.expect("(")
        groups: list[tuple[Node, ...]] = []
        while True:
            group: list[Node] = []
            if not (self.current.kind == "operator" and self.current.text in ";)"):
                group.append(self.sum(inner))
                while self.accept(","):
                    group.append(self.sum(inner))
            groups.append(tuple(group))
            if self.accept(";") is None:
                break
        self.expect(")")
        count = FUNCTIONS[token.text]
        if count is not None:
            # hyp3f2(a,b,c; d,e; 1) may be written with its semicolons
            members = tuple(member for group in groups for member in group)
            if len(members) != count or (len(groups) > 1 and not token.text.startswith("hyp")):
                self.refuse(f"{count} arguments of {token.text} separated by commas", token)
            return Call(token.text, (members,), token.position)
        if len(groups) != 3 or len(groups[2]) != 1 or max(len(groups[0]), len(groups[1])) > 8:
            self.refuse("pFq(numerators; denominators; argument) with at most 8 of each", token)
        return Call(token.text, tuple(groups), token.position)
