"""The full hold-out test of a study, as a document and tables of its own."""

import json
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.demand.served import tested_group
from loadsum.evidence.fullholdout import full_hold_out
from loadsum.intake.hourclass import DayBlock
from loadsum.intake.load import Loaded, load_readings
from loadsum.pipeline import classes, program
from loadsum.preparation import prepared, tester
from loadsum.progress import Progress
from loadsum.report import document
from loadsum.report.csvtables import csv_table
from loadsum.report.outputs import write_outputs
from loadsum.report.results import encode, to_json
from loadsum.report.sections.holdout import rows_of
from loadsum.study.load import load_study
from loadsum.study.tables import Study
from loadsum.study.unittables import Transformer


def holdout(path: Path, *, out: Path, progress: Progress) -> str:
    """Test the demand model of a study on readings it has not seen; returns what to tell the user.

    Parameters
    ----------
    path : Path
        Study file.
    out : Path
        Folder for holdout.pdf, holdout.csv and holdout.json.
    progress : Progress
        Told how far the work is.

    Raises
    ------
    InputError
        The study file or a meter file is at fault.
    MachineError
        The outputs cannot be written or the PDF renderer cannot be loaded.
    """
    asked = load_study(path)
    progress("reading meter files", 0.02)
    loaded = load_readings(asked, path.parent)
    _, _, blocks = classes(asked, loaded)
    units = []
    for number, unit in enumerate(asked.transformer):
        share = 0.9 / len(asked.transformer)

        units.append(_of_unit(asked, unit, loaded, blocks, _part_of(progress, 0.05 + number * share, share)))
    results: dict[str, Any] = {
        "program": encode(program()),
        "study": encode(asked.study),
        "people": encode(asked.person),
        "seed": asked.study.seed,
        "transformers": units,
    }
    results = json.loads(to_json(results))
    progress("drawing the document", 0.95)
    rows = [row for unit in units if unit["holdout"] for row in rows_of(unit["holdout"], unit["id"])]
    files = {
        "holdout.pdf": document.printed(document.compose_test(results), results),
        "holdout.json": to_json(results).encode(),
        "holdout.csv": csv_table(rows),
    }
    write_outputs(out, files)
    said = [f"{_named(unit)}{unit['evidence']['sentence'] if unit['evidence'] else unit['reason']}" for unit in units]
    return "\n".join([*said, f"written: {out / 'holdout.pdf'}, holdout.csv, holdout.json"])


def _part_of(progress: Progress, begin: float, share: float) -> Progress:
    """Progress of one transformer within that of all."""

    def within(stage: str, done: float) -> None:
        progress(stage, begin + done * share)

    return within


def _named(unit: dict[str, Any]) -> str:
    return f"{unit['id']}: " if unit["id"] else ""


def _of_unit(
    asked: Study, unit: Transformer, loaded: Loaded, blocks: Sequence[DayBlock], progress: Progress
) -> dict[str, Any]:
    group_of = prepared(asked, unit, loaded, blocks)
    if isinstance(group_of, str):
        return {"id": unit.id, "reason": group_of, "evidence": None, "holdout": None}
    judged, note = tested_group(group_of.group, bool(group_of.served.group.served.any()))

    def fit(some: Sequence[DayBlock], served: NDArray[np.bool_]) -> GroupDemand:
        return tester(asked, unit, loaded, group_of, replace(judged, served=served))(some)

    full = full_hold_out(
        group_of.blocks,
        judged.served,
        fit,
        rng=np.random.default_rng(asked.study.seed),
        note=note,
        progress=progress,
    )
    reason = "" if full is not None else "not tested: fewer than eight weeks have a reading of every customer at once"
    return {
        "id": unit.id,
        "reason": reason,
        "evidence": None if full is None else encode(full.whole),
        "holdout": None if full is None else encode(full),
    }
