"""Run sheets and the short texts that they share with the options."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from reading_helpers import read_text

from latticefit.errors import InputError
from latticefit.reading import (
    parse_assignment,
    parse_bounds,
    parse_grid,
    parse_interval,
    read_measurement,
    read_sheet,
    write_sheet,
)
from latticefit.reading.options import interval_text
from latticefit.records import ModelSettings, ReportSettings, RunSettings, SampleSettings, Sheet

INF = math.inf

FULL = """
[sample]
name = "HVT-1"
formula = "Al2O3"
atoms = 5
molar_mass = "101.96 g/mol"
mass = "12.3 mg"
melting_point = "2327 K"

[[run]]
file = "cold.csv"
label = "cold"
quantity = "Cp"
temperature = "T_K"
heat_capacity = 2
sigma = "0.02 mJ/(mol K) + 0.3%"
coverage_factor = 2
temperature_unit = "K"
heat_capacity_unit = "mJ/(mol K)"
window = "2:300"
mask = ["20:45", "200:"]

[[run]]
file = "sub/warm.csv"

[model]
terms = "debye + einstein"
mode_sum = "free"
cp_cv = "nernst-lindemann"
[model.start]
debye_theta = 300
[model.fix]
einstein1_modes = 3.5
[model.bounds]
debye_theta = [100, 500.0]
einstein1_theta = [100, inf]
einstein2_theta = [-inf, 900]
einstein3_theta = ":900"

[report]
grid = "0.5:5:0.5, 10:300:10, 298.15"
figures = "png"
out = "results"
random_seed = 7
"""


def read(folder: Path, text: str, **options: Any) -> Sheet:
    """Read a text as the sheet ``sheet.toml``."""
    (folder / "sheet.toml").write_text(text, encoding="utf-8")
    return read_sheet(folder / "sheet.toml", **options)


def test_every_key_is_read(tmp_path: Path) -> None:
    """A sheet with every key that this version has comes out as the records that it means."""
    sheet = read(tmp_path, FULL)
    assert sheet.sample == SampleSettings("HVT-1", "Al2O3", 5.0, "101.96 g/mol", "12.3 mg", "2327 K")
    first = RunSettings(
        file="cold.csv",
        label="cold",
        quantity="Cp",
        temperature="T_K",
        heat_capacity=2,
        sigma="0.02 mJ/(mol K) + 0.3%",
        coverage_factor=2.0,
        temperature_unit="K",
        heat_capacity_unit="mJ/(mol K)",
        window=((2.0, 300.0),),
        mask=((20.0, 45.0), (200.0, INF)),
    )
    assert sheet.runs == (first, RunSettings("sub/warm.csv"))
    model = sheet.model
    assert (model.terms, model.mode_sum, model.cp_cv) == ("debye + einstein", "free", "nernst-lindemann")
    assert (dict(model.start), dict(model.fix)) == ({"debye_theta": 300.0}, {"einstein1_modes": 3.5})
    assert dict(model.bounds) == {
        "debye_theta": (100.0, 500.0),
        "einstein1_theta": (100.0, INF),
        "einstein2_theta": (-INF, 900.0),
        "einstein3_theta": (-INF, 900.0),
    }
    assert sheet.report == ReportSettings("0.5:5:0.5, 10:300:10, 298.15", "png", "results", 7)


def test_smallest_sheet(tmp_path: Path) -> None:
    """A file is all that a sheet needs; the rest is at its default and is not written back."""
    sheet = read(tmp_path, '[[run]]\nfile = "a.csv"\n')
    assert sheet == Sheet(SampleSettings(), (RunSettings("a.csv"),))
    assert write_sheet(sheet) == '[[run]]\nfile = "a.csv"\n'


def test_written_sheet_is_as_a_person_writes_it() -> None:
    """Runs are written as [[run]], windows as texts, bounds as pairs with inf."""
    runs = (RunSettings("a.csv", window=((2.0, 300.0),)), RunSettings("b.csv", sigma="1%"))
    model = ModelSettings("debye", bounds={"debye_theta": (100.0, INF)})
    expected = """[sample]
formula = "Cu"

[[run]]
file = "a.csv"
window = [
    "2:300",
]

[[run]]
file = "b.csv"
sigma = "1%"

[model]
terms = "debye"

