"""A study file and a customer table drafted from a folder of meter files; what only the user knows is asked."""

import fnmatch
from collections.abc import Iterable, Sequence
from pathlib import Path

from loadsum.errors import Fault, InputError
from loadsum.intake.survey import Look, look_at
from loadsum.study.load import read_tree

STUDY, CUSTOMERS = "study.toml", "customers.csv"
ENDINGS = (".csv", ".txt", ".tsv", ".gz", ".zip", ".xml", ".xlsx", ".parquet", ".dat")

HEAD = """\
# Drafted from the files of this folder. Nothing here was invented:
#   - a plain line was told by the files, and the remark beside it says how;
#   - a line that begins with "#?" is a question that only you can answer: correct the value, then take the sign away.
# Every key is explained in docs/study-file.md. Until the questions are answered, `loadsum study` names each of them.

[study]
#? title = ""                     # what the study is called
#? time_zone = "Europe/Oslo"      # IANA zone of the place, or a fixed offset such as "+10:00"
#? demand_interval_min = {interval:<9}# {interval_why}
# reference = ""
# question = ""
# place = ""
"""

TAIL = """\

# Seasons and day types: months and days that are studied together.
# [[season]]
# name = "winter"
# months = [12, 1, 2]
# [day_types]
# holidays_country = "NO"

[transformer]
#? ratings_kva = []               # ratings to compare, in order [kVA]
#? power_factor =                 # of the group, where reactive power is not metered
#? power_factor_source = ""
# installed_kva =                 # the unit in service, if there is one

# Criteria are your utility's and are never supplied by the program; without one there is a table and no verdict.
# [[criterion]]
# quantity = "exceedance hours per year"
# of = "nameplate"
# limit =
# source = ""                     # document and clause

# [[person]]
# role = "prepared"
# name = ""
"""


def draft_study(folder: Path) -> tuple[tuple[Path, ...], tuple[str, ...]]:
    """Writes a study file and a customer table into a folder of meter files; never overwrites one.

    Where they are there already, what is new in the folder is added to their ends as remarks.

    Parameters
    ----------
    folder : Path
        Folder of meter files.

    Returns
    -------
    files : tuple of Path
        Files written or added to.
    said : tuple of str
        What was found, one line a file, for the user.

    Raises
    ------
    InputError
        The folder holds no meter file, or the study file in it is not TOML.
    """
    if not folder.is_dir():
        raise InputError(str(folder), [Fault(str(folder), "is no folder; give the folder of the meter files")])
    study, table = folder / STUDY, folder / CUSTOMERS
    known = _named(folder, read_tree(study)) if study.exists() else set()
    paths = [path for path in _candidates(folder) if path not in known]
    looks = [look_at(path, folder) for path in paths]
    if not looks and not study.exists():
        raise InputError(str(folder), [Fault(str(folder), f"holds no meter file ({', '.join(ENDINGS)})")])
    groups = _alike((look for look in looks if look.kind == "readings"), folder)
    body = [*(_readings(group) for group in groups), *(_weather(look) for look in looks if look.kind == "temperature")]
    body += [_strange(look) for look in looks if look.kind == "not understood"]
    customers = list(dict.fromkeys(name for look in looks if look.kind == "readings" for name in look.customers))
    written = _write_study(study, body, looks) + _write_table(table, customers)
    return written, tuple(f"{look.name}: {'; '.join([look.kind, *look.remarks])}" for look in looks)


def _candidates(folder: Path) -> list[Path]:
    """Files of a folder that may hold readings, in order of name; what a study wrote is left out."""
    studies = {result.parent for result in folder.rglob("results.json")}
    return [
        path
        for path in sorted(folder.rglob("*"))
        if path.is_file()
        and path.suffix.lower() in ENDINGS
        and path.name != CUSTOMERS
        and not any(part.startswith(".") for part in path.relative_to(folder).parts)
        and studies.isdisjoint(path.parents)
    ]


def _named(folder: Path, tree: dict[str, object]) -> set[Path]:
    """Files that a study file names already."""
    tables = tree.get("readings", [])
    entries = [tables] if isinstance(tables, dict) else tables if isinstance(tables, list) else []
    weather = tree.get("weather", {})
    patterns = [entry.get("files") for entry in entries if isinstance(entry, dict)]
    if isinstance(weather, dict):
        patterns += [weather.get("file"), weather.get("record_file")]
    found: set[Path] = set()
    for pattern in patterns:
        if isinstance(pattern, str) and pattern and not Path(pattern).is_absolute():
            target = folder / pattern
            found.update(target.rglob("*") if target.is_dir() else folder.glob(pattern))
    return found


