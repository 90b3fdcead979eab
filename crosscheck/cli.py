"""The `crosscheck` command. Parsing only; each command imports what it needs when it runs.

Exit status: 0 agree, 1 disagree, 2 unusable input, 3 undecided (README, Commands).
"""

from __future__ import annotations

import argparse
import contextlib
import os
import sys
from collections.abc import Callable, Iterator, Sequence
from typing import TYPE_CHECKING, Any

from crosscheck import __version__
from crosscheck.waiting import waiting

if TYPE_CHECKING:
    from rich.console import RenderableType

    from crosscheck.check import Opinions
    from crosscheck.claims.reading import Reading

EXIT = {"agree": 0, "disagree": 1, "undecided": 3}
UNUSABLE = 2

EXAMPLES = {
    "": """\
examples:
  crosscheck draft --bays 6,6 --storeys 3.5,3.2 > hall.toml     a frame file to start from
  crosscheck opinions hall.toml                                 what three methods make of it
  crosscheck verify hall.toml hall.claim.txt                    is the pasted table right?
  crosscheck verify hall.toml - --case wind < paste.txt         the same from standard input
each command says more, with examples: crosscheck verify --help
""",
    "opinions": """\
examples:
  crosscheck opinions hall.toml                      every case and combination
  crosscheck opinions hall.toml --case wind --working  with the equations
  crosscheck opinions hall.toml --axial rigid        as hand methods have it
  crosscheck opinions hall.toml --report hall.html   a page to read and sign
exit status: 0 agree, 1 disagree, 2 unusable input, 3 undecided
""",
    "verify": """\
examples:
  crosscheck verify hall.toml hall.claim.txt         a claim and the opinions
  crosscheck verify hall.toml - --case wind < mail.txt   pasted, of one case
  crosscheck verify hall.toml --value "B1-C1 max 412 kNm"  one value of a mail
  crosscheck verify hall.toml r.csv --show-reading   how the table is understood
  crosscheck verify hall.toml r.csv --units "kN mm"  what it does not say itself
  crosscheck verify hall.toml r.csv --suspect 1      as suspect 1 supposes
  crosscheck verify hall.toml new.csv --against old.csv  what moved between two
  crosscheck verify hall.toml r.csv --report hall.pdf --about job="Quay 4"
  crosscheck verify hall.toml r.csv --quiet && echo right    in a script
exit status: 0 agree, 1 disagree, 2 unusable input, 3 undecided
""",
    "inspect": """\
examples:
  crosscheck inspect hall.toml                       before any results
  crosscheck inspect hall.toml --explain             why each finding matters
  crosscheck inspect hall.toml --approximate         hand methods beside it
  crosscheck inspect hall.toml --echo input.txt      against the other's input
exit status: 0 nothing serious, 1 something serious, 2 unusable input
""",
    "record": """\
examples:
  crosscheck record hall.toml --reason "checked against drawing S-04 rev C"
  crosscheck record frames/ --only "hall*" --reason "sections of 2026"
exit status: 0 on record, 1 refused, 2 unusable input
""",
    "regress": """\
examples:
  crosscheck regress frames/                         all of an office's frames
  crosscheck regress --changed-since origin/main     what a change has touched
  crosscheck regress frames/ --report week.html      an overview to look through
  crosscheck regress frames/ -q --junit out.xml      in a build
exit status: 0 all held, 1 anything else, 2 no frame found or none readable
""",
    "draft": """\
examples:
  crosscheck draft > shed.toml                       blank, with remarks
  crosscheck draft --bays "2 x 6, 7.5" --storeys "4.2, 3.5" --output hall.toml
  crosscheck draft --bays "20" --storeys "12" --units "kip ft" --feet pinned
""",
}
"""What --help shows below the options, by command."""


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command line; returns the exit status."""
    args = _parser().parse_args(argv)
    args.given = tuple(sys.argv[1:] if argv is None else argv)
    if args.command is None:
        _parser().print_help()
        return UNUSABLE
    _plain_text_out()
    # One thread: frames are small, two cores are busy with frames of their own, and threads only wait for each other.
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    from crosscheck.problems import UnusableInput

    try:
        status = int(args.run(args))
        # Here and not when the interpreter ends, where a full disk would be told as another exit status.
        sys.stdout.flush()
        return status
    except UnusableInput as error:
        return _refuse(args, error)
    except BrokenPipeError:
        # The reader of a pipe went away (`| head`): not an error of ours, and nothing can be printed any more.
        sys.stderr.close()
        return UNUSABLE
    except OSError as error:
        print(f"crosscheck: {error.filename or 'standard output'}: {error.strerror or error}", file=sys.stderr)
        _write_no_more()
        return UNUSABLE
    except KeyboardInterrupt:
        print("stopped", file=sys.stderr)
        return UNUSABLE


def _write_no_more() -> None:
    """What is left in standard output's buffer goes nowhere: the interpreter would fail on it again at its end."""
    with contextlib.suppress(OSError, ValueError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())


