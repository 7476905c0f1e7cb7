"""The report: every number computed, every text a text, the same bytes twice, nothing overwritten unasked."""

from __future__ import annotations

import json
import math
import re
import shutil
import subprocess
from collections import Counter
from dataclasses import replace
from html.parser import HTMLParser
from importlib.resources import files
from pathlib import Path

import jsonschema
import pandas as pd
import pytest
from casefile import CASE, RECORD, write_case
from test_findings import QUIET

from springlife import units
from springlife.cli import main
from springlife.errors import FileError, InputError
from springlife.life.assess import Assessment, assess
from springlife.life.case import load_case
from springlife.life.rig import rig
from springlife.life.scatter import scatter
from springlife.life.surge import with_surge
from springlife.report import bundle
from springlife.report.blocks import Worked
from springlife.report.bundle import write_report
from springlife.report.contents import CAUTIONS, Report, Studies, report_of
from springlife.report.page import page
from springlife.report.sheet import UNDATED, sheet, widths

ROOT = Path(__file__).parent.parent
SEAT, PUMP = (ROOT / "loadcases" / name / "case.toml" for name in ("forwarder-seat", "dosing-pump"))
needs_pdftotext = pytest.mark.skipif(not shutil.which("pdftotext"), reason="pdftotext is not installed")
needs_chromium = pytest.mark.skipif(not shutil.which("chromium"), reason="chromium is not installed")


def told(result: Assessment) -> Report:
    return report_of(result, Studies(), date="", command="springlife report case.toml")


def words(report: Report) -> str:
    """All text of a report, formulas too, as one string."""
    return json.dumps(report.to_dict(), ensure_ascii=False)


# --- numbers ------------------------------------------------------------------------------------

KINDS = {"in": "length", "mm": "length", "MPa": "stress", "kpsi": "stress", "N/mm": "rate", "lbf/in": "rate",
         "N": "force", "lbf": "force", "Hz": "frequency", "g": "mass", "lb": "mass"}  # fmt: skip
QUANTITY = re.compile(r"(?P<number>\d+\.?\d*(?:e-?\d+)?)(?: (?P<unit>N/mm|lbf/in|MPa|kpsi|mm|in|lbf|Hz|lb|N|g)\b)?")


def reckoned(text: str) -> float:
    """Work a line of numbers with units out by itself: SI in, SI out."""

    def si(match: re.Match[str]) -> str:
        unit = match["unit"]
        return repr(units.parse(f"{match['number']} {unit}", KINDS[unit]) if unit else float(match["number"]))

    sum_ = QUANTITY.sub(si, text)
    for sign, meant in (("^", "**"), ("·", "*"), ("−", "-"), ("π", "pi"), ("√", "sqrt")):
        sum_ = sum_.replace(sign, meant)
    return float(eval(sum_, {"__builtins__": {}}, {"pi": math.pi, "sqrt": math.sqrt, "ln": math.log}))


VARIANTS = [
    ({}, {}),
    ({"shot_peened": False}, {"criterion": "goodman", "miner": "elementary", "stress_factor": "wahl"}),
    ({"ends": "squared", "measured_rate": "24 N/mm"}, {"criterion": "asme-elliptic", "curvature_on": "alternating"}),
    ({"set_removed": False, "supports": "pivoted-pivoted"}, {"criterion": "sines", "residue": "half"}),
    ({"tensile_strength": "1500 MPa"}, {"endurance": "handbook"}),
]


@pytest.mark.parametrize("path", [SEAT, PUMP], ids=lambda path: path.parent.name)
@pytest.mark.parametrize(("spring", "judge"), VARIANTS)
def test_every_worked_number_can_be_worked_out_again(path: Path, spring: dict, judge: dict) -> None:
    """The numbers printed, evaluated here, give the result printed: to the digits printed."""
    if path == PUMP and "measured_rate" in spring:
        spring = spring | {"measured_rate": "9.3 N/mm"}
    result = assess(load_case(path).varied("variant", spring, judge, ""))
    blocks = [block for section in told(result).sections for block in section.blocks if isinstance(block, Worked)]
    assert len(blocks) > 15
    for block in blocks:
        assert reckoned(block.numbers) == pytest.approx(reckoned(block.result), rel=1e-3), block