def _alike(looks: Iterable[Look], folder: Path) -> list[list[Look]]:
    """Files that are described alike stand under one [[readings]], where a pattern catches them and no others."""
    groups: dict[object, list[Look]] = {}
    for look in looks:
        inside, _, name = look.name.rpartition("/")
        described = (inside, name.partition(".")[2], look.keys, tuple(key for key, _, _ in look.questions))
        groups.setdefault(described, []).append(look)
    found: list[list[Look]] = []
    for group in groups.values():
        pattern = _pattern([look.name for look in group])
        caught = {path.relative_to(folder).as_posix() for path in folder.glob(pattern)}
        alone = caught != {look.name for look in group} or fnmatch.fnmatch(CUSTOMERS, pattern)
        found += [[look] for look in group] if alone else [group]
    return found


def _readings(group: Sequence[Look]) -> str:
    names = [look.name for look in group]
    lines = ["[[readings]]", f'files = "{_pattern(names)}"']
    if len(names) > 1:
        lines[-1] += f"  # {len(names)} files alike, {names[0]} to {names[-1]}"
    lines += [f"# {remark}" for remark in dict.fromkeys(remark for look in group for remark in look.remarks)][:8]
    lines += [f"{key} = {value}  # {why}" for key, value, why in group[0].keys]
    lines += [f"#? {key} = {value}  # {ask}" for key, value, ask in group[0].questions]
    return "\n".join(lines)


def _pattern(names: Sequence[str]) -> str:
    """A pattern that matches some names: their common beginning and end."""
    if len(names) == 1:
        return names[0]
    shortest = min(len(name) for name in names)
    start = next((n for n in range(shortest) if len({name[n] for name in names}) > 1), shortest)
    end = next((n for n in range(shortest - start) if len({name[-1 - n] for name in names}) > 1), shortest - start)
    return f"{names[0][:start]}*{names[0][len(names[0]) - end :]}"


def _weather(look: Look) -> str:
    lines = ["[weather]", f'file = "{look.name}"', *(f"{key} = {value}  # {why}" for key, value, why in look.keys)]
    return "\n".join([*lines, *(f"#? {key} = {value}  # {ask}" for key, value, ask in look.questions)])


def _strange(look: Look) -> str:
    return f"# not understood: {look.name}: {'; '.join(look.remarks)}"


def _write_study(path: Path, body: Sequence[str], looks: Sequence[Look]) -> tuple[Path, ...]:
    if path.exists():
        if not body:
            return ()
        added = "\n\n".join(body).splitlines()
        with path.open("a", encoding="utf-8") as file:
            file.write(
                "\n# Found since this file was drafted:\n" + "".join(f"# {line}".rstrip() + "\n" for line in added)
            )
        return (path,)
    minutes = max((look.interval_min for look in looks), default=0)
    why = f"[min]; the readings are of {minutes} min" if minutes else "[min]; the utility's loading standard states it"
    head = HEAD.format(interval=minutes or 60, interval_why=why)
    described = "\n\n".join(body)
    path.write_text(f'{head}\n{described}\n\n[customers]\ntable = "{CUSTOMERS}"\n{TAIL}', encoding="utf-8")
    return (path,)


def _write_table(path: Path, customers: Sequence[str]) -> tuple[Path, ...]:
    if path.exists():
        text = path.read_text(encoding="utf-8-sig")
        new = [name for name in customers if name not in text]
        if not new:
            return ()
        end = "" if text.endswith("\n") else "\n"
        path.write_text(
            text + end + "# new in the meter files:\n" + "".join(f"# {name}\n" for name in new), encoding="utf-8"
        )
        return (path,)
    head = "id,customer_class,role,transformer,annual_kwh,service_rating_kw,export,devices\n"
    rows = "".join(f"{_cell(name)},,,,,,,\n" for name in customers)
    path.write_text(head + rows, encoding="utf-8")
    return (path,)


def _cell(text: str) -> str:
    if any(sign in text for sign in ',"\n') or text.startswith("#"):
        return '"' + text.replace('"', '""') + '"'
    return text
