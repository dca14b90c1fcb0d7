"""The report of one record, by what stands in it; how it looks is looked at by eye."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import pytest

from sinkwright.errors import RecordError
from sinkwright.records import RecordWriter
from sinkwright.reports import write_report
from sinkwright.reports.rendering import check_packages
from tests.host.records.made_up import header, regulation, samples, write_run


class Text(HTMLParser):
    """The text of a page, without drawings and style."""

    def __init__(self) -> None:
        super().__init__()
        self.lines: list[str] = []
        self._hidden = 0

    def handle_starttag(self, tag: str, attrs: object) -> None:
        self._hidden += tag in ("svg", "style")

    def handle_endtag(self, tag: str) -> None:
        self._hidden -= tag in ("svg", "style")

    def handle_data(self, data: str) -> None:
        if not self._hidden and data.strip():
            self.lines.append(" ".join(data.split()))


def lines_of(page: str) -> list[str]:
    parser = Text()
    parser.feed(page)
    return parser.lines


def text_of(page: str) -> str:
    return " ".join(lines_of(page))


def page_of(tmp_path: Path, **changes: object) -> str:
    return write_report(write_run(tmp_path / "r.sqlite", **changes)).read_text(encoding="utf-8")


def page_one(page: str) -> str:
    return text_of(page.split('<section class="page-one">')[1].split("</section>")[0])


def test_page_one_stands_alone(tmp_path: Path) -> None:
    text = page_one(page_of(tmp_path))
    for fact in (
        "bench supply no. 7",
        "A. Tester",
        "14 March 2026, 09:26:53 UTC",
        "after-repair",
        "INCONCLUSIVE",
        "1 of 2 quantities that have bounds could not be decided",
        "Load regulation 0.749 % ± 0.043 % at most 1 % Pass",
        "What would settle it: Calibrate the board's voltage",
        "What was not tested",
        "Recovery after a load step",
        "uncalibrated: parts' tolerances",
    ):
        assert fact in text, fact


def test_what_follows_has_curves_contributions_events_board_plan_and_cautions(tmp_path: Path) -> None:
    page = page_of(tmp_path)
    text = text_of(page)
    assert page.count("<svg") == 3
    for fact in (
        "voltage gain: divider",
        "The load sinks 2.000 A.",
        "a1b2c3d4e5f60718",
        "MicroPython 1.28.0 unix",
        "rated_current_A = 2.0",
        "not a safety function",
        "hot enough to burn",
        "licensed people",
    ):
        assert fact in text, fact


def test_simulated_is_said_on_the_page_in_the_title_and_on_every_printed_page(tmp_path: Path) -> None:
    page = page_of(tmp_path)
    assert "<title>SIMULATED: " in page
    assert "SIMULATED: nothing here was measured on a real source." in text_of(page)
    assert '@top-center { content: "SIMULATED' in page
    assert 'class="watermark"' in page


def test_a_real_run_is_not_called_simulated(tmp_path: Path) -> None:
    assert "SIMULATED" not in page_of(tmp_path, simulated=False)


def test_the_page_needs_no_network_and_no_script(tmp_path: Path) -> None:
    page = page_of(tmp_path)
    assert not re.search(r"<script|<link|<img|@import|url\((?!#)", page)
    assert not re.search(r'(?:href|src)="(?!#)', page)
    assert "default-src 'none'" in page


def test_the_same_record_gives_the_same_bytes(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    assert write_report(path, tmp_path / "a").read_bytes() == write_report(path, tmp_path / "b").read_bytes()


def test_text_of_a_record_is_never_markup(tmp_path: Path) -> None:
    nasty = "<script>alert(1)</script>\"'&"
    board = {"name": nasty, "board_id": nasty, "control_period_s": nasty, "board_file_crc": nasty}
    page = page_of(
        tmp_path, item=nasty, operator=nasty, plan_name=nasty, plan_text=nasty, board=board, url=nasty
    )
    assert "<script" not in page
    assert nasty in text_of(page)


def test_an_unfinished_run_is_reported_as_such(tmp_path: Path) -> None:
    text = page_one(page_of(tmp_path, state="open"))
    assert "this run was not finished" in text
    assert "The run did not come to its end." in text


def test_a_protection_and_what_was_left_out_stand_on_page_one(tmp_path: Path) -> None:
    stopped = replace(
        regulation(),
        stopped_by="heatsink-hot",
        notes=("The board stopped by itself: the heatsink reached 86 °C.",),
    )
    with RecordWriter.create(tmp_path / "r.sqlite", header()) as writer:
        writer.add_samples(list(samples([2.0] * 20)))
        writer.add_result(stopped)
        writer.finish("fault")
    text = page_one(write_report(writer.path).read_text(encoding="utf-8"))
    assert "protection of the board: heatsink-hot" in text
    assert "the heatsink reached 86 °C" in text
    assert "Hold: not carried out." in text


def test_a_record_without_samples_and_results_still_makes_a_page(tmp_path: Path) -> None:
    with RecordWriter.create(tmp_path / "r.sqlite", header(plan_text="", item="")) as writer:
        writer.finish("lost")
    text = text_of(write_report(writer.path).read_text(encoding="utf-8"))
    assert "No test came to a result." in text
    assert "the link to the board was lost" in text


@pytest.mark.parametrize("out", ["file/r.html", "/proc/r.html"])
def test_a_page_that_cannot_be_written_is_told_in_words(out: str, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    with pytest.raises(RecordError, match="cannot be written"):
        write_report(write_run(tmp_path / "r.sqlite"), tmp_path / out)


def test_the_record_is_never_overwritten_by_its_report(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    with pytest.raises(RecordError, match="the record itself"):
        write_report(path, path)


def test_without_its_packages_a_report_names_the_extra(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("importlib.util.find_spec", lambda name: None)
    with pytest.raises(RecordError, match=r"jinja2, matplotlib.*sinkwright\[report\]"):
        check_packages()


def test_importing_records_and_reports_loads_no_heavy_package_and_no_device_code() -> None:
    modules = (
        "records",
        "records.export",
        "reports",
        "reports.contents",
        "reports.comparison",
        "reports.rendering",
    )
    unwanted = {"numpy", "matplotlib", "jinja2", "pyarrow", "click", "serial", "construct", "sinkwright_wire",
                "sinkwright.link", "sinkwright.instrument"}  # fmt: skip
    imports = "\n".join(f"import sinkwright.{name}" for name in modules)
    script = f"import sys\n{imports}\nprint(sorted({unwanted!r} & set(sys.modules)))"
    env = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
    told = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True, env=env)
    assert told.stdout == "[]\n"
