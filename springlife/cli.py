"""The command line: thin commands over the package; no engineering here.

Results go to stdout, progress and warnings to stderr. Exit codes: 0 meets the target, 1 falls short,
2 bad usage or bad input, 3 judgement withheld.
"""

from __future__ import annotations

import argparse
import os
import sys

from springlife import __version__
from springlife.errors import InputError, SpringlifeError

TYPE_CHECKING = False  # see springlife/__init__.py: --help must stay quick
if TYPE_CHECKING:
    from collections.abc import Callable, Sequence
    from typing import Any, NoReturn

EXIT = {"meets": 0, "falls short": 1, "withheld": 3}
CAUTION = (
    "Estimates from handbook strengths scatter by a factor of ten or more in life. A spring whose failure can hurt "
    "someone needs tests of the part, the applicable codes and the judgement of a licensed engineer."
)


class _Parser(argparse.ArgumentParser):
    """One sentence for a usage error, as for every other error."""

    def error(self, message: str) -> NoReturn:
        self.exit(2, f"springlife: {message}; see {self.prog} --help\n")


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit code."""
    arguments = _parser().parse_args(argv)
    if not hasattr(arguments, "run"):
        _parser().print_help()
        return 2
    try:
        return int(arguments.run(arguments))
    except SpringlifeError as error:
        print("\n".join(f"springlife: {line}" for line in str(error).splitlines()), file=sys.stderr)
        return 2
    except KeyboardInterrupt:
        print("springlife: stopped; nothing was written", file=sys.stderr)
        return 130
    except BrokenPipeError:
        # The reader of a pipe went away: nobody is left to tell. What stands in the buffer goes nowhere.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 141


def run() -> NoReturn:
    """Entry point of the console script; a fault of our own ends apart from every verdict."""
    try:
        sys.exit(main())
    except Exception as error:
        if "SPRINGLIFE_TRACEBACK" in os.environ:
            raise
        name = type(error).__name__
        print(f"springlife: a fault of the program ({name}: {error}); please report it", file=sys.stderr)
        sys.exit(70)


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="springlife",
        description="Fatigue life of helical compression springs under recorded or specified duty.",
        epilog=CAUTION,
    )
    parser.add_argument("--version", action="version", version=f"springlife {__version__}")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", parser_class=_Parser)
    assess = _case_command(commands, "assess", _assess, "judge a case: life, damage, margin, findings")
    assess.add_argument("--surge", action="store_true", help="also with the wave in the coils; its verdict counts")
    _case_command(commands, "check", _check, "read everything a case names, judge nothing")
    _report_command(commands)
    _compare_command(commands)
    _count_command(commands)
    _scatter_command(commands)
    text = "judge every coil with the wave in the wire, beside the static judgement"
    _figure_options(_case_command(commands, "surge", _surge, text), "stress over a cam's speeds, or along the coils,")
    grades = commands.add_parser("grades", help="list the wire grades with their strengths", epilog=CAUTION)
    grades.add_argument("grade", nargs="?", help="one grade in full")
    grades.add_argument("--file", metavar="GRADES.toml", help="a grades file of your own")
    _finish(grades, _grades)
    sizing = _case_command(commands, "size", _size, "search the best spring inside the limits of [size]")
    _figure_options(sizing, "life over mass")
    _rig_command(commands)
    _fit_command(commands)
    verify = commands.add_parser("verify", help="recompute the published examples on this machine")
    _finish(verify, _verify)
    return parser


def _case_command(commands: Any, name: str, run: Callable[[argparse.Namespace], int], text: str) -> Any:
    parser = commands.add_parser(name, help=text, description=text[0].upper() + text[1:] + ".", epilog=CAUTION)
    parser.add_argument("case", metavar="CASE", help="the case file (TOML)")
    _finish(parser, run)
    return parser


def _finish(parser: argparse.ArgumentParser, run: Callable[[argparse.Namespace], int]) -> None:
    parser.add_argument("--json", action="store_true", help="print one JSON object")
    parser.set_defaults(run=run)


def _compare_command(commands: Any) -> None:
    parser = _case_command(commands, "compare", _compare, "judge a case's options side by side, peened or not first")
    parser.add_argument(
        "--hold",
        choices=("stroke", "force", "length", "rate"),
        default="stroke",
        help="what stays as of the drawn spring (default: stroke)",
    )
    _figure_options(parser, "all options in one Haigh diagram")


def _report_command(commands: Any) -> None:
    parser = _case_command(commands, "report", _report, "write the report of a case into a folder: PDF, page, data")
    parser.add_argument("-o", "--output", metavar="DIR", help="the folder (default: reports/NAME, after the case)")
    parser.add_argument("--paper", choices=("a4", "letter"), default="a4", help="default: a4")
    parser.add_argument("--date", metavar="YYYY-MM-DD", help="date of the report (default: the case's own)")
    for study in ("scatter", "rig", "surge"):
        parser.add_argument(f"--{study}", action="store_true", help=f"with the {study} study")
    parser.add_argument("--force", action="store_true", help="write over a report that is already there")


def _report(arguments: argparse.Namespace) -> int:
    from springlife.report.bundle import STUDIES, default_folder, write_report
    from springlife.report.progress import Progress

    progress = Progress()
    try:
        written = write_report(
            arguments.case,
            arguments.output or default_folder(arguments.case),
            paper=arguments.paper,
            date=arguments.date,
            ask=tuple(study for study in STUDIES if getattr(arguments, study)),
            force=arguments.force,
            watch=progress.doing,
        )
    finally:
        progress.close()
    if arguments.json:
        _print_json(written.to_dict())
    else:
        print(f"{written.verdict.upper()}: {written.folder}")
    return EXIT[written.verdict]


def _size(arguments: argparse.Namespace) -> int:
    from springlife.life.size import size

    result = size(arguments.case)
    if arguments.figure:
        from springlife.report.figures_size import life_over_mass

        if not result.found:
            raise InputError("--figure: no spring meets everything, so there is nothing to draw")
        _save(life_over_mass(result), arguments)
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.size_text import print_sizing

        print_sizing(result, CAUTION)
    return 0 if result.found else 1


def _rig_command(commands: Any) -> None:
    parser = _case_command(commands, "rig", _rig, "propose a constant-amplitude test with the duty's damage")
    parser.add_argument(
        "--low", metavar="LENGTH", help="least deflection, such as '12 mm' (default: the worst cycle's)"
    )
    parser.add_argument("--high", metavar="LENGTH", help="greatest deflection (default: the worst cycle's)")
    parser.add_argument("--frequency", default="10 Hz", metavar="RATE", help="of the rig (default: 10 Hz)")
    parser.add_argument("--reliability", type=float, default=0.9, help="to be shown (default: 0.9)")
    parser.add_argument("--confidence", type=float, default=0.9, help="to show it with (default: 0.9)")
    parser.add_argument("--life-factor", type=float, default=1.0, help="run each spring this many times longer")
    parser.add_argument("--weibull-slope", type=float, default=2.0, help="used with --life-factor (default: 2)")
    _figure_options(parser, "cycles over the test's deflection")


def _rig(arguments: argparse.Namespace) -> int:
    from springlife import units
    from springlife.life.rig import rig

    test = rig(
        arguments.case,
        low=None if arguments.low is None else units.parse(arguments.low, "length"),
        high=None if arguments.high is None else units.parse(arguments.high, "length"),
        frequency=units.parse(arguments.frequency, "frequency"),
        reliability=arguments.reliability,
        confidence=arguments.confidence,
        life_factor=arguments.life_factor,
        weibull_slope=arguments.weibull_slope,
    )
    if arguments.figure:
        from springlife.report.figures_rig import rig_cycles

        _save(rig_cycles(test), arguments)
    if arguments.json:
        _print_json(test.to_dict())
    else:
        from springlife.report.rig_text import print_rig

        print_rig(test, CAUTION)
    return 3 if test.stopped else 0


def _fit_command(commands: Any) -> None:
    text = "fit own fatigue tests and write the curve that a case can name"
    parser = commands.add_parser("fit", help=text, description=text[0].upper() + text[1:] + ".", epilog=CAUTION)
    parser.add_argument("tests", metavar="TESTS.csv", help="one row a spring: amplitude, mean, cycles, outcome, group")
    parser.add_argument("--grade", required=True, help="wire of the springs tested, such as A232")
    parser.add_argument("--wire", required=True, metavar="DIAMETER", help="wire diameter, such as '6.5 mm'")
    parser.add_argument("--tensile", metavar="STRENGTH", help="tensile strength from the certificate")
    parser.add_argument(
        "--criterion", default="gerber", help="brings mean stresses to fully reversed (default: gerber)"
    )
    parser.add_argument("--reliability", type=float, default=0.9, help="of the design curve (default: 0.9)")
    parser.add_argument("--confidence", type=float, default=0.9, help="of the design curve (default: 0.9)")
    parser.add_argument("-o", "--output", metavar="CURVE.toml", help="write the curve file here")
    parser.add_argument("--title", default="own fatigue tests", help="title of the curve file")
    _figure_options(parser, "tests and curves")
    _finish(parser, _fit)


def _fit(arguments: argparse.Namespace) -> int:
    from springlife import units
    from springlife.life.fitting import fit_own_tests

    result = fit_own_tests(
        arguments.tests,
        wire=arguments.grade,
        wire_diameter=units.parse(arguments.wire, "length"),
        tensile_strength=None if arguments.tensile is None else units.parse(arguments.tensile, "stress"),
        by=arguments.criterion,
        reliability=arguments.reliability,
        confidence=arguments.confidence,
    )
    if arguments.figure:
        from springlife.report.figures_fit import own_tests

        _save(own_tests(result), arguments)
    if arguments.output:
        if os.path.realpath(arguments.output) == os.path.realpath(arguments.tests):
            raise InputError(f"{arguments.output}: is the table of tests; name another file for the curve")
        result.write(arguments.output, title=arguments.title, force=arguments.force)
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.fit_text import print_fit

        print_fit(result, CAUTION)
    return 0


def _count_command(commands: Any) -> None:
    text = "count the rainflow cycles of one record"
    parser = commands.add_parser("count", help=text, description=text[0].upper() + text[1:] + ".", epilog=CAUTION)
    parser.add_argument("record", metavar="RECORD", help="the record, such as ride.csv")
    parser.add_argument("--channel", help="column by name, or by number counted from 1")
    parser.add_argument("--time", help="time column by name or number")
    parser.add_argument("--time-unit", metavar="UNIT", help="unit of the time column, such as ms")
    parser.add_argument("--rate", metavar="RATE", help="sample rate, such as '500 Hz'")
    parser.add_argument("--unit", help="unit of the channel; counted as plain numbers without one")
    parser.add_argument("--residue", choices=("half", "repeat", "drop"), default="half", help="default: half")
    parser.add_argument(
        "--gate", type=float, default=0.0, help="drop cycles with a range up to this, in the channel's unit"
    )
    parser.add_argument("--gaps", choices=("error", "split"), default="error", help="default: error")
    parser.add_argument("--recount", action="store_true", help="recount with the rainflow package and compare")
    parser.add_argument("--top", type=int, default=12, metavar="N", help="rows to print (default 12; 0 for all)")
    _finish(parser, _count)


def _figure_options(parser: argparse.ArgumentParser, what: str) -> None:
    parser.add_argument("--figure", metavar="FILE", help=f"draw {what} to an SVG, PNG or PDF file")
    parser.add_argument("--force", action="store_true", help="write over files that are already there")


def _save(figure: Any, arguments: argparse.Namespace) -> None:
    from springlife.report.output import save_figure

    save_figure(figure, arguments.figure, force=arguments.force)


def _print_json(data: Any) -> None:
    import json

    print(json.dumps(_finite(data), indent=2, allow_nan=False, ensure_ascii=False, default=str))


def _finite(data: Any) -> Any:
    """JSON has no infinity: a number without end is null."""
    if isinstance(data, dict):
        return {key: _finite(value) for key, value in data.items()}
    if isinstance(data, (list, tuple)):
        return [_finite(value) for value in data]
    return None if isinstance(data, float) and data - data != 0 else data


def _assess(arguments: argparse.Namespace) -> int:
    from springlife.life.assess import assess
    from springlife.report.progress import Progress

    progress = Progress()
    result = assess(arguments.case, progress)
    progress.close()
    wave = None
    if arguments.surge and result.judgement is not None:
        from springlife.life.surge import with_surge

        wave = with_surge(result)
    if arguments.json:
        _print_json(result.to_dict() | ({"surge": wave.to_dict() if wave else None} if arguments.surge else {}))
    else:
        from springlife.report.terminal import print_assessment

        beneath = f"without the spring's own mass; with it: {wave.verdict.upper()} (see below)" if wave else ""
        print_assessment(result, CAUTION, beneath)
        if wave:
            from springlife.report.surge_text import print_surge_part

            print_surge_part(wave)
    return EXIT[wave.verdict if wave else result.verdict]


def _surge(arguments: argparse.Namespace) -> int:
    from springlife.life.surge import surge

    result = surge(arguments.case)
    if arguments.figure:
        from springlife.report.figures_speed import cam_speeds
        from springlife.report.figures_surge import coil_stress

        _save(cam_speeds(result) if result.cams else coil_stress(result), arguments)
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.surge_text import print_surge

        print_surge(result, CAUTION)
    return EXIT[result.verdict]


def _check(arguments: argparse.Namespace) -> int:
    from springlife.life.check import check
    from springlife.report.progress import Progress

    progress = Progress()
    result = check(arguments.case, progress)
    progress.close()
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.terminal import print_check

        print_check(result)
    return 3 if result.stopped else 0


def _compare(arguments: argparse.Namespace) -> int:
    from springlife.life.compare import compare

    result = compare(arguments.case, arguments.hold)
    if arguments.figure:
        from springlife.report.figures_options import options_haigh

        _save(options_haigh(result), arguments)
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.compare_text import print_comparison

        print_comparison(result, CAUTION)
    return EXIT[result.options[0].assessment.verdict]


def _scatter_command(commands: Any) -> None:
    parser = _case_command(commands, "scatter", _scatter, "draw many springs: B lives, failures, what matters most")
    parser.add_argument(
        "--samples", type=int, metavar="N", help="springs to draw, a power of two (default: the case's)"
    )
    parser.add_argument("--seed", type=int, metavar="N", help="seed of the draw (default: the case's)")
    _figure_options(parser, "what matters most")


def _scatter(arguments: argparse.Namespace) -> int:
    from springlife.life.scatter import scatter

    result = scatter(arguments.case, samples=arguments.samples, seed=arguments.seed)
    if arguments.figure:
        from springlife.report.figures_scatter import tornado

        if result.no_sensitivities:
            raise InputError(f"--figure: there are no indices to draw: {result.no_sensitivities}")
        _save(tornado(result), arguments)
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.scatter_text import print_scatter

        print_scatter(result, CAUTION)
    return 0


def _number_or_name(text: str | None) -> str | int | None:
    return int(text) if text is not None and text.isascii() and text.isdigit() and len(text) < 10 else text


def _count(arguments: argparse.Namespace) -> int:
    from pathlib import Path

    from springlife import units
    from springlife.life.tally import tally_record

    result = tally_record(
        Path(arguments.record),
        channel=_number_or_name(arguments.channel),
        time=_number_or_name(arguments.time),
        time_unit=arguments.time_unit,
        sample_rate=None if arguments.rate is None else units.parse(arguments.rate, "frequency"),
        unit=arguments.unit,
        gate=arguments.gate,
        gaps=arguments.gaps,
        residue=arguments.residue,
        recount=arguments.recount,
    )
    if arguments.top < 0:
        raise InputError(f"--top is {arguments.top}; give 0 for all rows or a positive number")
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.terminal import print_tally

        print_tally(result, arguments.top)
    return 0 if result.agrees in (None, True) else 1


def _verify(arguments: argparse.Namespace) -> int:
    from springlife.life.verify import verify

    result = verify()
    if arguments.json:
        _print_json(result.to_dict())
    else:
        from springlife.report.terminal import print_verification

        print_verification(result)
    return 0 if result.passed else 1


def _grades(arguments: argparse.Namespace) -> int:
    from springlife.spring.grade import grade, grades

    chosen = [grade(arguments.grade, arguments.file)] if arguments.grade else list(grades(arguments.file).values())
    if arguments.json:
        _print_json({"grades": [entry.to_dict() for entry in chosen]})
    else:
        from springlife.report.terminal import print_grades

        print_grades(chosen, full=arguments.grade is not None)
    return 0


if __name__ == "__main__":
    run()
