"""The command line: options to a request, the request to a result, the result to text and files.

Only this module prints, and only `main` turns errors into a line and an exit code: 0 found, 1 nothing
fits, 2 not understood or not writable, 130 interrupted.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from functools import partial
from inspect import cleandoc
from typing import TYPE_CHECKING, Any

import click

from partpick.errors import PartpickError, RequestError
from partpick.jobs import Outputs, files_read, on_stdout, outputs_of_plans, paths_of, plan_files
from partpick.options import COIL_OPTIONS, PAIR_OPTIONS, band_of, option_name, plan_options, tables_of
from partpick.rendering import renderers
from partpick.report.files import write_outputs
from partpick.terminal import Terminal

if TYPE_CHECKING:
    from partpick.batch import Answer, Order
    from partpick.parts import Catalogue
    from partpick.request import Request
    from partpick.result import Result

FOUND, NOTHING_FITS, NOT_UNDERSTOOD, INTERRUPTED = 0, 1, 2, 130
LEAST_SECONDS, MOST_SECONDS = 0.001, 1e6  # of a time limit
TOO_SHORT_TO_TELL = 1.0  # s; a run below it says nothing about its time


class _InterruptedError(PartpickError):
    """A command was left before it had anything to write."""

    exit_code = INTERRUPTED


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line and return its exit code; every expected failure is one line on stderr."""
    try:
        code = cli.main(args=arguments, prog_name="partpick", standalone_mode=False)
        return code if isinstance(code, int) else FOUND
    except click.ClickException as error:
        _complain(_usage(error))
        return NOT_UNDERSTOOD
    except PartpickError as error:
        _complain(str(error))
        return error.exit_code
    except click.Abort:  # interrupted before a command had begun
        return INTERRUPTED


def _complain(text: str) -> None:
    """Write one line to stderr, whatever a file name or a plan has put into it."""
    line = " ".join(text.split())
    line = "".join(letter if letter.isprintable() else "\ufffd" for letter in line)
    click.echo(f"partpick: {line}", err=True)


def _usage(error: click.ClickException) -> str:
    text = error.format_message().rstrip(".")
    if isinstance(error, click.NoSuchOption) and re.match(r"-[0-9.]", error.option_name):
        return f"{error.option_name}... is no option; a frequency or an inductance is above zero"
    context = getattr(error, "ctx", None)
    return f"{text}; see {context.command_path} --help" if context is not None else text


# ---------------------------------------------------------------- what commands share


def _examples(*lines: str) -> Callable[[Any], Any]:
    """Return a decorator that adds examples to the help of a command, one a line."""

    def decorate(command: Any) -> Any:
        keep_lines = "\b"  # read by click
        command.__doc__ = "\n".join((cleandoc(command.__doc__), "", keep_lines, *lines))
        return command

    return decorate


