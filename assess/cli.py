"""The command ``assess``: what it is told, what it shows, how it ends."""

import argparse
import json
import sys
import traceback
from collections.abc import Sequence
from pathlib import Path

from assess.errors import AssessError, CaseError, Fault, NotConvergedError

DONE, FAILED, FAULTY, UNCONVERGED = 0, 1, 2, 3

CAUTION = (
    "The tool reports an index, a target and what was assumed. It does not judge a structure: "
    "the local code and a licensed engineer do."
)
EPILOG = f"""exit codes: 0 done; 2 faulty input; 3 the sampler has not converged; 1 anything else.

{CAUTION}"""


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line.

    Parameters
    ----------
    arguments : sequence of str, optional
        Words after ``assess``; those of the process if left out.

    Returns
    -------
    int
        Exit code.
    """
    said = _parser().parse_args(arguments)
    try:
        code: int = said.action(said)
    except CaseError as error:
        _show_faults(error.faults)
        return FAULTY
    except NotConvergedError as error:
        _say(f"not converged: stage {error.stage!r}; no index is reported", error=True)
        for failure in error.failures:
            _say(f"  {failure}", error=True)
        _say("sample more (sampling.draws, sampling.tune) or mend the prior;", error=True)
        _say("--accept-unconverged goes on and marks every page", error=True)
        return UNCONVERGED
    except AssessError as error:
        _say(str(error), error=True)
        return FAILED
    except KeyboardInterrupt:
        _say("stopped", error=True)
        return FAILED
    except OSError as error:
        _say(f"{error.filename or 'file'}: {error.strerror or error}", error=True)
        return FAILED
    except Exception:  # noqa: BLE001 - a defect of the tool: say so, with what helps to mend it
        traceback.print_exc()
        _say("this is a defect of the tool, not of your input; please report it", error=True)
        return FAILED
    return code


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="assess",
        description="Reliability of ageing reinforced-concrete structures before and after "
        "surveys, year by year, against a target.",
        epilog=EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")

    run = commands.add_parser("run", help="update, integrate, decide, report", epilog=CAUTION)
    run.add_argument("case", type=Path, metavar="CASE.yaml")
    run.add_argument("--out", type=Path, metavar="DIR", help="default: reports/<name of the case>")
    run.add_argument("--seed", type=_seed, metavar="N", help="in place of sampling.seed")
    run.add_argument(
        "--accept-unconverged",
        action="store_true",
        help="go on with chains that failed the gate; every page says so",
    )
    run.set_defaults(action=_run)

    check = commands.add_parser("check", help="read and check a case with its tables only")
    check.add_argument("case", type=Path, metavar="CASE.yaml")
    check.set_defaults(action=_check)

    new = commands.add_parser("new", help="write a starter case that runs as it is")
    new.add_argument("name", metavar="NAME", help="of the case; letters, digits, - and _")
    new.set_defaults(action=_new)

    schema = commands.add_parser("schema", help="print the JSON Schema of the case format")
    schema.add_argument("--out", type=Path, metavar="FILE", help="write it there instead")
    schema.set_defaults(action=_schema)
    return parser


def _seed(text: str) -> int:
    """Read a seed, refusing what the case file would refuse."""
    try:
        number = int(text)
    except ValueError:
        number = -1
    if not 0 <= number < 2**63:
        raise argparse.ArgumentTypeError(f"given {text!r}, allowed a whole number from 0 to 2^63-1")
    return number


def _say(text: str, *, error: bool = False) -> None:
    stream = sys.stderr if error else sys.stdout
    stream.write(text + "\n")


def _show_faults(faults: Sequence[Fault]) -> None:
    for fault in faults:
        _say(str(fault), error=True)
    count = len(faults)
    _say(f"{count} {'fault' if count == 1 else 'faults'}; nothing was computed", error=True)


def _show_doubts(doubts: Sequence[Fault]) -> None:
    if not doubts:
        return
    _say(f"doubtful data, used as they stand: {len(doubts)}")
    for doubt in doubts:
        _say(f"  {doubt}")


def _check(said: argparse.Namespace) -> int:
    from assess.pipeline import check_case

    reading = check_case(said.case)
    _show_doubts(reading.doubts)
    if reading.case is None:
        _show_faults(reading.faults)
        return FAULTY
    case = reading.case
    rows = sum(len(item.table) for item in case.evidence)
    _say(
        f"{said.case}: no faults; zones {len(case.spec.zones)}, sections "
        f"{len(case.spec.sections())}, surveys {len(case.stages)}, measurements {rows}"
    )
    return DONE


def _run(said: argparse.Namespace) -> int:
    from assess.terminal import RunScreen

    out = said.out or Path("reports") / said.case.stem
    _require_replaceable(out)
    with RunScreen() as screen:
        from assess.pipeline import RunOptions, run_case

        record = run_case(
            said.case,
            RunOptions(out, said.seed, said.accept_unconverged, _command(said)),
            screen.observe,
        )
    screen.show(record, out / "report.html")
    return DONE


def _require_replaceable(out: Path) -> None:
    """Refuse to put a run in the place of anything but an earlier run."""
    if not out.exists() or (out / "run.json").is_file():
        return
    if not out.is_dir():
        raise CaseError([Fault(str(out), 0, "there is a file where the report's folder would be")])
    if any(out.iterdir()):
        what = "the folder holds something other than a run, which would be lost"
        raise CaseError([Fault(str(out), 0, what, mend="give --out a new or an empty folder")])


def _command(said: argparse.Namespace) -> str:
    words = ["assess", "run", str(said.case)]
    if said.seed is not None:
        words += ["--seed", str(said.seed)]
    if said.accept_unconverged:
        words.append("--accept-unconverged")
    return " ".join(words)


def _new(said: argparse.Namespace) -> int:
    from assess.starter import write_starter

    for path in write_starter(said.name, Path()):
        _say(f"wrote {path}")
    _say(f"next: assess run configs/{said.name}.yaml")
    return DONE


def _schema(said: argparse.Namespace) -> int:
    from assess.case.schema import json_schema
    from assess.vocabulary import vocabulary

    text = json.dumps(json_schema(vocabulary()), indent=2, ensure_ascii=False) + "\n"
    if said.out is None:
        sys.stdout.write(text)
    else:
        said.out.write_text(text, encoding="utf-8")
        _say(f"wrote {said.out}")
    return DONE


if __name__ == "__main__":
    sys.exit(main())