[model.bounds]
debye_theta = [
    100.0,
    inf,
]
"""
    assert write_sheet(Sheet(SampleSettings(formula="Cu"), runs, model)) == expected


RUN = '[[run]]\nfile = "a.csv"\n'
WRONG = [
    ("", "names no data; add a table [[run]] with a file"),
    ('[run]\nfile = "a.csv"\n', "[run] must be written [[run]], since a sheet may hold several"),
    ("run = 3\n", "run must be one or more tables [[run]], not 3"),
    ("run = []\n", "run must be one or more tables [[run]], not a list"),
    ("[[run]]\nlabel = 'x'\n", '[[run]] has no file; add file = "..."'),
    (RUN + "[[run]]\nlabel = 'x'\n", '[[run]] 2 has no file; add file = "..."'),
    (RUN + "[modle]\n", "unknown table [modle]; did you mean 'model'?"),
    (RUN + "[addenda]\nmass = '1 mg'\n", '[addenda] has no file; add file = "..."'),
    (RUN + "[[addenda]]\nfile = 'b.csv'\nmas = '1 mg'\n", "[[addenda]] 1 has no key 'mas'; did you mean 'mass'?"),
    ("addenda = 3\n" + RUN, "addenda must be a table [addenda] or several [[addenda]], not 3"),
    (
        RUN + "split_by = true\n",
        "[[run]] split_by must be a header in quotes or a column number from 1 on, not true or false",
    ),
    (RUN + "mask_lines = '9:3'\n", "[[run]] mask_lines: lines '9:3' must be FIRST:LAST, counted from 1"),
    (RUN + "replicates = 'mean'\n", "[[run]] replicates cannot be 'mean': known are average, drop-first and keep"),
    (RUN + "[sample]\ndensity = \"1 g/cm3\"\n", "[sample] density is not available in this version; remove it"),
    (RUN + "[sample]\ndensity = '8960 kg/m3'\n", "[sample] density is not available in this version; remove it"),
    (RUN + "[sample]\nscale_uncertainty = '1%'\n", "[sample] scale_uncertainty is not available in this version; "
     "remove it"),
    (RUN + "[sample]\nfromula = 'Cu'\n", "[sample] has no key 'fromula'; did you mean 'formula'?"),
    (RUN + "heat_capacty = 2\n", "[[run]] has no key 'heat_capacty'; did you mean 'heat_capacity'?"),
    (RUN + "[sample]\natoms = '5'\n", "[sample] atoms must be a number without quotes, not '5'"),
    (RUN + "[sample]\natoms = true\n", "[sample] atoms must be a number, not true or false"),
    (RUN + "[sample]\natoms = 0\n", "[sample] atoms must be above 0, not 0"),
    (RUN + "[sample]\nmass = 12\n", '[sample] mass must be a text with its unit, such as "12.3 mg", not 12'),
    (RUN + "[sample]\nname = ' '\n", "[sample] name is empty; leave it out or fill it in"),
    ("sample = 3\n" + RUN, "[sample] must be a table, not 3"),
    (RUN + "temperature = 0\n", "[[run]] temperature must be a header in quotes or a column number from 1 on, not 0"),
    (RUN + "sigma = 0.5\n", '[[run]] sigma must be a column or a text such as "0.5%", not 0.5'),
    (RUN + "quantity = 'cp'\n", "[[run]] quantity cannot be 'cp': known are Cp and Cv"),
    (RUN + "coverage_factor = -1\n", "[[run]] coverage_factor must be above 0, not -1"),
    (RUN + "coverage_factor = nan\n", "[[run]] coverage_factor must be a number, not nan"),
    (RUN + "window = [2, 300]\n", '[[run]] window must be a text such as "2:300" or a list of them, not a list'),
    (RUN + "mask = '45:20'\n", "[[run]] mask: interval '45:20' ends below its start; write it low:high"),
    (RUN + "[model]\nmode_sum = 'fix'\n", "[model] mode_sum cannot be 'fix': did you mean 'fixed'?"),
    (RUN + "[model]\nstart = 3\n", "[model] start must be a table of parameter names, not 3"),
    (RUN + "[model.start]\ndebye_theta = '3'\n",
     "[model] start debye_theta must be a number without quotes, not '3'"),
    (RUN + "[model.bounds]\na = [1]\n",
     "[model] bounds a must be [low, high], where a side may be -inf or inf, not a list"),
    (RUN + "[model.bounds]\na = '5'\n", "[model] bounds a must be [low, high], not '5'"),
    (RUN + "[model.bounds]\na = [5, 1]\n",
     "[model] bounds a: the lower bound must be below the upper one, not [5, 1]"),
    (RUN + "[report]\nfigures = 'pdf'\n", "[report] figures cannot be 'pdf': known are all, none, png and svg"),
    (RUN + "[report]\nrandom_seed = -1\n", "[report] random_seed must be a whole number from 0 on, not -1"),
    (RUN + "[report]\ngrid = '1:2'\n", "[report] grid: grid '1:2': '1:2' is neither a temperature nor low:high:step; "
     "write it as in '0.5:5:0.5, 10:300:10, 298.15'"),
    ("a = \n", "is not valid TOML: Invalid value (at line 1, column 5)"),
    ('[[run]]\nfile = "../a.csv"\n', "'../a.csv' lies outside the folder of the sheet; give --allow-outside"),
    ('[[run]]\nfile = "/etc/passwd"\n', "'/etc/passwd' lies outside the folder of the sheet; give --allow-outside"),
    (RUN + "[report]\nout = '../x'\n", "'../x' lies outside the folder of the sheet; give --allow-outside"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "sentence"), WRONG, ids=[sentence[:50] for _, sentence in WRONG])
def test_wrong_sheet(text: str, sentence: str, tmp_path: Path) -> None:
    """What is wrong in a sheet is refused with table, key, value and the nearest known word."""
    with pytest.raises(InputError) as caught:
        read(tmp_path, text)
    assert str(caught.value) == f"{tmp_path / 'sheet.toml'}: {sentence}"


def test_unreadable_sheets(tmp_path: Path) -> None:
    """A missing, foreign or binary sheet is refused in words."""
    with pytest.raises(InputError, match=r"none\.toml: there is no such file$"):
        read_sheet(tmp_path / "none.toml")
    with pytest.raises(InputError, match=r"the sheet cannot be opened \(Is a directory\)$"):
        read_sheet(tmp_path)
    (tmp_path / "b.toml").write_bytes(b"\xff\x00")
    with pytest.raises(InputError, match="is not UTF-8 text and so not a run sheet"):
        read_sheet(tmp_path / "b.toml")
    (tmp_path / "big.toml").write_bytes(b"#" * 1_000_001)
    with pytest.raises(InputError, match="is too large to be a run sheet"):
        read_sheet(tmp_path / "big.toml")


def test_link_cannot_lead_outside(tmp_path: Path) -> None:
    """A link below the folder that leads out of it is outside, unless that is allowed."""
    inner = tmp_path / "inner"
    inner.mkdir()
    (inner / "link.csv").symlink_to(tmp_path / "elsewhere.csv")
    text = '[[run]]\nfile = "link.csv"\n'
    with pytest.raises(InputError, match=r"'link\.csv' lies outside"):
        read(inner, text)
    assert read(inner, text, allow_outside=True).runs[0].file == "link.csv"


# ------------------------------------------------------------------------------------------------------ round trips

TEXT = st.text(min_size=1, max_size=12).filter(str.strip).filter(lambda text: "\r" not in text)
NUMBER = st.floats(allow_nan=False, allow_infinity=False)
POSITIVE = st.floats(min_value=1e-300, max_value=1e300)
LIMITS = st.tuples(st.floats(min_value=0, max_value=1e300), st.floats(min_value=0, max_value=1e300) | st.just(INF))
INTERVALS = st.lists(LIMITS.map(sorted).map(tuple), max_size=3).map(tuple)
BOUNDS = st.tuples(NUMBER | st.just(-INF), NUMBER | st.just(INF)).filter(lambda pair: pair[0] < pair[1])
COLUMN = st.none() | TEXT | st.integers(min_value=1, max_value=99)


def optional(strategy: st.SearchStrategy[Any]) -> st.SearchStrategy[Any]:
    """None or a value."""
    return st.none() | strategy


SHEETS = st.builds(
    Sheet,
    sample=st.builds(SampleSettings, optional(TEXT), optional(TEXT), optional(POSITIVE), *[optional(TEXT)] * 3),
    runs=st.lists(
        st.builds(
            RunSettings,
            TEXT,
            optional(TEXT),
            optional(st.sampled_from(["Cp", "Cv"])),
            *[COLUMN] * 3,
            optional(POSITIVE),
            *[optional(TEXT)] * 2,
            *[INTERVALS] * 2,
        ),
        min_size=1,
        max_size=3,
    ).map(tuple),
    model=st.builds(
        ModelSettings,
        optional(TEXT),
        optional(st.sampled_from(["fixed", "free"])),
        TEXT,
        st.dictionaries(TEXT, NUMBER, max_size=2),
        st.dictionaries(TEXT, NUMBER, max_size=2),
        st.dictionaries(TEXT, BOUNDS, max_size=2),
    ),
    report=st.builds(
        ReportSettings,
        optional(st.sampled_from(["0.5:5:0.5, 298.15", "300"])),
        st.sampled_from(["none", "svg", "png", "all"]),
        optional(TEXT),
        st.integers(min_value=0, max_value=2**40),
    ),
)


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(sheet=SHEETS)
def test_any_sheet_reads_back(tmp_path: Path, sheet: Sheet) -> None:
    """Whatever a sheet holds, writing and reading it gives the same sheet, to the last bit."""
    (tmp_path / "sheet.toml").write_bytes(write_sheet(sheet).encode("utf-8"))
    names = [run.file for run in sheet.runs] + [sheet.report.out or ""]
    if any("\x00" in name for name in names):
        return  # a file cannot have that name; the sheet is refused
    assert read_sheet(tmp_path / "sheet.toml", allow_outside=True) == sheet


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(place=st.integers(min_value=0, max_value=1000), junk=st.binary(max_size=4), removed=st.integers(0, 9))
def test_damaged_sheet_is_read_or_refused(tmp_path: Path, place: int, junk: bytes, removed: int) -> None:
    """Bytes put into or cut from a valid sheet give a sheet or one line of words, never a traceback."""
    good = FULL.encode()
    (tmp_path / "sheet.toml").write_bytes(good[:place] + junk + good[place + removed :])
    found = sheet_or_sentence(tmp_path / "sheet.toml")
    assert isinstance(found, Sheet) or found.isprintable()


def sheet_or_sentence(path: Path) -> Sheet | str:
    """What the reader makes of it: a sheet, or the sentence that refuses it."""
    try:
        return read_sheet(path)
    except InputError as error:
        return str(error)


def test_sheet_of_a_reading_reads_the_same_data(tmp_path: Path) -> None:
    """The settings recorded with a reading, written to a sheet, lead to the same measurement again."""
    first = read_text(tmp_path, "T/K;Cp/(J/(g K));U (k=2)\n1,5;2,25;0,1\n2;3;0,2\n", mask=((1.7, INF),))
    runs = tuple(reading.settings for reading in first.readings)
    sheet = read(tmp_path, write_sheet(Sheet(first.sample_settings, runs)))
    again = read_measurement(sheet.sample, sheet.runs, base=tmp_path)
    assert again.heat_capacity.tolist() == first.heat_capacity.tolist()
    assert again.sigma is not None
    assert first.sigma is not None
    assert again.sigma.tolist() == first.sigma.tolist()
    assert again.readings == first.readings


# ------------------------------------------------------------------------------------------------- texts of options


@pytest.mark.parametrize(
    ("text", "points"),
    [
        ("298.15", (298.15,)),
        ("10:30:10", (10.0, 20.0, 30.0)),
        ("10:35:10", (10.0, 20.0, 30.0)),
        ("0.1:0.5:0.1", (0.1, 0.2, 0.3, 0.4, 0.5)),
        ("1:2:0.1", tuple(round(1 + 0.1 * i, 1) for i in range(11))),
        ("300, 10:20:5, 15", (10.0, 15.0, 20.0, 300.0)),
        ("5:5:1", (5.0,)),
        ("1e2:3e2:1E2", (100.0, 200.0, 300.0)),
    ],
)
def test_grid(text: str, points: tuple[float, ...]) -> None:
    """Ranges include both ends where the step meets them, without floating error; points come sorted and once."""
    assert parse_grid(text) == points


def test_grid_of_the_contract() -> None:
    """The grid of the documentation has 10 + 30 + 1 points."""
    grid = parse_grid("0.5:5:0.5, 10:300:10, 298.15")
    assert (len(grid), grid[0], grid[9], grid[10], grid[-1]) == (41, 0.5, 5.0, 10.0, 300.0)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "has an empty part"),
        ("1,,2", "has an empty part"),
        ("1:2", "is neither a temperature nor low:high:step"),
        ("a", "is neither a temperature nor low:high:step"),
        ("nan", "is neither a temperature nor low:high:step"),
        ("1:2:3:4", "is neither a temperature nor low:high:step"),
        ("0", "must be above 0 K and finite"),
        ("-5", "must be above 0 K and finite"),
        ("1:2:0", "must be above 0 K and finite"),
        ("1:2:-1", "must be above 0 K and finite"),
        ("1e9999", "must be above 0 K and finite"),
        ("1:2:1e-9999", "must be above 0 K and finite"),
        ("20:10:1", "ends below its start"),
        ("1:1000:0.001", "has more than 100000 points"),
        ("1:600:0.01, 1.001:600:0.01", "has more than 100000 points"),
    ],
)
def test_wrong_grid(text: str, words: str) -> None:
    """A grid that cannot be read, is not positive or too long is refused."""
    with pytest.raises(InputError, match=words):
        parse_grid(text)


@pytest.mark.parametrize(
    ("text", "interval"),
    [
        ("2:300", (2.0, 300.0)),
        ("2:", (2.0, INF)),
        (":300", (0.0, 300.0)),
        (" 0.4 : 1e2 ", (0.4, 100.0)),
        ("5:5", (5, 5)),
    ],
)
def test_interval(text: str, interval: tuple[float, float]) -> None:
    """Intervals are closed, and may be open on one side."""
    assert parse_interval(text) == interval


@pytest.mark.parametrize("text", ["", ":", "5", "1:2:3", "a:b", "nan:3", "300:2", "-5:3", "1:inf", "2-300"])
def test_wrong_interval(text: str) -> None:
    """What is no interval is refused with the text."""
    with pytest.raises(InputError, match=r"^interval "):
        parse_interval(text)


@given(LIMITS)
def test_interval_text_reads_back(limits: tuple[float, float]) -> None:
    """An interval written by the tool is read back to the last bit."""
    low, high = sorted(limits)
    assert parse_interval(interval_text((low, high))) == (low, high)


def test_assignment_and_bounds() -> None:
    """NAME=VALUE and NAME=LOW:HIGH are read; a side of bounds that is left out is infinite."""
    assert parse_assignment("debye_theta=300") == ("debye_theta", 300.0)
    assert parse_assignment(" a = -1.5e2 ") == ("a", -150.0)
    assert parse_bounds("debye_theta=100:500") == ("debye_theta", (100.0, 500.0))
    assert parse_bounds("a=-2:") == ("a", (-2.0, INF))
    assert parse_bounds("a=:5") == ("a", (-INF, 5.0))


@pytest.mark.parametrize("text", ["", "a", "=3", "a=", "a=x", "a=nan", "a=1e999", "a=1=2"])
def test_wrong_assignment(text: str) -> None:
    """What is no assignment is refused with the form."""
    with pytest.raises(InputError, match=r"must be NAME=VALUE, as in 'debye_theta=300', .*SI units"):
        parse_assignment(text)


@pytest.mark.parametrize("text", ["", "a", "a=", "a=:", "a=5", "=1:2", "a=2:1", "a=1:1", "a=x:2", "a=1:2:3"])
def test_wrong_bounds(text: str) -> None:
    """What are no bounds is refused."""
    with pytest.raises(InputError, match=r"must be NAME=LOW:HIGH|the lower bound must be below the upper one"):
        parse_bounds(text)


def test_settings_records_have_a_key_each() -> None:
    """Every field of the settings can be written and read, so none is lost from a sheet."""
    from latticefit.reading import settings as keys_of

    for record, keys in (
        (SampleSettings, keys_of.SAMPLE),
        (RunSettings, keys_of.RUN),
        (ModelSettings, keys_of.MODEL),
        (ReportSettings, keys_of.REPORT),
    ):
        assert set(record.__dataclass_fields__) == set(keys)
    assert replace(RunSettings("a"), label="b").label == "b"
