"""The command line: parses, calls the library, prints. The only module that prints or exits.

stdout carries the answer, stderr notes and progress. Exit: 0 done (warnings too), 1 failure, 2 usage, 3 the data have
an error. Heavy imports happen inside the commands, so that help is quick.
"""

import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Annotated, Any

import typer

from gley import __version__
from gley.errors import GleyError, UsageError
from gley.jsonform import to_json

# the parser's own complaint about a call; typer shows its class under another name from release to release
_ParserError: type[Exception] = next(item for item in typer.BadParameter.__mro__ if item.__name__ == "ClickException")

DATA_ERROR = 3
_SHOWN = 25

app = typer.Typer(
    name="gley", no_args_is_help=True, add_completion=False, rich_markup_mode=None, pretty_exceptions_enable=False,
    help="From a field survey of ORP and pH to redox evidence: Eh, stability fields, E-pH charts, maps, tables.",
    epilog="Example: gley run survey.xlsx --out assessment",
)  # fmt: skip

Surveys = Annotated[
    list[Path], typer.Argument(help="Survey files: .xlsx, .csv, .tsv, .txt; field and laboratory together.")
]
SettingsFile = Annotated[
    Path | None, typer.Option("--settings", help="Settings file (TOML); templates/survey.toml shows all.")
]
Electrode = Annotated[str, typer.Option(help="Reference electrode where the file names none, e.g. 'Ag/AgCl, 3 M KCl'.")]
Crs = Annotated[
    str, typer.Option(help="Coordinate reference system, e.g. EPSG:25832; 'none' = no maps and GIS layers.")
]
EhFrom = Annotated[
    str, typer.Option("--eh-from", help="Potential for all elements: pt, or a measured couple, e.g. iron or sulfur.")
]
AsJson = Annotated[bool, typer.Option("--json", help="Print the answer as JSON.")]
Overwrite = Annotated[bool, typer.Option("--overwrite", help="Replace what is there.")]
Out = Annotated[Path | None, typer.Option("--out", help="Folder to write to.")]


class _State:
    """What the two flags that every command takes were set to."""

    debug = False
    quiet = False


def _version(wanted: bool) -> None:
    if wanted:
        _print(f"gley {__version__}")
        raise typer.Exit


@app.callback()
def _flags(
    debug: Annotated[bool, typer.Option("--debug", help="Show the traceback of a fault (any command).")] = False,
    quiet: Annotated[bool, typer.Option("--quiet", help="No notes and progress on stderr (any command).")] = False,
    version: Annotated[
        bool, typer.Option("--version", help="Show the version.", is_eager=True, callback=_version)
    ] = False,
) -> None:
    _State.debug, _State.quiet = debug, quiet


@app.command()
def run(
    surveys: Surveys,
    out: Out = None,
    settings: SettingsFile = None,
    electrode: Electrode = "",
    crs: Crs = "",
    elements: Annotated[str, typer.Option(help="Elements to assign, e.g. As,Fe,Mn; default the measured ones.")] = "",
    solids: Annotated[str, typer.Option(help="Solid set: fresh, aged or none; default as in the settings.")] = "",
    eh_from: EhFrom = "",
    overwrite: Overwrite = False,
    as_json: AsJson = False,
) -> None:
    """Do the whole job: Eh, stability fields, redox process, charts, maps, tables, report.

    Example: gley run survey.xlsx --out assessment
    """
    from gley import pipeline, wording
    from gley.delivery import refuse, restore

    chosen = _settings(settings, electrode, crs, elements=elements, solids=solids, eh_from=eh_from)
    folder = out or Path(f"{surveys[0].stem}_redox")
    _tell(f"Reading {', '.join(str(path) for path in surveys)}")
    if restore(folder):
        _tell(f"An earlier run was stopped while it replaced {folder}: the old result was put back.")
    refuse(folder, overwrite)
    result = pipeline.run(list(surveys), chosen, command=_command())
    _tell_findings(result.findings)
    _tell(f"Writing {folder}")
    files = pipeline.write(result, folder, overwrite)
    _answer(as_json, lambda: wording.run_record(result, folder, files), lambda: wording.run_summary(result, folder))
    _exit_on_data_error(result.findings)


@app.command()
def check(
    surveys: Surveys,
    settings: SettingsFile = None,
    electrode: Electrode = "",
    crs: Crs = "",
    as_json: AsJson = False,
) -> None:
    """Read the survey and convert ORP to Eh; list every finding with its cell. Writes nothing.

    Example: gley check survey.xlsx
    """
    from gley import pipeline, wording
    from gley.survey import read_survey

    chosen = _settings(settings, electrode, crs)
    survey = read_survey(list(surveys), chosen)
    eh, findings = pipeline.check(survey, chosen)
    _answer(
        as_json, lambda: wording.check_record(survey, eh, findings), lambda: wording.check_text(survey, eh, findings)
    )
    _exit_on_data_error(findings)