def _plain_text_out() -> None:
    """UTF-8 on every system, so that a report piped to a file reads the same everywhere."""
    for stream in (sys.stdout, sys.stderr):
        reconfigure: Callable[..., Any] | None = getattr(stream, "reconfigure", None)
        if reconfigure is not None and (stream.encoding or "").lower().replace("-", "") != "utf8":
            reconfigure(encoding="utf-8", errors="replace")


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="crosscheck", epilog=EXAMPLES[""], formatter_class=argparse.RawDescriptionHelpFormatter,
        description="An independent second and third opinion on plane-frame results from somebody else's analysis.",
    )  # fmt: skip
    parser.add_argument("--version", action="version", version=f"crosscheck {__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND")
    _add_opinions(commands)
    _add_verify(commands)
    _add_inspect(commands)
    _add_record(commands)
    _add_regress(commands)
    _add_draft(commands)
    return parser


def _command(commands: Any, name: str, says: str) -> argparse.ArgumentParser:
    made: argparse.ArgumentParser = commands.add_parser(
        name, help=says, description=f"{says[:1].upper()}{says[1:]}.", epilog=EXAMPLES[name],
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )  # fmt: skip
    return made


def _add_frame(command: argparse.ArgumentParser) -> None:
    command.add_argument("frame", metavar="FRAME", help="frame file (TOML)")
    command.add_argument("--variant", metavar="NAME", default="", help="which frame of a [family]")


def _add_quiet(command: argparse.ArgumentParser) -> None:
    command.add_argument("-q", "--quiet", action="store_true", help="print the verdict's line alone")


def _add_common(command: argparse.ArgumentParser) -> None:
    _add_frame(command)
    _add_quiet(command)
    command.add_argument("--case", metavar="NAME", help="one load case or combination only")
    command.add_argument("--axial", choices=("elastic", "rigid"), help="instead of what the frame file says")
    command.add_argument("--shear", choices=("rigid", "elastic"), help="instead of what the frame file says")
    command.add_argument("--order", type=int, choices=(1, 2), help="instead of what the frame file says")
    command.add_argument("--ask-library", action="store_true", help="ask the library however large the frame is; it "
                         "abstains from large ones otherwise, because it is slow with them")  # fmt: skip
    command.add_argument("--idealisations", action="store_true", help="axial, shear and order the other way, side by side")
    command.add_argument("--json", metavar="PATH", help="write the findings as JSON (- for standard output alone)")


def _add_report(command: argparse.ArgumentParser) -> None:
    command.add_argument("--report", metavar="PATH", help="write the check record, a page to read, sign and file "
                         "(PATH.html, or PATH.pdf)")  # fmt: skip
    command.add_argument("--about", metavar="KEY=TEXT", action="append", default=[],
                         help="what the record says about itself: job, calculation, revision, originator, drawings, "
                         "program, program_version, remarks; or a TOML file of these; may be repeated")  # fmt: skip


def _add_opinions(commands: Any) -> None:
    command = _command(commands, "opinions", "three opinions on a frame, and where they disagree")
    _add_common(command)
    command.add_argument("--working", action="store_true", help="print equations and distribution to follow by hand")
    _add_report(command)
    command.set_defaults(run=run_opinions)