def test_one_input_moves_every_number_that_hangs_on_it(tmp_path: Path) -> None:
    """A thicker wire: each number is the new assessment's, and the old ones are gone from text, table and figure."""
    old, new = (
        assess(load_case(write_case(tmp_path, QUIET, None)).varied("v", {"wire_diameter": d}, {}, ""))
        for d in ("2.0 mm", "2.1 mm")
    )

    def numbers(result: Assessment) -> list[str]:
        j, say = result.judgement, result.say
        return [
            say(j.spring.wire_diameter, "length"), say(j.spring.rate, "rate"), say(j.spring.Sut, "stress"),
            say(j.spring.static_limit, "stress"), say(j.spring.mass, "mass"), say(j.spring.surge_frequency, "frequency"),
            say(j.worst.tau_a, "stress"), say(j.worst.tau_m, "stress"), say(j.model.curve.strength_at_knee, "stress"),
            units.significant(j.damage_at_target, 3), units.significant(j.stress_margin, 3),
            say(j.spring.solid_deflection, "length"),
        ]  # fmt: skip

    before, after = words(told(old)), words(told(new))
    for was, now in zip(numbers(old), numbers(new), strict=True):
        assert was != now
        assert re.search(rf"(?<![\d.]){re.escape(was)}\b", before) and re.search(
            rf"(?<![\d.]){re.escape(now)}\b", after
        )
        assert not re.search(rf"(?<![\d.]){re.escape(was)}\b", after), was
    drawn = {figure.name: figure.draw for figure in told(new).figures}
    texts = [text.get_text() for text in drawn["spring"]().axes[0].texts]
    assert new.say(new.judgement.spring.solid_length, "length") in texts
    labels = [text.get_text() for text in drawn["haigh"]().axes[0].get_legend().texts]
    assert any(new.say.number(new.judgement.model.curve.strength_at_knee, "stress", 3) in label for label in labels)


# --- page one -----------------------------------------------------------------------------------


def front(report: Report) -> str:
    return json.dumps(report.to_dict()["front"], ensure_ascii=False)


def test_page_one_says_what_a_reviewer_asks_first(tmp_path: Path) -> None:
    text = (
        QUIET.replace('"20 mm"', '"32 mm"')
        + '[[waive]]\nfinding = "past-solid"\nby = "A. Nyberg"\nreason = "stop hit"\n'
    )
    report = told(assess(write_case(tmp_path, text, None)))
    said = front(report)
    for asked in ("target", "life", "reliability", "governed by", "fatigue", "yield in service", "yield at solid",
                  "solid clearance", "buckling", "surge", "A. Nyberg", "stop hit", "allowed", "event work"):  # fmt: skip
        assert asked in said, asked
    assert report.to_dict()["verdict"] in {"MEETS THE TARGET", "FALLS SHORT OF THE TARGET", "JUDGEMENT WITHHELD"}
    everything = words(report)
    assert all(caution in everything for caution in CAUTIONS)


def test_optional_sections_stand_only_when_asked_for(tmp_path: Path) -> None:
    titles = [section.title for section in told(assess(write_case(tmp_path, QUIET, None))).sections]
    assert not {"Options", "Scatter", "Surge: the wave in the coils"} & set(titles)
    assert titles[-3:] == ["Assumptions, what is not covered, cautions", "Sources", "Traceability"]


# --- the folder ---------------------------------------------------------------------------------

