"""Jobs: one integral with everything that is asked about it, from a TOML file or from flags.

A job is a set of values under ``[table] key`` names.  The same fields serve as command-line flags, so that the two
ways of asking cannot drift apart, and may be mixed as long as no value is given twice::

    version = 1
    verb = "disk"

    [kinematics]
    planar = { "1.2" = "3/10", "2.3" = "2/5", "3.4" = "1/2", "4.5" = "7/20", "1.5" = "9/20" }

    [integrand]
    f = "PT(1,2,3,4,5)"
    ordering = [1, 2, 3, 4, 5]

    [accuracy]
    rtol = 1e-12
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeAlias

from . import inputs
from .errors import InputError

if TYPE_CHECKING:
    from .exponents import DiskExponents
    from .integrand import Integrand
    from .kinematics import Mandelstams

VERSION = 1
Key: TypeAlias = tuple[str, str]  # table, key


@dataclass(frozen=True)
class Field:
    """One value that a job may hold: its place in the file, its flag, and how it is read.

    Without ``metavar`` the flag takes no value and stands for true.
    """

    table: str
    key: str
    read: inputs.Reader
    metavar: str
    help: str
    flag: str = ""

    @property
    def place(self) -> Key:
        """Table and key in a job file."""
        return (self.table, self.key)

    @property
    def option(self) -> str:
        """The command-line flag."""
        return self.flag or "--" + self.key.replace("_", "-")

    @property
    def in_file(self) -> str:
        """What messages call a value that came from a file."""
        return f"{self.table}.{self.key}"


N = Field("kinematics", "n", inputs.count, "N", "Number of points; inferred from the labels if left out.")
PLANAR = Field("kinematics", "planar", inputs.assignments, "1.2=X,..", "Planar channels, each by all its labels.")
PAIRS = Field("kinematics", "pairs", inputs.assignments, "1.2=S,..", "Pair invariants s_ij.")
CHORDS = Field("kinematics", "chords", inputs.assignments, "1.3=X,..", "Planar channels by chords of the n-gon.")
EXPONENTS = Field("kinematics", "exponents", inputs.assignments, "1.2=A,..", "Exponents of |z_ij|, not kinematics.")
ROW_SUMS = Field("kinematics", "row_sums", inputs.values, "R[,R..]", "Sums of s_ij over j, one or n of them [0].")
PLANAR_ORDERING = Field(
    "kinematics",
    "ordering",
    inputs.labels,
    "1,2,..",
    "The ordering in which --planar is planar [1,2,..,n].",
    flag="--planar-ordering",
)
KINEMATICS = (N, PLANAR, PAIRS, CHORDS, ROW_SUMS, PLANAR_ORDERING)
INTEGRAND = Field("integrand", "f", inputs.text, "TEXT", "The integrand, such as 'PT(1,2,3,4,5)'.", flag="--integrand")
ORDERING = Field("integrand", "ordering", inputs.labels, "1,2,..", "The order of the punctures [1,2,..,n].")


def accuracy(*methods: str) -> tuple[Field, ...]:
    """The fields of the ``[accuracy]`` table, for a verb that knows these methods."""
    return (
        Field("accuracy", "rtol", inputs.real, "X", "Relative tolerance [1e-10, or 10^-digits]."),
        Field("accuracy", "atol", inputs.real, "X", "Absolute tolerance [0]."),
        Field("accuracy", "digits", inputs.count, "D", "Decimal digits: arbitrary precision."),
        Field("accuracy", "method", inputs.choice(*methods), "|".join(methods), f"The method [{methods[0]}]."),
        Field("accuracy", "max_points", inputs.count, "N", "Refuse to evaluate the integrand more often than this."),
        Field("accuracy", "threads", inputs.count, "N", "Number of threads; the result does not depend on it [1]."),
    )


@dataclass(frozen=True)
class Job:
    """The values of a job that were given, read and checked one by one.

    Attributes
    ----------
    verb : str
        What is asked: ``"disk"``...
    values : Mapping[Key, Any]
        By table and key.
    names : Mapping[Key, str]
        What the caller called each value: the flag, or the place in the file.
    """

    verb: str
    values: Mapping[Key, Any]
    names: Mapping[Key, str]

    def get(self, field: Field) -> Any:
        """The value of a field, None where it was not given."""
        return self.values.get(field.place)

    def name(self, field: Field) -> str:
        """What the caller calls this field."""
        return self.names.get(field.place, field.option)

    def table(self, name: str) -> dict[str, Any]:
        """The given values of one table."""
        return {key: value for (table, key), value in self.values.items() if table == name}

    def tables(self) -> dict[str, dict[str, Any]]:
        """All given values, by table and key."""
        return {name: self.table(name) for name in dict.fromkeys(table for table, _key in self.values)}


def read_file(path: str) -> dict[str, Any]:
    """Read a TOML job file; its ``version`` is checked, nothing else yet.

    Raises
    ------
    InputError
        Named by the path when the file cannot be read, by ``version`` or ``verb`` when these are wrong.
    """
    import tomllib

    try:
        content = Path(path).read_bytes().decode("utf-8")
        data = tomllib.loads(content, parse_float=_exact_decimal)
    except (OSError, UnicodeDecodeError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else "not UTF-8 text"
        raise InputError(path, reason, "a TOML job file that can be read") from None
    except (ValueError, RecursionError) as error:
        raise InputError(path, f"invalid TOML ({error})", "a TOML job file") from None
    version = data.pop("version", None)
    if type(version) is not int or version != VERSION:
        raise InputError(
            f"{path}: version", "nothing" if version is None else inputs.shown(version), f"version = {VERSION}"
        )
    if not isinstance(data.get("verb"), str):
        raise InputError(
            f"{path}: verb", inputs.shown(data["verb"]) if "verb" in data else "nothing", 'a verb such as "disk"'
        )
    return data


def _exact_decimal(text: str) -> Decimal | str:
    try:
        return Decimal(text)
    except InvalidOperation:
        return text  # an absurd exponent; the reader of the field refuses it under the field's name


def job_of_file(path: str, data: Mapping[str, Any], fields: Iterable[Field]) -> Job:
    """The job in the data of a file.

    Raises
    ------
    InputError
        For an unknown table or key (with the nearest known one), and for values that a field cannot use.
    """
    known = {field.place: field for field in fields}
    tables = list(dict.fromkeys(table for table, _key in known))
    values: dict[Key, Any] = {}
    for table, content in data.items():
        if table == "verb":
            continue
        if table not in tables:
            raise _unknown(f"{path}: {table}", table, ["version", "verb", *tables])
        if not isinstance(content, Mapping):
            raise InputError(f"{path}: {table}", inputs.shown(content), f"a table [{table}]")
        for key, raw in content.items():
            field = known.get((table, key))
            if field is None:
                raise _unknown(f"{path}: {table}.{key}", key, [k for t, k in known if t == table])
            values[field.place] = field.read(raw, f"{path}: {field.in_file}")
    names = {place: f"{path}: {known[place].in_file}" for place in values}
    return Job(data["verb"], values, names)


def job_of_flags(verb: str, given: Mapping[Field, Any]) -> Job:
    """The job in the flags of a command line."""
    return Job(
        verb,
        {field.place: field.read(raw, field.option) for field, raw in given.items()},
        {field.place: field.option for field in given},
    )


def joined(first: Job, second: Job) -> Job:
    """One job of a file and flags; a value given in both is an InputError that names both."""
    for place, name in second.names.items():
        if place in first.names:
            raise InputError(name, "a value that the job file gives too", f"either {name} or {first.names[place]}")
    return Job(first.verb, {**first.values, **second.values}, {**first.names, **second.names})


def require_verb(path: str, data: Mapping[str, Any], verb: str) -> None:
    """Refuse a job file that asks for something else than the command it was given to."""
    if data["verb"] != verb:
        raise InputError(f"{path}: verb", inputs.shown(data["verb"]), f'verb = "{verb}" for this command')


def _unknown(field: str, name: str, known: list[str]) -> InputError:
    close = get_close_matches(name, known, n=1)
    hint = f"; did you mean {close[0]}?" if close else ""
    return InputError(field, "an unknown name", "one of " + ", ".join(known) + hint)


def only_one(job: Job, fields: Iterable[Field]) -> Field | None:
    """The one of several fields that was given, None if none was.

    Raises
    ------
    InputError
        When two were given: they would contradict, or one would be ignored.
    """
    given = [field for field in fields if field.place in job.values]
    if len(given) > 1:
        raise InputError(job.name(given[1]), f"it together with {job.name(given[0])}", "only one of them")
    return given[0] if given else None


def integrand_of(job: Job) -> Integrand | None:
    """The integrand of a job; None where the job gives exponents, which leave no room for one."""
    if EXPONENTS.place in job.values:
        only_one(job, (EXPONENTS, INTEGRAND))
        return None
    text = job.get(INTEGRAND)
    if text is None:
        raise InputError(job.name(INTEGRAND), "nothing", "an integrand such as 'PT(1,2,3,4,5)'")
    from .integrand import parse_integrand

    with _named(job.name(INTEGRAND)):
        return parse_integrand(text)


def point_of(job: Job) -> Mandelstams | DiskExponents:
    """The kinematic point of a job, or its exponents.

    Raises
    ------
    InputError
        Under the caller's name for the value, when there is none, more than one, or one that is no kinematic point.
    """
    ways = (PLANAR, PAIRS, CHORDS, EXPONENTS)
    way = only_one(job, ways)
    if way is None:
        names = [field.option for field in ways]
        raise InputError("kinematics", "nothing", f"one of {', '.join(names)}, or a job file with a [kinematics] table")
    for field, users in ((ROW_SUMS, (PLANAR, PAIRS, CHORDS)), (PLANAR_ORDERING, (PLANAR,))):
        if field.place in job.values and way not in users:
            allowed = " or ".join(user.option for user in users)
            raise InputError(job.name(field), f"it together with {job.name(way)}", f"it with {allowed} only")
    n = _points(job, job.get(way))
    given = job.get(way)
    rows = job.get(ROW_SUMS)
    with _named(job.name(way)):
        if way is EXPONENTS:
            from .exponents import DiskExponents

            return DiskExponents.from_pairs(n, given)
        from .kinematics import Mandelstams

        options = {} if rows is None else {"row_sums": rows}
        if way is PLANAR:
            return Mandelstams.from_planar(n, given, ordering=job.get(PLANAR_ORDERING), **options)
        if way is PAIRS:
            return Mandelstams.from_pairs(n, given, **options)
        return Mandelstams.from_chords(n, given, **options)


def _points(job: Job, given: Mapping[inputs.Labels, Any]) -> int:
    """The declared number of points, or the largest one that any input speaks of."""
    declared = job.get(N)
    if declared is not None:
        return int(declared)
    rows = job.get(ROW_SUMS)
    seen = [label for labels in given for label in labels]
    seen += [*(job.get(ORDERING) or ()), *(job.get(PLANAR_ORDERING) or ())]
    seen += [len(rows)] if isinstance(rows, tuple) else []
    integrand = None if job.get(INTEGRAND) is None else integrand_of(job)
    seen += [] if integrand is None else [integrand.n]
    return max(seen)


@contextmanager
def _named(name: str) -> Iterator[None]:
    """Put the caller's name for an input before the name that the failing constructor used."""
    try:
        yield
    except InputError as error:
        field = name if name == error.field else f"{name}: {error.field}"
        raise InputError(field, error.found, error.expected) from None