def _add_verify(commands: Any) -> None:
    command = _command(commands, "verify", "a pasted table of results against the opinions")
    _add_common(command)
    command.add_argument("claim", metavar="CLAIM", nargs="?", help="file of pasted results, or - for standard input")
    command.add_argument("--tolerance", metavar="PERCENT", help="relative tolerance of the claim in percent (usual: 1)")
    command.add_argument("--units", metavar="UNITS", help='units of the paste where it states none: "kN m", '
                         'or by quantity: "moment kN mm, displacement mm"')  # fmt: skip
    command.add_argument("--columns", metavar="HEADS", help='what the columns are: "member, joint, N, V, M"')
    command.add_argument("--reading", metavar="PATH", help="reading file (TOML): units, columns, signs, names")
    command.add_argument("--sheet", metavar="NAME", help="sheet of a spreadsheet file")
    command.add_argument("--value", metavar="TEXT", action="append", default=[],
                         help='a value in words, "B1-C1 max 412 kNm"; may be repeated')  # fmt: skip
    command.add_argument("--suspect", metavar="N", type=int, help="compare the claim with what suspect N supposes")
    command.add_argument("--against", metavar="OTHER", help="another printout of the same frame instead of the "
                         "opinions: what moved between the two, by their printed rounding")  # fmt: skip
    command.add_argument("--show-reading", action="store_true", help="print the table as understood; compare nothing")
    _add_report(command)
    command.add_argument("--reason", metavar="TEXT", default="", help="why the frame has changed since a claim was "
                         "checked against it; stands in the check log FRAME.log.jsonl")  # fmt: skip
    command.set_defaults(run=run_verify)


def _add_inspect(commands: Any) -> None:
    command = _command(commands, "inspect", "what a reviewer would ask about the model before any results")
    _add_frame(command)
    _add_quiet(command)
    command.add_argument("--sway", metavar="RATIO", type=float, default=300, help="height over movement (usual: 300)")
    command.add_argument("--deflection", metavar="RATIO", type=float, default=250, help="span over deflection (250)")
    command.add_argument("--critical", metavar="FACTOR", type=float, default=10,
                         help="critical load factor below which first order is questioned (usual: 10)")  # fmt: skip
    command.add_argument("--explain", action="store_true", help="say of each finding why it matters and what to look at")
    command.add_argument("--approximate", action="store_true",
                         help="portal, cantilever and free-moment values beside the computed ones")  # fmt: skip
    command.add_argument("--echo", metavar="FILE", help="compare the other model's own printed input (- for stdin)")
    command.add_argument("--json", metavar="PATH", help="write the findings as JSON (- for standard output alone)")
    _add_report(command)
    command.set_defaults(run=run_inspect)


def _add_record(commands: Any) -> None:
    command = _command(commands, "record", "put today's agreed values on record")
    command.add_argument("frame", metavar="FRAME", nargs="+", help="frame file, or a folder of them")
    command.add_argument("--reason", required=True, metavar="TEXT", help="why these values go on record")
    command.add_argument("--only", metavar="NAME", help="frames with this in their name (* and ? stand for anything)")
    command.add_argument("-q", "--quiet", action="store_true", help="say nothing of what went on record")
    command.add_argument("--json", metavar="PATH", help="say what was recorded as JSON (- for stdout)")
    command.set_defaults(run=run_record)


def _add_regress(commands: Any) -> None:
    command = _command(commands, "regress", "standard frames against their values on record and their claims")
    command.add_argument("path", metavar="PATH", nargs="*", help="folders or frame files (default: this folder)")
    _add_quiet(command)
    command.add_argument("--only", metavar="NAME", help="frames with this in their name (* and ? stand for anything)")
    command.add_argument("--changed-since", metavar="REVISION", help="frames changed since a git revision")
    command.add_argument("--against", metavar="DIR", help="another set's values on record instead: what moved between")
    command.add_argument("--junit", metavar="PATH", help="also write a JUnit XML file")
    command.add_argument("--json", metavar="PATH", help="write the outcome as JSON (- for standard output alone)")
    _add_report(command)
    command.set_defaults(run=run_regress)


