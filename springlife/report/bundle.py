"""The report's folder: PDF, page, result, cycles, figures, the case as read and what it was read from.

Written beside its place and renamed into it. A folder that is there already is replaced only when asked, and only
when it holds nothing but a report.
"""

from __future__ import annotations

import json
import re
import shutil
import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date as day
from pathlib import Path
from typing import TYPE_CHECKING, Any

from springlife.errors import FileError, InputError, nearest
from springlife.life.assess import Assessment, assess
from springlife.life.case import Case, load_case, read_bytes
from springlife.report.contents import Report, Studies, report_of
from springlife.report.output import save_figure, svg_of
from springlife.report.sheet import PAPERS

if TYPE_CHECKING:
    from collections.abc import Iterator

    from springlife.life.compare import Comparison

WRITTEN = {
    "report.pdf", "report.html", "result.json", "cycles.parquet", "cycles.csv", "figures", "case", "inputs.sha256"
}  # fmt: skip
STUDIES = ("scatter", "rig", "surge")
Watcher = Callable[[str], object]  # told what is done next


@dataclass(frozen=True)
class Written:
    """A report that has been written: where, and what it says."""

    folder: Path
    report: Report

    @property
    def verdict(self) -> str:
        """The verdict; with surge asked for, that of the surge study."""
        return self.report.verdict

    def to_dict(self) -> dict[str, Any]:
        """Give folder, verdict and files for JSON."""
        files = sorted(str(path.relative_to(self.folder)) for path in self.folder.rglob("*") if path.is_file())
        return {"folder": str(self.folder), "verdict": self.verdict, "files": files}


def write_report(
    case: Case | str | Path,
    folder: str | Path,
    *,
    paper: str = "a4",
    date: str | None = None,
    ask: tuple[str, ...] = (),
    force: bool = False,
    watch: Watcher = lambda what: None,
) -> Written:
    """Judge a case and write its report.

    Parameters
    ----------
    folder : path
        Of the report; the folder above it must exist.
    paper : str
        A key of :data:`springlife.report.sheet.PAPERS`.
    date : str, optional
        YYYY-MM-DD; None takes the case's own date, or none.
    ask : tuple of str
        Of :data:`STUDIES`: what the report shall hold beside the judgement.

    Raises
    ------
    FileError, InputError
        When the case cannot be used, an argument is not known, or the folder is there already.
    """
    folder = Path(folder)
    if paper not in PAPERS:
        raise InputError(f"paper {paper!r} is not known; {nearest(paper, PAPERS)}")
    for study in ask:
        if study not in STUDIES:
            raise InputError(f"study {study!r} is not known; {nearest(study, STUDIES)}")
    if date is not None:
        _check_date(date)
    _check_place(folder, force)
    case = case if isinstance(case, Case) else load_case(case)
    result, studies = _judged(case, ask, watch)
    options = [f"--paper {paper}", *([f"--date {date}"] if date else []), *(f"--{study}" for study in ask)]
    command = f"springlife report {case.path.name} {' '.join(options)}"
    report = report_of(result, studies, date=case.input.date if date is None else date, command=command)
    try:
        beside = Path(tempfile.mkdtemp(prefix=f".{folder.name}-", dir=folder.parent))
    except OSError as error:
        raise FileError(f"{folder}: cannot be written ({error.strerror}); choose another place") from error
    try:
        _fill(beside, report, studies, paper, watch)
        beside.chmod(0o755)
        _put(beside, folder)
    except OSError as error:
        raise FileError(f"{folder}: cannot be written ({error.strerror or error}); choose another place") from error
    finally:
        shutil.rmtree(beside, ignore_errors=True)
    return Written(folder, report)


def _check_date(text: str) -> None:
    try:
        good = day.fromisoformat(text).isoformat() == text
    except ValueError:
        good = False
    if not good:
        raise InputError(f"date is {text!r}; write it as YYYY-MM-DD, such as 2024-05-31")


def _check_place(folder: Path, force: bool) -> None:
    """Refuse a place that holds anything but an older report."""
    if not folder.parent.is_dir():
        raise FileError(f"{folder}: the folder {folder.parent} does not exist; make it first")
    if not folder.exists():
        return
    if not folder.is_dir():
        raise FileError(f"{folder}: is a file; name a folder for the report")
    foreign = sorted(path.name for path in folder.iterdir() if path.name not in WRITTEN)
    if foreign:
        raise FileError(f"{folder}: holds {foreign[0]!r}, which is no part of a report; name a folder of its own")
    if any(folder.iterdir()) and not force:
        raise FileError(f"{folder}: is there already; choose another name or add --force")