class _InOrder(click.Group):
    """A group that lists its commands in the order in which a job meets them."""

    def invoke(self, ctx: click.Context) -> Any:
        """Run the command; click itself would answer Ctrl-C with an empty line."""
        try:
            return super().invoke(ctx)
        except KeyboardInterrupt:
            raise _InterruptedError("interrupted; nothing was written") from None

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the names of the commands as they were added."""
        return list(self.commands)


def _show_version(context: click.Context, parameter: click.Parameter, wanted: bool) -> None:
    if wanted and not context.resilient_parsing:
        import partpick

        click.echo(f"partpick {partpick.__version__}")
        context.exit()


def _seconds(context: click.Context, parameter: click.Parameter, given: str | None) -> float | None:
    if given is None:
        return None
    from partpick.quantities import parse_number

    seconds = given.strip().removesuffix("s")
    return _named("--time-limit", lambda: parse_number(seconds, LEAST_SECONDS, MOST_SECONDS))


def _named(name: str, read: Callable[[], float]) -> float:
    """Return what is read, or refuse it with the name of what was typed in front."""
    from partpick.errors import QuantityError

    try:
        return read()
    except QuantityError as error:
        raise RequestError(f"{name}: {error}") from None


_PATH = click.Path(readable=False)  # completed as a file by a shell; who reads or writes it says what is wrong
_TOP = click.option(
    "--top",
    type=click.IntRange(min=1),
    default=10,
    metavar="N",
    help="Show and write so many at most (10).",
)
_JSON = click.option("--json", "json_path", type=_PATH, metavar="FILE", help="Write the result as JSON; - is stdout.")
_BOM = click.option("--bom", "bom_path", type=_PATH, metavar="FILE", help="Write the bill of material (CSV) likewise.")
_SHEET = click.option(
    "--sheet", "sheet_path", type=_PATH, metavar="FILE", help="Write the build sheet of rank 1 (HTML)."
)
_NETLIST = click.option(
    "--netlist", "netlist_path", type=_PATH, metavar="FILE", help="Write its tanks as a SPICE deck."
)
_DIAL = click.option("--dial", "dial_path", type=_PATH, metavar="FILE", help="Write its dial chart (.csv or .json).")
_TRACKING = click.option(
    "--tracking", "tracking_path", type=_PATH, metavar="FILE", help="Write a receiver's tracking error (.csv or .json)."
)
_WHY = click.option(
    "--why", type=click.IntRange(min=1), metavar="RANK", help="Say why the candidate of a rank stands there."
)
_AGAINST = click.option(
    "--against", type=_PATH, metavar="RESULT", help="Say what changes against an earlier --json file."
)
_DRAWER = click.option("--drawer", type=_PATH, metavar="FOLDER", help="Your own parts, in CSV files as in data/.")
_LIMIT = click.option("--time-limit", callback=_seconds, metavar="SECONDS", help="Stop then, keep the best.")
_FORCE = click.option("--force", is_flag=True, help="Replace an output file that is there already.")
_BY = click.option(
    "--by",
    type=click.Choice(("build", "error", "price")),
    default="build",
    help="Rank by ease of building (build), by error or by price.",
)
_WORKERS = click.option(
    "--workers",
    type=click.IntRange(min=1, max=64),
    metavar="N",
    help="Solve so many plans at a time (one a core); the answers are the same.",
)
_FRONT = click.option(
    "--front",
    type=click.Choice(("values,error", "values,pieces", "values,price", "pieces,price")),
    help="Also say what fewer values or pieces cost.",
)
_ALL = click.option("--all-windings", is_flag=True, help="Rank every winding, not only the best on each former.")


def _common(command: Any) -> Any:
    """Add the options of every command that ranks candidates."""
    outputs = (_JSON, _BOM, _SHEET, _NETLIST, _DIAL)
    for add in reversed((_TOP, *outputs, _WHY, _FRONT, _AGAINST, _DRAWER, _LIMIT, _FORCE, _BY, _ALL)):
        command = add(command)
    return command


# ---------------------------------------------------------------- commands


@click.group(cls=_InOrder, invoke_without_command=True, context_settings={"help_option_names": ["-h", "--help"]})
@click.option(
    "--version",
    is_flag=True,
    is_eager=True,
    expose_value=False,
    callback=_show_version,
    help="Show the version.",
)
@click.pass_context
@_examples(
    "partpick pair 7.1MHz                      one frequency, ranked choices",
    "partpick bands plan.toml --bom parts.csv  tanks for all bands of a plan",
)
def cli(context: click.Context) -> int:
    """Pick the coil and the capacitors of tuned circuits from parts that can be had."""
    if context.invoked_subcommand is None:
        click.echo(context.get_help())
    return FOUND


@cli.command()
@click.argument("frequency")
@plan_options(PAIR_OPTIONS)
@_common
@_examples(
    "partpick pair 7.1MHz --parts 2 --error 0.1% --bom parts.csv",
    'partpick pair 455kHz --forms "ring core,bought" --connect any',
    'partpick pair 7.0MHz..7.3MHz --tuning "variable capacitor:12pF..150pF"',
)
def pair(frequency: str, top: int, drawer: str | None, by: str, all_windings: bool, **given: Any) -> int:
    """Rank coil and capacitor choices for one FREQUENCY, or for a range with --tuning.

    Lists are comma-separated; none as a value removes a limit.
    """
    from partpick.planfile import request_from_tables

    outputs = Outputs(paths_of(given), given["force"], files_read(drawer))
    tables = {**tables_of(PAIR_OPTIONS, given), "band": [band_of(frequency)]}
    request = request_from_tables(tables, "pair", option_name, by=by, all_windings=all_windings)
    outputs.check()
    return _solve_and_write(request, _catalogue(drawer), outputs, top, given)


@cli.command()
@click.argument("plans", type=_PATH, metavar="PLAN...", nargs=-1, required=True)
@_TRACKING
@_common
@_WORKERS
@_examples(
    "partpick bands plan.toml --json result.json --bom parts.csv",
    "partpick bands plan.toml --drawer my-parts --by price",
    "partpick bands plan.toml --sheet sheet.html --netlist tanks.cir --why 2",
)
def bands(plans: tuple[str, ...], top: int, drawer: str | None, by: str, all_windings: bool, **given: Any) -> int:
    """Plan switched tanks for all bands of a PLAN file (TOML; - reads stdin).

    Of several plans, or a folder of them, each is solved on its own; --json, --bom, --sheet and --netlist
    then name a folder that takes one file a plan.
    """
    from partpick.planfile import load_plan

    every = plan_files(plans)
    jobs = list(zip(every, outputs_of_plans(every, drawer, given), strict=True))
    for _, outputs in jobs:
        outputs.check()
    if len(jobs) > 1 and given["front"] is not None:
        raise RequestError("--front goes with one plan at a time")
    if len(jobs) > 1:
        return _solve_several(jobs, top, drawer, given, lambda plan: load_plan(plan, by=by, all_windings=all_windings))
    ((plan, outputs),) = jobs
    return _solve_and_write(load_plan(plan, by=by, all_windings=all_windings), _catalogue(drawer), outputs, top, given)


@cli.command()
@click.argument("inductance", required=False)
@click.option("--at", "frequency", metavar="FREQUENCY", help="Adds Q and series resistance there.")
@plan_options(COIL_OPTIONS)
@_TOP
@_JSON
@_DRAWER
@_FORCE
@_examples(
    "partpick windings 4.05uH --at 7.1MHz",
    'partpick windings --forms "ring core" --json windings.json',
)
def windings(
    inductance: str | None,
    frequency: str | None,
    top: int,
    json_path: str | None,
    drawer: str | None,
    force: bool,
    **given: Any,
) -> int:
    """List every coil that the stock can wind or buy, nearest first to a wanted INDUCTANCE."""
    from partpick.quantities import parse_frequency, parse_inductance

    wanted = None if inductance is None else _named("INDUCTANCE", lambda: parse_inductance(inductance))
    at = None if frequency is None else _named("--at", lambda: parse_frequency(frequency))
    request = _windings_request(tables_of(COIL_OPTIONS, given), at)
    outputs = Outputs({"json": json_path}, force, files_read(drawer))
    outputs.check()
    catalogue = _catalogue(drawer)
    from partpick.report.result_json import windings_json
    from partpick.report.windings_table import windings_table
    from partpick.solving import windings as find_windings

    coils = find_windings(request, catalogue, inductance=wanted, at=at)
    with Terminal() as monitor:
        monitor.writing()
        outputs.write(
            table=lambda: windings_table(coils, inductance=wanted, at=at, top=top),
            json=lambda: windings_json(coils),
        )
    return FOUND if coils else NOTHING_FITS


@cli.command()
@_DRAWER
@_examples(
    "partpick parts --drawer my-parts",
)
def parts(drawer: str | None) -> int:
    """List and check the parts in use: the shipped ones, or your drawer's in their place."""
    from partpick.report.parts_table import parts_table

    _print(parts_table(_catalogue(drawer)))
    return FOUND