@app.command()
def explain(
    survey: Annotated[Path, typer.Argument(help="Survey file.")],
    sample: Annotated[str, typer.Argument(help="Name of the sample.")],
    element: Annotated[str, typer.Argument(help="Only this element, e.g. Fe.")] = "",
    settings: SettingsFile = None,
    electrode: Electrode = "",
    as_json: AsJson = False,
) -> None:
    """Show one sample's working: every number a reviewer would compute again by hand.

    Example: gley explain survey.xlsx MW-3 As
    """
    from gley.explain import explain as work
    from gley.explain import explain_text
    from gley.survey import read_survey

    chosen = _settings(settings, electrode, "")
    record = work(read_survey(survey, chosen), sample, (element,) if element else (), chosen)
    _answer(as_json, lambda: record, lambda: explain_text(record))


@app.command(context_settings={"ignore_unknown_options": True})
def eh(
    readings: Annotated[list[str], typer.Argument(help="ORP readings in mV; negative ones too.")],
    electrode: Annotated[str, typer.Option(help="Reference electrode, e.g. 'Ag/AgCl, 3 M KCl'.")] = "",
    temperature: Annotated[float | None, typer.Option(help="Temperature in °C.")] = None,
    as_json: AsJson = False,
) -> None:
    """Convert ORP readings to Eh on the hydrogen scale.

    Example: gley eh 215 -120 --electrode "Ag/AgCl, 3 M KCl" --temperature 10
    """
    from gley import wording
    from gley.probe import convert

    values = [_number(text, "ORP reading in mV") for text in readings]
    rows = convert(values, electrode, temperature)
    _answer(as_json, lambda: {"readings": rows}, lambda: wording.eh_text(rows))


@app.command()
def chart(
    element: Annotated[str, typer.Argument(help="Element, e.g. Fe, As, U, S, N; `gley chart ?` lists them.")],
    total: Annotated[str, typer.Option(help="Dissolved total in mol/L; several as 1e-6,1e-4.")] = "1e-6",
    temperature: Annotated[str, typer.Option(help="Temperature in °C; several as 25,5.")] = "25",
    ligand: Annotated[
        list[str] | None, typer.Option(metavar="NAME=TOTAL", help="Ligand total in mol/L; repeat for more.")
    ] = None,
    solids: Annotated[str, typer.Option(help="Solid set: fresh, aged or none.")] = "fresh",
    with_names: Annotated[
        list[str] | None, typer.Option("--with", metavar="NAME", help="Add a species or solid by name.")
    ] = None,
    without: Annotated[
        list[str] | None, typer.Option("--without", metavar="NAME", help="Leave a species or solid out.")
    ] = None,
    ionic_strength: Annotated[float, typer.Option(help="Ionic strength in mol/L.")] = 0.010,
    inert: Annotated[str, typer.Option(help="Taken not to react: N2, sulfate, or both as N2,sulfate.")] = "",
    over: Annotated[
        str, typer.Option(metavar="ELEMENT[=TOTAL]", help="Lay this element's lines over it; total as --total.")
    ] = "",
    fan: Annotated[
        bool, typer.Option("--fan", help="Draw the first of 2 or 3 conditions and shade how far its lines move.")
    ] = False,
    out: Out = None,
    overwrite: Overwrite = False,
    as_json: AsJson = False,
) -> None:
    """Draw one element's E-pH chart without a survey, over the whole plane.

    Example: gley chart Fe --total 1e-5 --ligand C=2e-3 --out charts
    """
    from gley import wording
    from gley.charts import Wish, plain_charts
    from gley.delivery import write_charts

    totals = _numbers(total, "--total in mol/L")
    wish = Wish(
        element, totals, _numbers(temperature, "--temperature in °C"), dict(_pair(text) for text in ligand or []),
        solids, tuple(with_names or ()), tuple(without or ()), ionic_strength, _words(inert),
    )  # fmt: skip
    above = (_pair(over, "--over") if "=" in over else (over, totals[0])) if over else None
    charts = plain_charts(wish, above, fan)
    files = write_charts(charts, out, overwrite) if out else []
    records = [item.as_dict() for item in charts]
    _answer(
        as_json, lambda: records[0] if len(records) == 1 else {"charts": records}, lambda: wording.chart_text(charts)
    )
    for path in files:
        _tell(f"Wrote {path}")


