"""What a person reads: exact text at fixed widths, no cut digits, ASCII and colour when they should."""

from __future__ import annotations

import io
import re

import pytest
from conftest import PROJECT
from rich.text import Text

from rfstage import Job, design, load_job
from rfstage.report.design import summary
from rfstage.report.page import Cell, Look, columns, look_for, note, pairs, print_page

GOLDEN = PROJECT / "tests" / "golden"
LANTERN = load_job(PROJECT / "examples" / "lantern.toml")


def page(job, look):
    return "\n".join(line.plain for line in summary(design(job), look)) + "\n"


@pytest.mark.parametrize(
    ("name", "width", "ascii_only"), [("lantern", 80, False), ("gallery", 120, False), ("tower", 80, True)]
)
def test_the_summary_reads_exactly_as_it_should(name, width, ascii_only, monkeypatch):
    monkeypatch.chdir(PROJECT)
    got = page(load_job(PROJECT / "examples" / f"{name}.toml"), Look(width, ascii_only))
    # REGRESSION: our own page, looked at by eye; the numbers in it are checked elsewhere
    assert got == (GOLDEN / f"{name}_{width}.txt").read_text(encoding="utf-8")


@pytest.mark.parametrize("width", [80, 120])
@pytest.mark.parametrize("name", ["lantern", "gallery", "tower"])
def test_no_line_is_wider_than_the_terminal(name, width):
    made = design(load_job(PROJECT / "examples" / f"{name}.toml"))
    assert max(len(line.plain) for line in summary(made, Look(width))) <= width


def test_an_ascii_page_is_ascii():
    assert page(LANTERN, Look(80, ascii=True)).isascii()


def test_a_narrow_pipe_cuts_no_digit(run):
    wide, narrow = (
        run("design", "--carrier", "7.1MHz", "--power", "10W", "--angle", "120", "--supply", "13.8", width=width).stdout
        for width in (120, 60)
    )
    figures = re.compile(r"−?\d+(?:\.\d+)?")
    # a wide page shows two columns more; every figure of the narrow one stands whole in it
    assert len(figures.findall(narrow)) > 100
    assert set(figures.findall(narrow)) <= set(figures.findall(wide))
    assert "…" not in narrow


def test_an_encoding_that_holds_no_omega_gets_ascii(run):
    done = run(
        "design",
        "--carrier",
        "7.1MHz",
        "--power",
        "10W",
        "--angle",
        "120",
        "--supply",
        "13.8",
        env={"PYTHONIOENCODING": "ascii"},
    )
    assert done.stderr == ""
    assert done.stdout.isascii()
    assert "ohm" in done.stdout


class Terminal(io.StringIO):
    encoding = "utf-8"

    def isatty(self):
        return True


@pytest.mark.parametrize(
    ("plain", "no_color", "coloured"), [(False, False, True), (True, False, False), (False, True, False)]
)
def test_colour_only_on_a_terminal_that_wants_it(monkeypatch, plain, no_color, coloured):
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.delenv("NO_COLOR", raising=False)
    if no_color:
        monkeypatch.setenv("NO_COLOR", "1")
    screen = Terminal()
    print_page([Text("needs more", "red")], plain=plain, stream=screen)
    assert ("\x1b[31m" in screen.getvalue()) is coloured
    assert "needs more" in screen.getvalue()


def test_words_from_a_file_are_not_taken_as_markup():
    screen = io.StringIO()
    print_page(note(Look(), "[bad] and [red]"), plain=False, stream=screen)
    assert "[bad] and [red]" in screen.getvalue()


def test_columns_align_by_the_page_s_own_alphabet():
    lines = columns(Look(ascii=True), [[Cell("5 Ω"), Cell("a")], [Cell("50"), Cell("b")]])
    assert [line.plain for line in lines] == ["  5 ohm  a", "  50     b"]


def test_pairs_use_as_many_columns_as_fit():
    items = [(f"name {k}", "1.00 V") for k in range(6)]
    assert len(pairs(Look(80), items)) == 2
    assert len(pairs(Look(40), items)) == 3
    assert len(pairs(Look(24), items)) == 6


def test_the_look_follows_the_stream():
    assert look_for(Terminal(), plain=False).ascii is False
    assert look_for(Terminal(), plain=True).ascii is True


def test_the_words_follow_the_device_family():
    words = {"bipolar": ("collector", "base"), "fet": ("drain", "gate"), "tube": ("anode", "grid")}
    for family, (electrode, control) in words.items():
        text = page(
            Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=50.0, family=family, threshold=1.0), Look()
        )
        assert f"peak {electrode} voltage" in text
        assert f"{control} drive without bias" in text


def test_an_order_the_ideal_pulse_lacks_says_so():
    text = page(Job(carrier=7.1e6, power=10.0, conduction_angle=180.0, supply=13.8), Look())
    assert text.count("none in the ideal pulse") == 4


def test_a_rating_that_is_exceeded_says_by_how_much():
    text = page(
        Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, max_voltage=20.0, max_current=50.0), Look()
    )
    assert re.search(r"EXCEEDED  rating: greatest voltage 20.0 V, the stage asks 26.5 V: 32.\d % too much", text)
    assert "within    rating: greatest current 50.0 A" in text