NAMES = ["<script>alert(1)</script>", "#import cost $5$ *bold*", "שלום عربي", "衝撃 impact", "long" * 60]
EXPECTED = {
    "report.pdf", "report.html", "result.json", "cycles.csv", "cycles.parquet", "inputs.sha256", "case/case.toml",
}  # fmt: skip


def odd_case(folder: Path) -> Path:
    """Every name, title and note is something that a typesetter or a browser could read as its own."""
    events = "".join(f"[[duty.event]]\nname = '{name}'\nblocks = [{{low = '5 mm', high = '{20 + i} mm', cycles = 9}}]\n"
                     for i, name in enumerate(NAMES))  # fmt: skip
    head, tail = CASE.split("[[duty.event]]")
    record = "[[duty.event]]" + tail.split("[judge]")[0]
    title = "title = 'A <b>latch</b> & #let x = $1$ 衝 \"quoted\" {{ 7*7 }}'"
    text = head.replace('title = "a latch"', title + "\npart = '</title><script>'") + events + record
    text = text.replace('free_length = "60 mm"', 'free_length = "75 mm"\nguided = true')
    return write_case(
        folder,
        text + '[judge]\ncriterion = "gerber"\n[[option]]\nname = "$\\\\alpha$ <i>"\nspring.total_coils = 11\n',
        RECORD,
    )


@pytest.fixture(scope="module")
def odd(tmp_path_factory: pytest.TempPathFactory) -> Path:
    base = tmp_path_factory.mktemp("odd")
    return write_report(odd_case(base), base / "out", date="2024-05-31").folder


def test_the_folder_is_whole(odd: Path) -> None:
    names = {str(path.relative_to(odd)) for path in odd.rglob("*") if path.is_file()}
    assert names >= EXPECTED
    svg = {path.stem for path in (odd / "figures").glob("*.svg")}
    assert svg == {path.stem for path in (odd / "figures").glob("*.png")} and svg >= {
        "spring",
        "haigh",
        "history-6",
        "options",
    }
    assert (odd / "case" / "case.toml").read_bytes() == (odd.parent / "case.toml").read_bytes()
    sums = dict(reversed(line.split("  ")) for line in (odd / "inputs.sha256").read_text().splitlines())
    assert sums.keys() == {"case.toml", "work.csv"}
    cycles = pd.read_csv(odd / "cycles.csv")
    pd.testing.assert_frame_equal(cycles, pd.read_parquet(odd / "cycles.parquet"), rtol=1e-12)
    result = json.loads((odd / "result.json").read_text())
    assert cycles["damage"].sum() == pytest.approx(result["damage_per_pass"], rel=1e-12)
    assert sum(path.stat().st_size for path in odd.rglob("*") if path.is_file()) < 2_000_000