@cli.command()
@click.argument("directory", type=_PATH)
@_FORCE
@_examples(
    "partpick starter my-tanks",
)
def starter(directory: str, force: bool) -> int:
    """Write a plan and a drawer to begin from into DIRECTORY."""
    from partpick.starter import next_steps, write_starter

    write_starter(directory, force)
    _print(next_steps(directory))
    return FOUND


# ---------------------------------------------------------------- from a request to its files


def _solve_and_write(
    request: Request, catalogue: Catalogue, outputs: Outputs, top: int, given: Mapping[str, Any]
) -> int:
    """Solve one request and write its outputs; nothing is left half written by a signal."""
    from partpick.solving import solve

    why = given["why"]
    if why is not None and not outputs.shows_table:
        raise RequestError("--why is told below the table, and stdout (-) is taken by another output")
    dial, tracking = _checked_charts(outputs, request)
    before = _earlier(given["against"], outputs)
    with Terminal(given["time_limit"]) as monitor:
        result = solve(request, catalogue, top=max(top, why or 0), monitor=monitor)
        if given["front"] is not None:
            from partpick.solving import with_front

            result = with_front(result, catalogue, given["front"], monitor)
        monitor.writing()
        outputs.write(**renderers(result, why, before, dial, tracking))
    if monitor.elapsed >= TOO_SHORT_TO_TELL:
        click.echo(f"took {monitor.elapsed:.1f} s", err=True)
    return _exit_code(result, monitor)


