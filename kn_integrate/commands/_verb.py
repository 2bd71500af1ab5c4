"""From a function of a job to a command: flags, job file, output format and exit code, the same for every verb."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping, Sequence
from typing import Any

import click

from ..errors import InputError, PoleError, WorkLimitError
from ..inputs import choice
from ..jobs import Field, Job, job_of_file, job_of_flags, joined, read_file, require_verb
from ..report.outcome import Outcome, json_text, outcome_of_pole, outcome_of_work_limit, table
from ..report.plain import plain

FORMAT = choice("table", "json")


Explain = Callable[[Job], Mapping[str, Any]]


class Verb(click.Command):
    """A command that knows the fields of its job, and can tell what the job would do."""

    fields: tuple[Field, ...] = ()
    explain: Explain | None = None


def verb(*fields: Field, explain: Explain | None = None) -> Callable[[Callable[[Job], Outcome]], Verb]:
    """Make the command of a verb from ``function(job) -> Outcome``.

    The function's name is the verb and its docstring the help text.  The command takes a job file, flags for
    ``fields``, or both; poles and work limits that the function raises become outcomes with exit code 1.  ``explain``
    gives the facts that ``kn-integrate info JOB`` shows, beyond the kinematic point.
    """

    def make(function: Callable[[Job], Outcome]) -> Verb:
        name = function.__name__

        def callback(job: tuple[str, ...], format: tuple[str, ...], **flags: Any) -> None:
            output = FORMAT(single("--format", format) or "table", "--format")
            given = {field: _raw(field, flags[_parameter(field)]) for field in fields}
            asked = job_of_flags(name, {field: raw for field, raw in given.items() if raw is not None})
            path = single("JOB", job)
            if path is not None:
                data = read_file(path)
                require_verb(path, data, name)
                asked = joined(job_of_file(path, data, fields), asked)
            show(name, {"job": plain(asked.tables())}, output, lambda: function(asked))

        command = Verb(
            name,
            callback=callback,
            help=function.__doc__,
            params=[
                job_argument(),
                *(_option(field.option, _parameter(field), field.metavar, field.help) for field in fields),
                format_option(),
            ],
        )
        command.fields = tuple(fields)
        command.explain = explain
        return command

    return make


def show(name: str, head: Mapping[str, Any], output: str, action: Callable[[], Outcome]) -> None:
    """Run an action, print its outcome to stdout, and leave with the exit code it deserves."""
    start = time.perf_counter()
    try:
        outcome = action()
    except PoleError as error:
        outcome = outcome_of_pole(error)
    except WorkLimitError as error:
        outcome = outcome_of_work_limit(error)
    seconds = f"{time.perf_counter() - start:.3g}"
    if output == "json":
        from ..report.versions import versions

        document = {"verb": name, **head, **outcome.document, "seconds": seconds, "versions": versions()}
        click.echo(json_text(document))
    else:
        click.echo(table((*outcome.rows, ("seconds", seconds))))
    click.get_current_context().exit(0 if outcome.ok else 1)


def job_argument() -> click.Argument:
    """The optional job file; as with flags, more than one is refused by `single`."""
    return click.Argument(["job"], nargs=-1, metavar="[JOB]")


def format_option() -> click.Option:
    """The flag ``--format``."""
    return _option("--format", "format", "table|json", "How to print the result [table].")


def _option(flag: str, parameter: str, metavar: str, text: str) -> click.Option:
    if not metavar:
        return click.Option([flag, parameter], is_flag=True, help=text)
    # Given twice, a flag would silently win over itself; collect them all and let `single` refuse.
    return click.Option([flag, parameter], metavar=metavar, help=text, multiple=True)


def _parameter(field: Field) -> str:
    return f"{field.table}_{field.key}"


def _raw(field: Field, given: Any) -> Any:
    """What a flag was given, None where it was not."""
    return (given or None) if not field.metavar else single(field.option, given)


def single(flag: str, given: Sequence[str]) -> str | None:
    """The value of a flag that was given once, None where it was not given."""
    if len(given) > 1:
        raise InputError(flag, " and ".join(repr(item) for item in given), "it once")
    return given[0] if given else None
