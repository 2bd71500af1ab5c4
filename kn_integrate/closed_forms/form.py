"""What every closed form is: a small frozen object with a name, a source, a domain and a value."""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass, fields
from typing import Any, ClassVar, TypeVar

from ..exact import read
from .pairs import PairExponents
from .working import Big, Context, settled

F = TypeVar("F", bound="DiskForm")


def read_fields(form: Any) -> None:
    """Read the numbers (and tuples of numbers) a frozen form was made with into exact ones."""
    for item in fields(form):
        value = getattr(form, item.name)
        if isinstance(value, tuple):
            value = tuple(read(v, f"{item.name}[{k}]")[0] for k, v in enumerate(value))
        else:
            value = read(value, item.name)[0]
        object.__setattr__(form, item.name, value)


class ClosedForm(ABC):
    """A published value of an integral.

    Attributes
    ----------
    name : str
    source : str
        Reference and equation number.
    domain : str
        The exact condition under which the form applies, in words.
    """

    name: ClassVar[str]
    source: ClassVar[str]
    domain: ClassVar[str] = "everywhere by continuation, except where a chord exponent Y is 0, -1, -2, ..."

    @abstractmethod
    def refuse_poles(self) -> None:
        """Raise PoleError where the integral has a pole."""

    @abstractmethod
    def evaluate(self, ctx: Context) -> Big:
        """The formula in the arithmetic of ``ctx``; cancellation may cost some of its digits."""

    def value(self, digits: int = 30) -> Any:
        """The integral to ``digits`` significant digits, as an mpmath number holding all of them.

        Raises
        ------
        PoleError
            On a pole of the integral.
        UndefinedError
            Where the formula, though not the integral, has no value.
        """
        self.refuse_poles()
        return settled(self.evaluate, digits)


class DiskForm(ClosedForm):
    """A closed form of one disk integral in absolute-value form."""

    @abstractmethod
    def pairs(self) -> PairExponents:
        """The exponents of the integral this form gives."""

    @classmethod
    @abstractmethod
    def read_off(cls: type[F], pairs: PairExponents) -> F | None:
        """The form with these very exponents, positions as they stand; None when it does not apply."""

    @classmethod
    def match(cls: type[F], exponents: Any) -> Match | None:
        """Look for this form among all rotations and reflections of the positions.

        Parameters
        ----------
        exponents : PairExponents or sequence of numbers
            A_ij in the order (1,2), (1,3), ..., (n-1,n).
        """
        for order, image in PairExponents.of(exponents).dihedral():
            form = cls.read_off(image)
            if form is not None:
                return Match(form, order)
        return None

    def refuse_poles(self) -> None:
        """Raise PoleError when a chord exponent is 0, -1, -2, ..."""
        self.pairs().refuse_poles()

    @property
    def converges(self) -> bool:
        """True where the integral itself converges, not only its continuation."""
        return self.pairs().converges


@dataclass(frozen=True)
class Match:
    """A closed form that applies after moving the point of position order[k-1] to position k.

    ``form.pairs() == exponents.image(order)``; the value is the same for every order found.
    """

    form: DiskForm
    order: tuple[int, ...]
