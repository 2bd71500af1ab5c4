"""The command ``kn-integrate``: finds the verb, and turns every failure into one line and an exit code.

Exit codes: 0 all well; 1 not accurate enough, on a pole, above the work limit, or a check failed (the output is still
printed); 2 input that cannot be used; 130 interrupted.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence
from difflib import get_close_matches
from typing import Any, NoReturn

import click

from . import __version__
from .commands import load_verb, verb_names
from .errors import InputError, KNError, NotAvailableError

BAD_INPUT = 2
INTERRUPTED = 130

_HELP = """String tree integrals on the disk and the sphere.

Each verb takes a TOML job file, flags, or both. Exit codes: 0 all well; 1 not accurate enough, on a pole, above the
work limit, or a check failed; 2 input that cannot be used; 130 interrupted.

\b
Example:
  kn-integrate disk --planar 1.2=3/10,2.3=2/5 --integrand "PT(1,2,3,4)"
  kn-integrate VERB --help
"""


class _Verbs(click.Group):
    """The verbs, each loaded from its file when it is asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return verb_names()

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        return load_verb(cmd_name) if cmd_name in verb_names() else None

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        if args[0] not in verb_names():
            raise InputError("verb", repr(args[0]), _one_of(args[0], verb_names()))
        return super().resolve_command(ctx, args)

    def main(
        self,
        args: Sequence[str] | None = None,
        prog_name: str | None = None,
        complete_var: str | None = None,
        standalone_mode: bool = True,
        **extra: Any,
    ) -> NoReturn:
        """Run; always leaves through SystemExit, with our own messages instead of click's."""
        try:
            code = super().main(args, prog_name or "kn-integrate", complete_var, standalone_mode=False, **extra)
        except (InputError, NotAvailableError) as error:
            _fail(str(error), BAD_INPUT)
        except click.UsageError as error:
            _fail(str(_input_error(error)), BAD_INPUT)
        except KNError as error:
            _fail(str(error), 1)
        except click.Abort:
            _fail("interrupted", INTERRUPTED)
        sys.exit(code if isinstance(code, int) else 0)


def _fail(message: str, code: int) -> NoReturn:
    click.echo(message, err=True)
    sys.exit(code)


def _one_of(name: str, known: Sequence[str]) -> str:
    close = get_close_matches(name, known, n=1)
    return "one of " + ", ".join(known) + (f"; did you mean {close[0]}?" if close else "")


def _input_error(error: click.UsageError) -> InputError:
    """A complaint of the flag parser in the words of all other complaints."""
    if isinstance(error, click.NoSuchOption):
        known = [flag for param in error.ctx.command.params for flag in param.opts] if error.ctx else []
        flags = sorted(flag for flag in known if flag.startswith("--"))
        return InputError(error.option_name, "an unknown flag", _one_of(error.option_name, flags))
    if isinstance(error, click.BadOptionUsage):
        return InputError(error.option_name, "nothing", "a value after the flag")
    return InputError("command line", error.message.rstrip("."), "what --help describes")


@click.group(cls=_Verbs, help=_HELP, invoke_without_command=True)
@click.version_option(__version__, prog_name="kn-integrate")
@click.pass_context
def main(ctx: click.Context) -> None:
    """See ``_HELP``."""
    if ctx.invoked_subcommand is None:
        raise InputError("verb", "nothing", f"one of {', '.join(verb_names())}; see kn-integrate --help")


if __name__ == "__main__":
    main()