class Page(HTMLParser):
    """What a browser would make of the page: elements, their text, attributes that fetch."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: Counter[str] = Counter()
        self.ids: Counter[str] = Counter()
        self.fetched: list[str] = []
        self.linked: list[str] = []
        self.texts: list[str] = []
        self.unnamed: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        found = {key: value or "" for key, value in attrs}
        self.tags[tag] += 1
        self.ids.update([found["id"]] if "id" in found else [])
        for key in ("src", "href", "xlink:href", "data", "action"):
            value = found.get(key, "")
            (self.linked if value.startswith("#") else self.fetched).append(value) if value else None
        if found.get("role") == "img" and not found.get("aria-label"):
            self.unnamed.append(tag)

    def handle_data(self, data: str) -> None:
        self.texts.append(data)


def test_in_the_page_text_is_text_and_nothing_is_fetched(odd: Path) -> None:
    seen = Page((odd / "report.html").read_text(encoding="utf-8"))
    whole = "".join(seen.texts)
    assert all(name in whole for name in NAMES)
    assert '#let x = $1$ 衝 "quoted" {{ 7*7 }}' in whole and "</title><script>" in whole
    assert seen.tags["script"] == 1 and seen.tags["b"] == 0 and seen.tags["i"] == 0 and seen.tags["title"] >= 1
    assert all(link.startswith("data:image/png;base64,") for link in seen.fetched)
    assert max(seen.ids.values()) == 1
    assert {link[1:] for link in seen.linked} <= seen.ids.keys()
    assert not seen.unnamed and seen.tags["figure"] == len(list((odd / "figures").glob("*.svg")))


def browsed(file: Path, folder: Path) -> tuple[str, str]:
    """Open a page in a browser: what it complains of, and the document after its scripts have run."""
    run = subprocess.run(
        ["chromium", "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
         "--disable-background-networking", f"--user-data-dir={folder}", "--enable-logging=stderr", "--dump-dom",
         file.as_uri()], capture_output=True, text=True, check=True, timeout=120,
    )  # fmt: skip
    return "\n".join(line for line in run.stderr.splitlines() if "CONSOLE" in line), run.stdout


@needs_chromium
def test_a_browser_opens_the_page_without_complaint_and_its_tables_sort(odd: Path, tmp_path: Path) -> None:
    complaints, _ = browsed(odd / "report.html", tmp_path / "profile")
    assert complaints == ""
    # The page's own guard would stop a second script, so the copy that clicks goes without it.
    text = (odd / "report.html").read_text(encoding="utf-8")
    text = re.sub(r'<meta http-equiv="Content-Security-Policy"[^>]*>', "", text)
    click = "<script>document.querySelectorAll('caption').forEach(c => { if (c.textContent.startsWith('Lengths')) "
    click += "c.parentNode.querySelectorAll('button')[1].click(); });</script></body>"
    copy = tmp_path / "click.html"
    copy.write_text(text.replace("</body>", click), encoding="utf-8")
    complaints, document = browsed(copy, tmp_path / "profile")
    assert complaints == ""
    table = document[document.index("<caption>Lengths and forces</caption>") :]
    body = re.findall(r"<td[^>]*>([^<]*)</td>", table[: table.index("</table>")])
    lengths = [float(cell) for cell in body[1::5]]
    assert lengths == sorted(lengths) and len(set(lengths)) > 2 and body[0] == "solid"


def pdf_text(pdf: Path) -> str:
    run = subprocess.run(["pdftotext", "-layout", str(pdf), "-"], capture_output=True, text=True, check=True)
    return run.stdout


@needs_pdftotext
def test_in_the_pdf_text_is_text_and_a_lost_shape_is_noted(odd: Path) -> None:
    text = pdf_text(odd / "report.pdf")
    flat = re.sub(r"\s|\u200b", "", text)
    for name in (NAMES[0], NAMES[1], NAMES[4], "A<b>latch</b>&#letx=$1$□", "□□impact"):
        assert name.replace(" ", "") in flat, name
    assert "שלום" in flat or "םולש" in flat  # pdftotext gives either order
    assert "havenoshapeinthefontofthisfileandareshownas□(U+6483,U+885D)" in flat
    assert "□" not in (odd / "report.html").read_text(encoding="utf-8").split("<svg")[0]


def test_the_pdf_can_be_archived_and_read_aloud(odd: Path) -> None:
    pdf = (odd / "report.pdf").read_bytes()
    for mark in (b"<pdfaid:part>2<", b"<pdfaid:conformance>B<", b"<pdfuaid:part>1<", b"/Lang", b"/StructTreeRoot"):
        assert mark in pdf, mark
    assert b"2024-05-31T" in pdf


def test_the_same_case_gives_the_same_bytes(odd: Path, tmp_path: Path) -> None:
    again = write_report(odd_case(tmp_path), tmp_path / "elsewhere", date="2024-05-31").folder
    first = {str(path.relative_to(odd)): path.read_bytes() for path in odd.rglob("*") if path.is_file()}
    second = {str(path.relative_to(again)): path.read_bytes() for path in again.rglob("*") if path.is_file()}
    assert first.keys() == second.keys()
    assert [name for name in first if first[name] != second[name]] == []


BLANK = '<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 72 36" width="72pt" height="36pt"></svg>'


def test_two_hundred_events_on_letter_paper(tmp_path: Path) -> None:
    blocks = 'blocks = [{ low = "5 mm", high = "HIGH mm", cycles = 100 }]'
    events = "".join(
        f'[[duty.event]]\nname = "event {n}"\n{blocks.replace("HIGH", str(12 + n / 25))}\n' for n in range(200)
    )
    head = QUIET.split("[[duty.event]]")[0]
    report = told(assess(write_case(tmp_path, head + events + '[judge]\ncriterion = "gerber"\n', None)))
    blank = {figure.name: BLANK for figure in report.figures}
    assert "".join(Page(page(report, blank)).texts).count("event 199") >= 2
    pdf = sheet(report, blank, paper="letter")
    assert re.search(rb"/MediaBox ?\[0 0 612 792\]", pdf)
    assert UNDATED.isoformat().encode() in pdf
    if shutil.which("pdftotext"):
        (tmp_path / "report.pdf").write_bytes(pdf)
        text = pdf_text(tmp_path / "report.pdf")
        assert all(re.search(rf"event {n}\b", text) for n in range(200))


def test_studies_asked_for_are_told_in_their_sections() -> None:
    result = assess(PUMP)
    studies = Studies(scatter=scatter(PUMP, samples=1024), rig=rig(PUMP), surge=with_surge(result))
    report = report_of(result, studies, date="", command="")
    titles = [section.title for section in report.sections]
    assert {"Scatter", "Rig test with the duty's damage", "Surge: the wave in the coils"} <= set(titles)
    said = words(report)
    for number in (str(studies.rig.cycles), f"seed {studies.scatter.seed}", "B10", "plunger cam"):
        assert number in said, number
    assert {"tornado", "rig", "cam-1"} <= {figure.name for figure in report.figures}


def test_a_case_that_cannot_be_judged_still_has_its_report(tmp_path: Path) -> None:
    case = write_case(tmp_path, QUIET.replace('"16 mm"', '"1.5 mm"'), None)
    written = write_report(case, tmp_path / "out", ask=("rig", "scatter"))
    text = "".join(Page((written.folder / "report.html").read_text(encoding="utf-8")).texts)
    assert written.verdict == "withheld" and "JUDGEMENT WITHHELD" in text and "impossible-geometry" in text
    assert not list((written.folder / "figures").iterdir())


# --- the place ----------------------------------------------------------------------------------


def nothing_drawn(folder: Path, *rest: object) -> None:
    (folder / "report.html").write_text("new")


def test_nothing_is_overwritten_unasked(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(bundle, "_fill", nothing_drawn)
    case, out = write_case(tmp_path, QUIET, None), tmp_path / "out"
    out.mkdir()
    (out / "report.html").write_text("old")
    with pytest.raises(FileError, match=r"is there already; choose another name or add --force"):
        write_report(case, out)
    assert (out / "report.html").read_text() == "old"
    write_report(case, out, force=True)
    assert (out / "report.html").read_text() == "new"
    (out / "my notes.txt").write_text("mine")
    with pytest.raises(FileError, match=r"holds 'my notes\.txt', which is no part of a report"):
        write_report(case, out, force=True)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["case.toml", "out"]


def test_a_failure_leaves_the_old_report_and_nothing_else(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*arguments: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(bundle, "_fill", full)
    case, out = write_case(tmp_path, QUIET, None), tmp_path / "out"
    out.mkdir()
    (out / "report.html").write_text("old")
    with pytest.raises(FileError, match="No space left on device"):
        write_report(case, out, force=True)
    assert (out / "report.html").read_text() == "old"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["case.toml", "out"]


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"date": "31.5.2024"}, r"date is '31\.5\.2024'; write it as YYYY-MM-DD"),
        ({"date": "20240531"}, "write it as YYYY-MM-DD"),
        ({"paper": "a5"}, "paper 'a5' is not known; .*a4"),
        ({"ask": ("surg",)}, "study 'surg' is not known; did you mean 'surge'"),
    ],
)
def test_arguments_are_checked_before_anything_is_done(arguments: dict, message: str, tmp_path: Path) -> None:
    with pytest.raises(InputError, match=message):
        write_report(tmp_path / "none.toml", tmp_path / "out", **arguments)


def test_a_missing_parent_and_a_file_in_the_way(tmp_path: Path) -> None:
    case = write_case(tmp_path, QUIET, None)
    with pytest.raises(FileError, match="does not exist; make it first"):
        write_report(case, tmp_path / "none" / "out")
    with pytest.raises(FileError, match="is a file"):
        write_report(case, case)


def test_the_command_says_verdict_and_place(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(bundle, "_fill", nothing_drawn)
    case, out = write_case(tmp_path, QUIET, None), tmp_path / "out"
    assert main(["report", str(case), "-o", str(out)]) == 0
    assert capsys.readouterr().out == f"MEETS: {out}\n"
    assert main(["report", str(case), "-o", str(out)]) == 2
    assert "add --force" in capsys.readouterr().err
    assert main(["report", str(case), "-o", str(out), "--force", "--json"]) == 0
    assert json.loads(capsys.readouterr().out) == {"folder": str(out), "verdict": "meets", "files": ["report.html"]}


@pytest.mark.parametrize(("path", "name"), [("loadcases/pump/case.toml", "pump"), ("my springs/a b.toml", "a-b")])
def test_the_folder_is_named_after_the_case(path: str, name: str) -> None:
    assert bundle.default_folder(path) == Path("reports") / name


def test_surge_decides_when_it_was_asked_for() -> None:
    result = assess(PUMP)
    assert replace(told(result), surge_verdict="falls short").to_dict()["verdict"] == "FALLS SHORT OF THE TARGET"


def test_columns_share_the_width_only_when_they_need_it() -> None:
    assert widths(["a", "b"], [["x" * 24, "y" * 25]]) == [0, 25]
    assert widths(["a"], [["x" * 300]]) == [60]


# --- the schema ---------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def schema() -> jsonschema.Draft202012Validator:
    data = json.loads(files("springlife").joinpath("data/result.schema.json").read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator.check_schema(data)
    return jsonschema.Draft202012Validator(data)


CASES = {"sound": QUIET, "impossible": QUIET.replace('"16 mm"', '"1.5 mm"'), "past solid": QUIET.replace('"20 mm"', '"32 mm"'),
         "past the intercept": QUIET.replace("total_coils", 'tensile_strength = "500 MPa"\ntotal_coils')}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_every_judgement_is_as_the_schema_says(
    name: str, tmp_path: Path, schema: jsonschema.Draft202012Validator
) -> None:
    schema.validate(json.loads(json.dumps(assess(write_case(tmp_path, CASES[name], None)).to_dict())))


def test_the_demos_and_a_whole_report_are_as_the_schema_says(
    odd: Path, schema: jsonschema.Draft202012Validator
) -> None:
    schema.validate(json.loads((odd / "result.json").read_text(encoding="utf-8")))
    for path in (SEAT, PUMP):
        schema.validate(json.loads(json.dumps(assess(path).to_dict())))


def test_the_schema_refuses_what_it_should(schema: jsonschema.Draft202012Validator, tmp_path: Path) -> None:
    good = assess(write_case(tmp_path, QUIET, None)).to_dict()
    for broken in ({"verdict": "fine"}, {"life_passes": "many"}, {"unheard": 1}, {"target": {"value": 1}}):
        assert not schema.is_valid(good | broken), broken
    assert not schema.is_valid({key: value for key, value in good.items() if key != "band"})
