"""The command line: options in, a verb called, text out. Every rule lives in `verbs`."""

from __future__ import annotations

import argparse
import io
import os
import sys
from collections.abc import Callable, Sequence
from typing import Any, NoReturn

from sheetcal import __version__
from sheetcal.errors import BadInputs, SheetcalError, printable

FIRST_FAULTS = 20


class Parser(argparse.ArgumentParser):
    """argparse, but a misuse is one line on standard error and exit code 2."""

    def error(self, message: str) -> NoReturn:
        name = self.prog.partition(" ")[2] or "command line"
        sys.stderr.write(f"sheetcal: {name}: {_flat(message)}. See `{self.prog} --help`.\n")
        raise SystemExit(2)


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command; returns the exit code."""
    for stream in (sys.stdout, sys.stderr):  # a letter that the terminal's alphabet lacks is spelled out
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="backslashreplace")
    parser = build_parser()
    options = parser.parse_args(argv)
    if not hasattr(options, "run"):
        parser.print_help()
        return 2
    return _guarded(options)


def _guarded(options: argparse.Namespace) -> int:
    try:
        code: int = options.run(options)
        sys.stdout.flush()
        return code
    except BadInputs as faults:
        return _complain(faults.faults)
    except SheetcalError as fault:
        return _complain([fault])
    except KeyboardInterrupt:
        return 130
    except BrokenPipeError:  # the reader of our output went away, as `| head` does
        os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
        return 0
    except OSError as fault:
        return _complain([SheetcalError(str(fault.filename or "system"), fault.strerror or str(fault))])
    except Exception as fault:  # no traceback is ever shown; whatever comes here is a fault of ours
        what = f"stopped by {type(fault).__name__}: {fault}"
        return _complain(
            [SheetcalError(f"sheetcal {options.verb}", what, do="This is a fault of sheetcal: report it.")]
        )


def _complain(faults: Sequence[Exception]) -> int:
    for fault in faults[:FIRST_FAULTS]:
        sys.stderr.write(f"sheetcal: {_flat(str(fault))}\n")
    if len(faults) > FIRST_FAULTS:
        sys.stderr.write(f"sheetcal: and {len(faults) - FIRST_FAULTS} more.\n")
    return 2


def _flat(text: str) -> str:
    """One line, control characters shown as \\xNN."""
    return printable(text)


def _verb(name: str) -> Callable[[argparse.Namespace], int]:
    """A runner that imports the verbs only when a command runs: `--help` stays quick."""

    def run(options: argparse.Namespace) -> int:
        from sheetcal import verbs

        values: dict[str, Any] = {key: value for key, value in vars(options).items() if key not in ("run", "verb")}
        output: verbs.Output = getattr(verbs, name)(**values)
        for text in output.lines:
            print(text)
        return output.code

    return run


def build_parser() -> Parser:
    """All commands and options of the contract that are here."""
    parser = Parser(prog="sheetcal", description="Issue, check and recompute calorimetry worksheets.")
    parser.add_argument("--version", action="version", version=f"sheetcal {__version__}")
    commands = parser.add_subparsers(dest="verb", metavar="COMMAND", parser_class=Parser)
    for add in (
        _kinds,
        _cells,
        _calc,
        _issue,
        _fields,
        _fill,
        _check,
        _explain,
        _faults,
        _selftest,
        _adopt,
        _recompute,
        _office,
        _print,
        _demo,
    ):
        add(commands)
    return parser


def _command(commands: Any, name: str, text: str, more: str = "") -> Parser:
    made: Parser = commands.add_parser(name, help=text, description=f"{text} {more}".rstrip())
    made.set_defaults(run=_verb(name))
    return made


def _kinds(commands: Any) -> None:
    one = _command(commands, "kinds", "List the kinds of worksheet.")
    one.add_argument("--json", action="store_true", help="JSON instead of text")


def _cells(commands: Any) -> None:
    one = _command(commands, "cells", "List the cell functions, or show one.")
    one.add_argument("name", nargs="?", metavar="NAME", help="one cell function")
    one.add_argument("--json", action="store_true", help="JSON instead of text")


def _calc(commands: Any) -> None:
    one = _command(commands, "calc", "Compute one cell function from values with units.")
    one.add_argument("name", metavar="NAME")
    one.add_argument("arguments", nargs="*", metavar="ARG=VALUE", help="for example mass='180 g'")
    one.add_argument("--to", metavar="UNIT", help="unit of the answer")


def _issue(commands: Any) -> None:
    one = _command(commands, "issue", "Issue a pre-filled workbook.")
    one.add_argument("kind", metavar="KIND")
    one.add_argument("-o", dest="out", required=True, metavar="OUT", help="workbook to write (.xlsx or .ods)")
    one.add_argument("--lab", metavar="L.toml", help="lab file")
    one.add_argument("--worklist", metavar="W.csv", help="samples from a worklist")
    one.add_argument("--samples", type=int, metavar="N", help="number of samples, without a worklist")
    one.add_argument("--runs", type=int, metavar="N", help="required runs (per sample for fuel)")
    one.add_argument("--spare", type=int, metavar="N", help="reserve places that may stay empty")
    one.add_argument("--bodies", type=int, metavar="N", help="bodies of a heat balance")
    one.add_argument("--calorimeter", metavar="ID")
    one.add_argument("--profile", metavar="P", help="method profile")
    one.add_argument("--unit", metavar="U", help="a second unit for the reported value")
    one.add_argument("--paper", choices=("A4", "Letter"), default="A4")
    one.add_argument("--job", default="", metavar="TEXT")
    one.add_argument("--register", metavar="FILE", help="note the issue in this register")
    one.add_argument("--format", choices=("xlsx", "ods"), help="as the ending of OUT says; .ods needs LibreOffice")
    one.add_argument("--force", action="store_true", help="replace an output that exists")


def _fields(commands: Any) -> None:
    one = _command(commands, "fields", "List every field of a workbook.")
    one.add_argument("file", metavar="FILE")
    one.add_argument("--json", action="store_true", help="JSON instead of text")


def _fill(commands: Any) -> None:
    one = _command(commands, "fill", "Fill readings from data and logger files into a new workbook.")
    one.add_argument("file", metavar="FILE")
    one.add_argument("--from", dest="data", metavar="DATA", help=".csv or .json of readings, or an analysis file")
    one.add_argument("--log", action="append", default=[], metavar="RUN=LOGGER.csv", help="a temperature record")
    one.add_argument("--log-time", choices=("s", "min"), help="unit of time in a logger file without header")
    one.add_argument("--allow-out-of-range", action="store_true", help="take confirmed unusual readings")
    one.add_argument("--amend", action="store_true", help="replace readings that already hold another value")
    one.add_argument("--reason", default="", metavar="TEXT", help="why, with --amend")
    one.add_argument("-o", dest="out", required=True, metavar="OUT")
    one.add_argument("--force", action="store_true", help="replace an output that exists")


def _check(commands: Any) -> None:
    one = _command(commands, "check", "Check submitted workbooks by recomputing them.")
    one.add_argument("paths", nargs="+", metavar="PATH")
    one.add_argument("--json", metavar="OUT", help="write JSON (- for standard output)")
    one.add_argument("--lab", metavar="L.toml", help="compare constants with this lab file as well")
    one.add_argument("--register", metavar="FILE", help="compare issue records with this register")
    one.add_argument("--history", metavar="DIR", help="earlier workbooks: copies, firings, controls; not checked")
    one.add_argument("--instrument-log", metavar="FILE", help="compare readings and runs with what instruments stored")
    one.add_argument(
        "--office", choices=("auto", "never", "always"), default="auto",
        help="LibreOffice as the fourth witness: where it is found, never, or always",
    )  # fmt: skip
    one.add_argument("--workers", type=int, default=1, metavar="N", help="processes (1)")
    one.add_argument("--all", action="store_true", dest="show_all", help="show every file, not only the first ten")
    one.add_argument("--force", action="store_true", help="replace a JSON file that exists")


def _faults(commands: Any) -> None:
    one = _command(commands, "faults", "List the codes of findings, with meaning and what each needs.")
    one.add_argument("--json", action="store_true", help="JSON instead of text")


def _selftest(commands: Any) -> None:
    one = _command(commands, "selftest", "Plant every certain fault in fresh workbooks, check them, write the record.")
    one.add_argument("--into", required=True, metavar="DIR", help="record and detection matrix; made if absent")
    one.add_argument("--places", type=int, default=5, metavar="N", help="places of each slip in a workbook (5)")
    one.add_argument("--workers", type=int, default=2, metavar="N", help="processes (2)")


def _explain(commands: Any) -> None:
    one = _command(commands, "explain", "Follow one result down to readings and constants.")
    one.add_argument("file", metavar="FILE")
    one.add_argument("result", metavar="RESULT-ID")
    one.add_argument("--json", action="store_true", help="JSON instead of text")


def _adopt(commands: Any) -> None:
    one = _command(commands, "adopt", "Write what a sound workbook proves into the lab file.")
    one.add_argument("file", metavar="FILE")
    one.add_argument("--lab", required=True, metavar="L.toml")
    one.add_argument("--by", default="", metavar="PERSON", help="who adopts")


def _recompute(commands: Any) -> None:
    one = _command(commands, "recompute", "Recompute an archive with new constants and list what moved.")
    one.add_argument("paths", nargs="+", metavar="PATH")
    one.add_argument("--into", required=True, metavar="OUT", help="folder for changes.csv and the summary")
    one.add_argument("--lab", metavar="NEW.toml", help="lab file with the new constants")
    one.add_argument("--revise", action="store_true", help="also write revised copies that cite the originals")
    one.add_argument("--workers", type=int, default=1, metavar="N", help="processes (1)")
    one.add_argument("--json", metavar="OUT", help="write the summary as JSON (- for standard output)")
    one.add_argument("--force", action="store_true", help="replace an output that exists")


def _office(commands: Any) -> None:
    one = _command(commands, "office", "Say which LibreOffice is found; install or remove the add-in.")
    one.add_argument("action", nargs="?", choices=("status", "install", "remove"), default="status")
    one.add_argument("--shared", action="store_true", help="for all users of this computer")
    one.add_argument("--json", action="store_true", help="JSON instead of text")


def _print(commands: Any) -> None:
    one = _command(
        commands,
        "print",
        "Print workbooks for signature, as PDF (needs LibreOffice).",
        "Every page bears the issue id, the hash of the "
        "readings, what `check` says, and its number. A workbook that `check` rejects is printed without room for "
        "signatures and says so on every page; the exit code is then 1.",
    )
    one.add_argument("path", metavar="FILE|DIR")
    one.add_argument("--into", required=True, metavar="DIR", help="folder for the PDF files; made if missing")
    one.add_argument("--force", action="store_true", help="replace PDF files that exist")


def _demo(commands: Any) -> None:
    one = _command(commands, "demo", "Play an invented laboratory's week: issue, fill, check, recompute.")
    one.add_argument("folder", nargs="?", default="sheetcal-demo", metavar="DIR")
