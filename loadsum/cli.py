"""The command: arguments in, exit status out."""

import argparse
import getpass
import logging
import os
import sys
from collections.abc import Sequence
from pathlib import Path

from loadsum import __version__
from loadsum.errors import Fault, InputError, LoadsumError
from loadsum.progress import TerminalLine, silent

EPILOG = """\
exit status:
  0  done
  1  the machine is at fault: a library is missing, the disk is full
  2  the input is at fault; every fault is named with its place and what to do
  3  the audit found a difference

A first study:
  loadsum draft meters/                  look at a folder of meter files and write a study file to fill in
  loadsum inspect study.toml             read the files and list every doubt about the readings
  loadsum study study.toml --out out/    make the study: out/report.pdf, out/results.json, out/hours.csv, out/figures/
  loadsum compare out/ later/            list what a revision changed

Results are a draft until a licensed engineer has reviewed and signed them where the law requires it.
"""


def parser() -> argparse.ArgumentParser:
    """The arguments of every command."""
    top = argparse.ArgumentParser(
        prog="loadsum",
        description="From metered load profiles to the probability and expected hours above each transformer rating.",
        epilog=EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    top.add_argument("--version", action="version", version=f"loadsum {__version__}")
    commands = top.add_subparsers(dest="command", required=True, metavar="COMMAND")

    def command(name: str, help_text: str) -> argparse.ArgumentParser:
        sub = commands.add_parser(name, help=help_text, description=help_text)
        how_much = sub.add_mutually_exclusive_group()
        how_much.add_argument("--quiet", action="store_true", help="say nothing but faults")
        how_much.add_argument("--verbose", action="store_true", help="say when each stage begins and ends")
        return sub

    study = command("study", "make a study: PDF report, results, hourly table and figures")
    study.add_argument("file", type=Path, metavar="FILE", help="study file (TOML), or a report that carries one (PDF)")
    study.add_argument("--inputs", type=Path, metavar="FOLDER", help="folder of the input files, for a report")
    study.add_argument("--key", type=Path, metavar="FILE", help="key file of the customers' pseudonyms, for a report")
    study.add_argument("--out", type=Path, required=True, metavar="DIR", help="folder for the results")
    study.add_argument(
        "--with",
        dest="overrides",
        action="append",
        default=[],
        metavar="KEY=VALUE",
        help="a value that stands for the study file's, as in transformer.power_factor=0.9; may be repeated",
    )
    study.add_argument("--xlsx", action="store_true", help="write tables.xlsx as well (needs the extra xlsx)")

    inspect = command("inspect", "read the meter files and list every finding, without running the study")
    inspect.add_argument("file", type=Path, metavar="FILE", help="study file (TOML)")
    inspect.add_argument("--out", type=Path, metavar="DIR", help="folder for findings.csv")

    draft = command("draft", "look at a folder of meter files and write a study file and a customer table to fill in")
    draft.add_argument("folder", type=Path, metavar="FOLDER", help="folder of meter files; nothing is overwritten")

    holdout = command("holdout", "test the demand model on readings it has not seen, in full: PDF, CSV and JSON")
    holdout.add_argument("file", type=Path, metavar="FILE", help="study file (TOML)")
    holdout.add_argument("--out", type=Path, required=True, metavar="DIR", help="folder for the test")

    compare = command("compare", "list what changed from one study to its revision, and why the verdict moved")
    compare.add_argument("old", type=Path, metavar="OLD", help="results.json of the study, or the folder that holds it")
    compare.add_argument("new", type=Path, metavar="NEW", help="the same of its revision")
    compare.add_argument(
        "--studies",
        nargs=2,
        type=Path,
        metavar=("OLD_FILE", "NEW_FILE"),
        help="study files of the two, with their meter files: computes how much each cause moved the verdict",
    )

    report = command("report", "draw the report again from results.json, without computing")
    report.add_argument("results", type=Path, metavar="RESULTS", help="results.json of a study")
    report.add_argument("--out", type=Path, required=True, metavar="PDF", help="where the report goes")
    report.add_argument("--templates", type=Path, metavar="DIR", help="the utility's own blocks, texts and logo")

    sign = command("sign", "sign an issued report with your own certificate; asks for its passphrase")
    sign.add_argument("report", type=Path, metavar="PDF", help="an issued report")
    sign.add_argument("--role", required=True, metavar="ROLE", help="role in the sign-off block that you sign as")
    sign.add_argument("--certificate", type=Path, required=True, metavar="FILE", help="PKCS#12 file with your key")
    sign.add_argument("--out", type=Path, required=True, metavar="PDF", help="where the signed report goes")

    audit = command("audit", "check a report: signatures, attachments, inputs, and every number computed again")
    audit.add_argument("report", type=Path, metavar="PDF", help="a report of this program")
    audit.add_argument("--inputs", type=Path, metavar="FOLDER", help="folder of the study's input files")
    audit.add_argument("--key", type=Path, metavar="FILE", help="key file of the customers' pseudonyms")
    audit.add_argument("--templates", type=Path, metavar="DIR", help="the templates that it was drawn with")
    return top


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status.

    Parameters
    ----------
    argv : sequence of str or None
        Arguments without the program's name; those of the process when None.

    Returns
    -------
    int
        0 done, 1 the machine is at fault, 2 the input is at fault, 3 an audit found a difference.
    """
    args = parser().parse_args(argv)
    logging.basicConfig(
        level=logging.INFO if args.verbose else logging.ERROR if args.quiet else logging.WARNING,
        format="loadsum: %(message)s",
        stream=sys.stderr,
        force=True,
    )
    line = TerminalLine()
    progress = silent if args.quiet else line
    status = 0
    try:
        # Many small products: threads of the linear algebra library cost several times what they save here.
        os.environ.setdefault("OMP_NUM_THREADS", "1")
        # The stages are imported here so that --help answers at once.
        from loadsum import comparison, documents, heldout, pipeline

        if args.command == "inspect":
            text = pipeline.inspect(args.file, out=args.out, progress=progress)
        elif args.command == "draft":
            text = pipeline.draft(args.folder)
        elif args.command == "holdout":
            text = heldout.holdout(args.file, out=args.out, progress=progress)
        elif args.command == "compare":
            studies = (args.studies[0], args.studies[1]) if args.studies else None
            text = comparison.compare(args.old, args.new, progress=progress, studies=studies)
        elif args.command == "report":
            text = documents.redraw(args.results, out=args.out, templates=args.templates)
        elif args.command == "sign":
            passphrase = getpass.getpass("passphrase of the certificate: ")
            text = documents.sign(
                args.report, role=args.role, certificate=args.certificate, passphrase=passphrase, out=args.out
            )
        elif args.command == "audit":
            found = documents.audited(args.report, inputs=args.inputs, key=args.key, templates=args.templates)
            text, status = found.text(), found.exit_status
        elif args.file.suffix.lower() == ".pdf":
            if args.inputs is None:
                raise InputError(args.file.name, [Fault("--inputs", "missing; give the folder of the input files")])
            text = documents.rerun(
                args.file,
                inputs=args.inputs,
                key=args.key,
                out=args.out,
                overrides=args.overrides,
                progress=progress,
                xlsx=args.xlsx,
            )
        elif args.inputs is not None or args.key is not None:
            option = "--inputs" if args.inputs is not None else "--key"
            raise InputError(args.file.name, [Fault(option, "goes with a report (PDF); a study file names its own")])
        else:
            text = pipeline.study(args.file, out=args.out, progress=progress, overrides=args.overrides, xlsx=args.xlsx)
    except LoadsumError as error:
        line.clear()
        print(f"loadsum: {error}", file=sys.stderr)
        return error.exit_status
    line.clear()
    if not args.quiet:
        print(text)
    return status


def entry() -> None:
    """Entry point of the installed command."""
    sys.exit(main())