def _add_draft(commands: Any) -> None:
    command = _command(commands, "draft", "write a frame file to start from: blank, or a regular grid")
    command.add_argument("--bays", metavar="WIDTHS", help='bay widths from the left: "6, 6, 7.5" or "3 x 6 m"')
    command.add_argument("--storeys", metavar="HEIGHTS", help='storey heights from the ground: "4.2, 2 x 3.5 m"')
    command.add_argument("--feet", default="fixed", metavar="WORD", help="column feet: fixed or pinned")
    command.add_argument("--hinged-beams", action="store_true", help="beams hinged at both ends")
    command.add_argument("--title", metavar="TEXT", help="title of the frame")
    command.add_argument("--units", default="kN m", metavar="UNITS", help='force and length unit (default "kN m")')
    command.add_argument("--output", metavar="PATH", help="file to write (default: standard output); never overwrites")
    command.add_argument("--json", metavar="PATH", help="also say what was written as JSON")
    command.set_defaults(run=run_draft)


# --- commands


def run_opinions(args: argparse.Namespace) -> int:
    """`crosscheck opinions FRAME`."""
    from crosscheck import check

    frame = _frame(args)
    filing = _filing(args)
    with waiting("asking the opinions"):
        result = check.ask(frame, check.chosen_names(frame, args.case), args.ask_library)
    if filing is not None:
        with waiting("writing the record"):
            filing.opinions(result)

    def document() -> dict[str, Any]:
        from crosscheck.report.document import opinions_document

        return opinions_document(result)

    def report() -> RenderableType:
        from crosscheck.report.terminal import opinions_report

        return opinions_report(result, check.workings(result) if args.working else (), *_effects(args, result))

    _give(args, document, report)
    return EXIT[result.verdict]


def run_verify(args: argparse.Namespace) -> int:
    """`crosscheck verify FRAME CLAIM`."""
    from crosscheck import check

    _refuse_together(args)
    relative = _percent(args.tolerance)
    frame = _frame(args)
    filing = _filing(args)
    if filing is not None:
        filing.ask_for_reason(frame)
    with waiting("reading the claim"):
        reading = _reading(args, frame, args.claim, args.value)
    if args.show_reading:
        from crosscheck.claims import show_reading

        for row in show_reading(reading):
            print(row)
        return 0
    if args.against is not None:
        return _two_printouts(args, frame, reading, relative, filing)
    with waiting("asking the opinions and comparing"):
        stated = check.verify(
            frame, reading, args.case, relative, every_case=bool(args.json), any_size=args.ask_library
        )
        changed = check.as_suspected(stated, args.suspect) if args.suspect is not None else None
    if filing is not None:
        with waiting("writing the record"):
            filing.verification(stated, reading, args.suspect or 0, changed)
    result = changed or stated

    def document() -> dict[str, Any]:
        from crosscheck.report.document import verification_document

        return verification_document(result)

    def report() -> RenderableType:
        from crosscheck.report.terminal import verify_report

        return verify_report(result, *_effects(args, result.opinions))

    _give(args, document, report)
    return EXIT[result.verdict]


def _refuse_together(args: argparse.Namespace) -> None:
    """Raises UnusableInput for options of `verify` that cannot stand together, or where there is no claim."""
    from crosscheck.problems import Problem, UnusableInput

    if args.claim is None and not args.value:
        advice = "name a file, or - for standard input, or --value"
        raise UnusableInput([Problem("", None, "CLAIM", "no claim given", advice)])
    if str(args.claim).endswith(".toml") and not args.frame.endswith(".toml"):
        advice = "the frame stands first, the claim second"
        raise UnusableInput([Problem(args.claim, None, "CLAIM", "is a frame file", advice)])
    if args.against is not None and (args.against == "-" or args.claim is None):
        says, advice = "compares two printouts, each a file (the first may be -)", "name CLAIM and --against OTHER"
        raise UnusableInput([Problem("", None, "--against", says, advice)])
    if args.report and args.show_reading:
        says, advice = "is of a comparison, and --show-reading compares nothing", "leave out one of them"
        raise UnusableInput([Problem("", None, "--report", says, advice)])


def _reading(args: argparse.Namespace, frame: Any, path: str | None, values: Sequence[str]) -> Reading:
    from crosscheck.claims import ReadingOptions, read_claim
    from crosscheck.claims.reading import FrameNames

    options = ReadingOptions(
        units=args.units, columns=_parts(args.columns), file=args.reading, values=tuple(values), sheet=args.sheet
    )
    return read_claim(path, FrameNames.of(frame), options)