def _solve_several(
    jobs: Sequence[tuple[str, Outputs]],
    top: int,
    drawer: str | None,
    given: Mapping[str, Any],
    load: Callable[[str], Request],
) -> int:
    """Solve several plans in a pool of processes; what is wrong with one is told and the others go on."""
    from partpick.batch import answers, processes

    if given["against"] is not None:
        raise RequestError("--against compares one plan with one earlier result; several plans are given")
    codes: list[int] = [FOUND]
    orders: dict[int, Order] = {}
    for place, (plan, outputs) in enumerate(jobs):
        try:
            orders[place] = _order(load(plan), outputs, top, given)
        except PartpickError as error:
            codes.append(_complain_of(plan, str(error), error.exit_code))
    catalogue = _catalogue(drawer)
    with Terminal() as monitor:
        workers = processes(given["workers"], len(orders))
        found = answers(
            list(orders.values()), catalogue, workers=workers, time_limit=given["time_limit"], monitor=monitor
        )
        for place, answer in zip(orders, found, strict=True):
            plan, outputs = jobs[place]
            try:
                codes.append(_write_answer(plan, answer, outputs, monitor))
            except PartpickError as error:
                codes.append(_complain_of(plan, str(error), error.exit_code))
    if monitor.elapsed >= TOO_SHORT_TO_TELL:
        click.echo(f"took {monitor.elapsed:.1f} s", err=True)
    return max(codes)


def _order(request: Request, outputs: Outputs, top: int, given: Mapping[str, Any]) -> Order:
    """Return what is wanted of one of several plans."""
    from partpick.batch import Order

    dial, tracking = _checked_charts(outputs, request)
    wanted = ("table", *outputs.paths)
    return Order(request=request, top=top, outputs=wanted, why=given["why"], dial=dial, tracking=tracking)


def _write_answer(plan: str, answer: Answer, outputs: Outputs, monitor: Terminal) -> int:
    """Write what came of one of several plans and return its exit code."""
    if answer.complaint is not None:
        return _complain_of(plan, answer.complaint, answer.exit_code)
    if answer.texts:
        monitor.clear()
        with monitor.undisturbed():
            outputs.write(**{name: partial(str, text) for name, text in answer.texts.items()})
    if answer.interrupted:
        return INTERRUPTED
    return FOUND if answer.found else NOTHING_FITS


def _complain_of(plan: str, text: str, code: int) -> int:
    _complain(text if plan in text else f"{plan}: {text}")
    return code


def _checked_charts(outputs: Outputs, request: Request) -> tuple[str | None, str | None]:
    """Return where the dial chart and the tracking error go, refused where the plan has none."""
    dial, tracking = outputs.paths.get("dial"), outputs.paths.get("tracking")
    if dial is not None:
        from partpick.report.dial import check_dial

        check_dial(dial, request)
    if tracking is not None:
        from partpick.report.tracking import check_tracking

        check_tracking(tracking, request)
    return dial, tracking


def _earlier(path: str | None, outputs: Outputs) -> Mapping[str, Any] | None:
    """Return the best candidate of an earlier result to compare with, read before anything is solved."""
    if path is None:
        return None
    if not outputs.shows_table:
        raise RequestError("--against is told below the table, and stdout (-) is taken by another output")
    from partpick.report.against import read_result

    return read_result(path)


def _exit_code(result: Result, monitor: Terminal) -> int:
    if monitor.interrupted:
        return INTERRUPTED
    return FOUND if result.candidates else NOTHING_FITS


def _windings_request(tables: dict[str, Any], at: float | None) -> Request:
    """Return a request for coils alone: no band, unless Q is asked for at a frequency."""
    from dataclasses import replace

    from partpick.planfile import request_from_tables

    placeholder = {"at": 1e6 if at is None else at}  # a request is read with a band
    request = request_from_tables({**tables, "band": [placeholder]}, "pair", option_name)
    return request if at is not None else replace(request, bands=())


def _catalogue(drawer: str | None) -> Catalogue:
    from partpick.catalogue import load_catalogue

    return load_catalogue(drawer)


def _print(text: str) -> None:
    write_outputs([on_stdout(text)], force=False)