@app.command()
def data(
    element: Annotated[str | None, typer.Argument(help="Only this element's species.")] = None,
    as_json: AsJson = False,
) -> None:
    """List species, solid sets and reference electrodes in use, with their sources.

    Example: gley data Fe
    """
    from gley import wording

    record = wording.data_record(element)
    _answer(as_json, lambda: record, lambda: wording.data_text(record))


@app.command()
def sheet(
    file: Annotated[Path, typer.Argument(help="Workbook to make (.xlsx).")],
    overwrite: Overwrite = False,
) -> None:
    """Make a blank field workbook to take to site.

    Example: gley sheet field.xlsx
    """
    from gley.probe import electrodes
    from gley.survey import write_sheet

    path = write_sheet(file, electrodes=tuple(item["name"] for item in electrodes()), overwrite=overwrite)
    _print(f"Wrote {path}")


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command line and return the exit code; every error becomes one line, a cure and a code."""
    words = list(sys.argv[1:] if argv is None else argv)
    flags = [word for word in words if word in ("--debug", "--quiet")]
    words = flags + [word for word in words if word not in flags] or ["--help"]
    try:
        return app(words, prog_name="gley", standalone_mode=False) or 0
    except GleyError as error:
        if _State.debug:
            raise
        return _fail(error.message, error.cure, 2 if isinstance(error, UsageError) else 1)
    except _ParserError as error:
        said = getattr(error, "format_message", error.__str__)()
        return _fail(said, "`gley --help` lists commands, `gley COMMAND --help` their options.", 2)
    except (typer.Abort, KeyboardInterrupt):
        return _fail("stopped.", "", 1)
    except Exception as error:
        if _State.debug:
            raise
        return _fail(
            f"a fault of the program ({type(error).__name__}: {error}).", "Please report what --debug shows.", 1
        )


def _fail(message: str, cure: str, code: int) -> int:
    print(f"gley: {message}", file=sys.stderr)
    if cure:
        print(f"      {cure}", file=sys.stderr)
    return code


def _print(text: str) -> None:
    print(text)


def _answer(as_json: bool, record: Callable[[], Any], text: Callable[[], str]) -> None:
    """The answer on stdout, in one of its two forms."""
    _print(to_json(record()) if as_json else text())


def _tell(text: str) -> None:
    """A note on stderr."""
    if not _State.quiet:
        print(text, file=sys.stderr)


def _tell_findings(findings) -> None:
    """Errors and warnings on stderr, the first ones; the rest by number."""
    shown = [*findings.of("error"), *findings.of("warning")]
    for item in shown[:_SHOWN]:
        _tell(str(item))
    if len(shown) > _SHOWN:
        _tell(f"… and {len(shown) - _SHOWN} more warnings, all in findings.csv")


def _exit_on_data_error(findings) -> None:
    if findings.of("error"):
        raise typer.Exit(DATA_ERROR)


def _settings(path: Path | None, electrode: str, crs: str, elements: str = "", solids: str = "", eh_from: str = ""):
    """Settings from the file with the options of the command over it."""
    from gley.settings import load

    groups: dict[str, dict[str, Any]] = {}
    if electrode:
        groups["probe"] = {"electrode": electrode}
    if crs:
        groups["survey"] = {"crs": crs}
    if eh_from:
        groups["evidence"] = {"Eh_from": eh_from}
    stability: dict[str, Any] = {}
    if elements:
        stability["elements"] = list(_words(elements))
    if solids:
        stability["solids"] = solids
    return load(path, **groups, **({"stability": stability} if stability else {}))


def _number(text: str, what: str) -> float:
    try:
        return float(text.replace("−", "-"))
    except ValueError:
        message = f"'{text}' isn't a number ({what})."
        raise UsageError(message, "Decimal point, no unit: 1e-6, -120, 25.") from None


def _numbers(text: str, what: str) -> list[float]:
    return [_number(part.strip(), what) for part in text.split(",")]


def _words(text: str) -> tuple[str, ...]:
    return tuple(part.strip() for part in text.split(",") if part.strip())


def _pair(text: str, option: str = "--ligand") -> tuple[str, float]:
    name, sign, amount = text.partition("=")
    if not sign:
        message = f"{option} '{text}' isn't NAME=TOTAL."
        raise UsageError(message, "Write it like S=1e-3 (mol/L).")
    return name.strip(), _number(amount.strip(), f"total of {name} in mol/L")


def _command() -> str:
    """The command line for the stamp, without the path of the program."""
    return " ".join(["gley", *sys.argv[1:]])


if __name__ == "__main__":
    sys.exit(main())