def _effects(args: argparse.Namespace, result: Opinions) -> tuple[str, list[RenderableType]]:
    """The line on the critical load factor, and what the idealisation does to the results where that is asked for."""
    from crosscheck import check
    from crosscheck.idealisations import key_values, variants
    from crosscheck.report.effects import USUAL, critical_line, idealisations_table

    line = critical_line(result.frame, check.critical_factors(result.frame, result.names, USUAL))
    if not args.idealisations:
        return line, []
    found = variants(result.frame, result.names)
    return line, [idealisations_table(result.frame, found, key_values(result.frame, found))]


def _two_printouts(
    args: argparse.Namespace, frame: Any, first: Reading, relative: float | None, filing: Any
) -> int:
    """`crosscheck verify FRAME CLAIM --against OTHER`: 0 nothing moved, 1 something did, 3 undecided."""
    from crosscheck import check

    second = _reading(args, frame, args.against, ())
    with waiting("asking the opinions and comparing"):
        result = check.compare_printouts(frame, first, second, args.case, relative)
    if filing is not None:
        with waiting("writing the record"):
            filing.printouts(result, (first, second))

    def document() -> dict[str, Any]:
        from crosscheck.report.printouts import printouts_document

        return printouts_document(result)

    def report() -> RenderableType:
        from crosscheck.report.printouts import printouts_report

        return printouts_report(result)

    _give(args, document, report)
    return EXIT[result.moved.verdict]


def run_inspect(args: argparse.Namespace) -> int:
    """`crosscheck inspect FRAME`: 0 nothing serious, 1 serious, 2 unusable."""
    from crosscheck import check
    from crosscheck.review.approximate import approximations
    from crosscheck.review.finding import Limits
    from crosscheck.review.inspect import graded, inspect, subject_of

    filing = _filing(args)
    limits = Limits(sway=args.sway, deflection=args.deflection, critical=args.critical)
    with waiting("looking at the model"):
        subject = subject_of(check.read(args.frame, args.variant), limits)
        findings = inspect(subject)
    if args.echo:
        from crosscheck.review.echo import echoed

        findings = graded([*echoed(subject, args.echo), *findings])
    rough = approximations(subject) if args.approximate else None
    if filing is not None:
        with waiting("writing the record"):
            filing.inspection(subject, findings)

    def document() -> dict[str, Any]:
        from crosscheck.report.review import review_document

        return review_document(subject, findings, rough)

    def report() -> RenderableType:
        from crosscheck.report.review import review_report

        return review_report(subject, findings, args.explain, rough)

    _give(args, document, report)
    return 1 if any(f.grade == "serious" for f in findings) else 0


def run_record(args: argparse.Namespace) -> int:
    """`crosscheck record FRAME --reason TEXT`: 0 recorded, 1 refused, 2 unusable."""
    from pathlib import Path

    from crosscheck.problems import Problem, UnusableInput
    from crosscheck.suite.record import record_all
    from crosscheck.suite.regress import chosen

    frames = chosen([Path(p) for p in args.frame], args.only)
    if not frames:
        raise UnusableInput([Problem(", ".join(args.frame), None, "", "holds no frame file", "name a frame file")])
    with _progress(len(frames)) as advance:
        outcomes = record_all(frames, args.reason, advance)
    if args.json:
        from crosscheck.report.suite import record_document

        _write_json(args.json, record_document(outcomes))
    for o in outcomes:
        if o.status:
            print("\n".join(f"crosscheck: {line}" for line in o.says), file=sys.stderr)
        elif args.json != "-" and not args.quiet:
            print(f"on record: {o.standard.record.as_posix()}")
    return max(o.status for o in outcomes)


def run_regress(args: argparse.Namespace) -> int:
    """`crosscheck regress [PATH ...]`: 0 all held, 1 anything else, 2 no frame found or none readable."""
    from pathlib import Path

    from crosscheck.suite import regress

    filing = _filing(args)
    roots = [Path(p) for p in args.path] or [Path()]
    frames = regress.chosen(roots, args.only, args.changed_since)
    other = _folder(args.against) if args.against else None
    if other is not None:
        outcome = regress.against(frames, roots, other)
    else:
        with _progress(len(frames)) as advance:
            outcome = regress.run(frames, roots, advance)
    if filing is not None:
        with waiting("writing the records"):
            filing.suite(outcome)
    if args.junit:
        from crosscheck.files import replace_text
        from crosscheck.report.suite import junit

        replace_text(args.junit, junit(outcome))

    def document() -> dict[str, Any]:
        from crosscheck.report.suite import suite_document

        return suite_document(outcome)

    def report() -> RenderableType:
        from crosscheck.report.suite import suite_report

        return suite_report(outcome)

    _give(args, document, report)
    return outcome.exit_status