def _put(beside: Path, folder: Path) -> None:
    """Rename the new folder into place; an older one goes only once it is out of the way."""
    if not folder.exists():
        beside.rename(folder)
        return
    old = Path(tempfile.mkdtemp(prefix=f".{folder.name}-old-", dir=folder.parent))
    folder.replace(old)
    try:
        beside.rename(folder)
    except OSError:
        old.rename(folder)
        raise
    shutil.rmtree(old, ignore_errors=True)


def _judged(case: Case, ask: tuple[str, ...], watch: Watcher) -> tuple[Assessment, Studies]:
    """Judge the case and its options, and do the studies asked for; a case without numbers has none."""
    from springlife.life.compare import compare

    watch("judging")
    comparison: Comparison | None
    try:
        comparison = compare(case)
        result = comparison.options[0].assessment
    except InputError:
        comparison, result = None, assess(case)
    if result.judgement is None:
        return result, Studies()
    if len(comparison.options if comparison else ()) < 2:
        comparison = None
    return result, Studies(comparison, **_asked(case, result, ask, watch))


def _asked(case: Case, result: Assessment, ask: tuple[str, ...], watch: Watcher) -> dict[str, Any]:
    done: dict[str, Any] = {}
    if "scatter" in ask:
        from springlife.life.scatter import scatter

        watch("scatter")
        done["scatter"] = scatter(case)
    if "rig" in ask:
        from springlife.life.rig import rig

        watch("rig test")
        done["rig"] = rig(case)
    if "surge" in ask:
        from springlife.life.surge import with_surge

        watch("surge")
        done["surge"] = with_surge(result)
    return done


def _fill(folder: Path, report: Report, studies: Studies, paper: str, watch: Watcher) -> None:
    """Write every file of the report into an empty folder."""
    from springlife.report.page import page
    from springlife.report.sheet import sheet

    (folder / "figures").mkdir()
    drawn: dict[str, str] = {}
    for figure in report.figures:
        watch(f"figure {figure.name}")
        picture = figure.draw()
        drawn[figure.name] = svg_of(picture)
        picture.set_layout_engine("none")  # laid out by now; doing it again for the pixels is half the time
        (folder / "figures" / f"{figure.name}.svg").write_text(drawn[figure.name], encoding="utf-8")
        save_figure(picture, folder / "figures" / f"{figure.name}.png")
    watch("report.html")
    (folder / "report.html").write_text(page(report, drawn), encoding="utf-8")
    watch("report.pdf")
    (folder / "report.pdf").write_bytes(sheet(report, drawn, paper=paper))
    watch("result.json")
    text = json.dumps(result_of(report, studies), indent=1, allow_nan=False, ensure_ascii=False, default=str)
    (folder / "result.json").write_text(text + "\n", encoding="utf-8")
    _write_cycles(folder, report.result)
    case = report.result.case
    (folder / "case").mkdir()
    (folder / "case" / case.path.name).write_bytes(read_bytes(case.path))
    lines = "".join(f"{digest}  {name}\n" for name, digest in report.result.inputs)
    (folder / "inputs.sha256").write_text(lines, encoding="utf-8")


def result_of(report: Report, studies: Studies) -> dict[str, Any]:
    """Return what result.json holds: the judgement, and each study under its name."""
    asked = {name: getattr(studies, name) for name in ("comparison", *STUDIES)}
    return report.result.to_dict() | {name: study.to_dict() for name, study in asked.items() if study is not None}


def _write_cycles(folder: Path, result: Assessment) -> None:
    """Write the cycles of one pass with their stresses, lives and damage, SI in the names."""
    import pandas as pd

    table = pd.DataFrame(dict(_columns(result)))
    table.to_csv(folder / "cycles.csv", index=False, lineterminator="\n")
    table.to_parquet(folder / "cycles.parquet", index=False)


def _columns(result: Assessment) -> Iterator[tuple[str, Any]]:
    j, duty = result.judgement, result.duty
    if j is None or duty is None:
        yield from ((name, []) for name in ("low_m", "high_m", "count", "damage"))
        return
    tau_a, tau_m = j.model.stress.cycles(j.cycles.low, j.cycles.high)
    names = [event.name for event in duty.events]
    yield "low_m", j.cycles.low
    yield "high_m", j.cycles.high
    yield "count", j.cycles.count
    yield "event_low", [names[i] for i in j.cycles.event_low]
    yield "event_high", [names[i] for i in j.cycles.event_high]
    yield "tau_a_Pa", tau_a
    yield "tau_m_Pa", tau_m
    yield "cycles_to_failure", j.model.cycles_to_failure(j.cycles.low, j.cycles.high)
    yield "damage", j.cycle_damage


def default_folder(case: str | Path) -> Path:
    """Return reports/NAME, named after the case file, or after its folder when the file is just "case"."""
    path = Path(case)
    name = path.resolve().parent.name if path.stem == "case" else path.stem
    return Path("reports") / (re.sub(r"[^\w.-]+", "-", name) or "case")