def _folder(path: str) -> Any:
    from pathlib import Path

    from crosscheck.problems import Problem, UnusableInput

    if not Path(path).is_dir():
        raise UnusableInput([Problem(path, None, "--against", "is not a folder", "name the other set's folder")])
    return Path(path)


@contextlib.contextmanager
def _progress(count: int) -> Iterator[Callable[[Any], None]]:
    """What to call when a frame is done: a progress bar where standard error is a terminal."""
    if not sys.stderr.isatty() or count < 4:
        yield lambda _: None
        return
    from rich.console import Console
    from rich.progress import Progress

    with Progress(console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task("frames", total=count)
        yield lambda _: bar.advance(task)


def run_draft(args: argparse.Namespace) -> int:
    """`crosscheck draft`: blank, or a regular grid where bays and storeys are given."""
    from crosscheck.files import write_new
    from crosscheck.frame.draft import draft_blank, draft_grid
    from crosscheck.problems import Problem, UnusableInput

    if (args.bays is None) != (args.storeys is None):
        raise UnusableInput([Problem("", None, "draft", "a regular grid needs both --bays and --storeys", "give both")])
    title = {"title": args.title} if args.title else {}
    if args.bays is None:
        text = draft_blank(args.units, **title)
    else:
        text = draft_grid(
            _parts(args.bays), _parts(args.storeys), args.units, args.feet, args.hinged_beams, **title
        )
    if args.output:
        write_new(args.output, text)
        print(f"wrote {args.output}; next: crosscheck opinions {args.output}", file=sys.stderr)
    elif args.json != "-":
        sys.stdout.write(text)
    if args.json:
        _write_json(args.json, {"format": "crosscheck/1", "file": args.output, "text": text})
    return 0


# --- input and output


def _frame(args: argparse.Namespace) -> Any:
    from crosscheck import check

    frame = check.read(args.frame, args.variant)
    if args.axial is None and args.shear is None and args.order is None:
        return frame
    from crosscheck.frame.needs import with_analysis

    return with_analysis(frame, args.axial, args.shear, args.order)


def _filing(args: argparse.Namespace) -> Any:
    """What writes the record that --report asks for, its options checked before any work; None where none is asked for."""
    if not args.report:
        return None
    from crosscheck.report.filing import Filing

    return Filing.asked(args.report, args.about, getattr(args, "reason", ""), args.given)


def _percent(text: str | None) -> float | None:
    from crosscheck.problems import Problem, UnusableInput

    if text is None:
        return None
    try:
        value = float(text.strip().removesuffix("%"))
    except ValueError:
        value = float("nan")
    if not 0 < value < 100:
        says = f'"{text}" is not a percentage'
        raise UnusableInput([Problem("", None, "--tolerance", says, "a number like 1 or 2.5")])
    return value / 100


def _parts(text: str | None) -> tuple[str, ...]:
    return tuple(part.strip() for part in text.split(",")) if text else ()


def _give(
    args: argparse.Namespace, document: Callable[[], dict[str, Any]], report: Callable[[], RenderableType]
) -> None:
    """Print the report and write the JSON document; with `--json -` nothing but JSON goes to standard output, and with
    --quiet the verdict alone."""
    if args.json:
        _write_json(args.json, document())
    if args.json != "-":
        from crosscheck.report.terminal import headline, show

        with waiting("setting the report"):
            text = report()
        show(headline(text) if args.quiet else text)


def _write_json(path: str, document: dict[str, Any]) -> None:
    from crosscheck.report.document import dumps

    if path == "-":
        sys.stdout.write(dumps(document))
        return
    from crosscheck.files import replace_text

    replace_text(path, dumps(document))


def _refuse(args: argparse.Namespace, error: Any) -> int:
    """Print one message a problem, on standard error."""
    for problem in error.problems:
        print(f"crosscheck: {problem}", file=sys.stderr)
    return UNUSABLE


if __name__ == "__main__":
    raise SystemExit(main())
