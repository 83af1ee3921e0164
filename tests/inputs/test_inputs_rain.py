"""Rain records: read whatever their form, or refused in one sentence."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from siting.errors import InputError
from siting.inputs import read_rain
from siting.notes import Notes

Find = Callable[[str, str], Path]


def rain_file(folder: Path, text: str) -> Path:
    path = folder / "rain.csv"
    path.write_text(text, encoding="utf-8")
    return path


def days(count: int, depth: str = "1.0", start: str = "2001-01-01") -> list[str]:
    first = np.datetime64(start)
    return [f"{first + day},{depth}" for day in range(count)]


def test_a_wet_record_is_read_with_its_yearly_totals(package_file: Find) -> None:
    # Seattle 2012-2015 (NOAA): 1226.0, 828.0, 1232.8, 1139.2 mm
    rain = read_rain(package_file("vega_datasets", "_data/seattle-weather.csv"), notes=Notes())
    year = rain.days.astype("datetime64[Y]").astype(int) + 1970
    totals = [rain.rain_mm[year == one].sum() for one in (2012, 2013, 2014, 2015)]
    np.testing.assert_allclose(totals, [1226.0, 828.0, 1232.8, 1139.2], atol=0.05)


def test_rain_in_other_words_order_and_marks(tmp_path: Path) -> None:
    text = "lluvia_mm;fecha\n" + "\n".join(f"{day},5;{day:02d}.01.2001" for day in range(1, 31))
    rain = read_rain(rain_file(tmp_path, text), notes=Notes())
    assert rain.rain_mm[:2].tolist() == [1.5, 2.5]


def test_inches_become_millimetres(tmp_path: Path) -> None:
    rain = read_rain(rain_file(tmp_path, "date,rain_in\n" + "\n".join(days(40))), notes=Notes())
    np.testing.assert_allclose(rain.rain_mm, 25.4)


def test_gaps_are_missing_and_said(tmp_path: Path) -> None:
    notes = Notes()
    lines = days(20)
    rain = read_rain(rain_file(tmp_path, "date,rain_mm\n" + "\n".join(lines[:8] + lines[11:])), notes=notes)
    assert np.isnan(rain.rain_mm).sum() == 3
    assert (
        "lacks 3 days, the first 2001-01-09; 1 reading right after a gap may be a sum of several days."
        in notes.warnings[0].text
    )


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            "date,rain_mm\n" + "\n".join(f"{y}-{m:02d}-01,30" for y in (2001, 2002) for m in range(1, 13)),
            "give daily rain",
        ),
        ("date,rain_mm\n2001-01-01,1\n2001-01-01,2", "more than once"),
        ("date,rain_mm\n2001-01-01,-3\n2001-01-02,0", "-3 mm on 2001-01-01; leave missing days empty"),
        ("date,rain_mm\n2001-01-01,wet\n2001-01-02,0", "'wet' on 2001-01-01, which is no number"),
        ("date,rain_mm\n02/03/2001,1\n03/03/2001,2", "could be day or month first"),
        ("date,rain\n" + "\n".join(days(800, "0.01")), r"if it is in inches, say rain\.unit = 'inch'"),
        ("date,rain_mm\n2001-01-01,0\n2001-01-02,1830", "1830 mm on 2001-01-02, beyond the most ever measured, 1825 mm"),
        ("date,rain_in\n2001-01-01,0\n2001-01-02,80", "2032 mm on 2001-01-02, beyond"),
        ("date,rain_mm\n2001-01-01,inf\n2001-01-02,0", "inf mm on 2001-01-01, beyond"),
        ("date,rain_mm\n2001-01-01,1\n2001-02-30,0", "such as '2001-02-30' cannot be read"),
        ("date,rain_mm\n2001-01-01\n2001-01-02", "holds no depth at all"),
        ("date,rain_mm,rain_mm\n2001-01-01,1,2", "has the column rain_mm twice"),
        ("date\n2001-01-01", "holds 1 row of 1 column; it needs a line of names"),
        ("when,what\n2001-01-01,5\n2001-01-02,0", "no date column among 'when', 'what'"),
        ("", "rain.daily rain.csv"),
    ],
)
def test_rain_that_cannot_be_right_is_refused(tmp_path: Path, text: str, message: str) -> None:
    with pytest.raises(InputError, match=message):
        read_rain(rain_file(tmp_path, text), notes=Notes())


def test_a_comma_that_may_group_thousands_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="a decimal or a thousands comma"):
        read_rain(rain_file(tmp_path, "date;rain_mm\n2001-01-01;1,234\n2001-01-02;0"), notes=Notes())


def test_a_very_dry_record_is_taken_when_its_unit_is_stated(tmp_path: Path) -> None:
    path = rain_file(tmp_path, "date,rain\n" + "\n".join(days(800, "0.01")))
    assert read_rain(path, unit="mm", notes=Notes()).rain_mm.sum() == pytest.approx(8.0)


@pytest.mark.parametrize(
    ("text", "line"),
    [
        ("date,rain_mm\n2001-01-01,1,5\n2001-01-02,0\n", 2),
        ("date,rain_mm\n2001-01-01,0\n2001-01-02,2,5\n", 3),
        ("rain_mm,date\n1,5,2001-01-01\n2,5,2001-01-02\n", 2),  # the last two columns alone would read as 5 mm
        ("date,rain_mm\n\n2001-01-01,1,5\n", 3),
    ],
)
def test_a_decimal_comma_between_commas_is_refused(tmp_path: Path, text: str, line: int) -> None:
    message = (
        f"has 3 fields in line {line} under 2 columns; if that is a decimal comma, separate the columns with semicolons"
    )
    with pytest.raises(InputError, match=message):
        read_rain(rain_file(tmp_path, text), notes=Notes())


@pytest.mark.parametrize(
    "text",
    [
        'date,rain_mm\n2001-01-01,"1,5"\n2001-01-02,"0,0"\n',
        "date;rain_mm\n2001-01-01;1,5\n2001-01-02;0,0\n",
        "date\train_mm\n2001-01-01\t1,5\n2001-01-02\t0,0\n",
        "date,rain_mm\n2001-01-01,1.5,\n2001-01-02,0.0,\n",
        "date,rain_mm,\r\n2001-01-01,1.5,\r\n2001-01-02,0.0,\r\n,,\r\n",
    ],
)
def test_a_comma_that_can_be_told_is_read(tmp_path: Path, text: str) -> None:
    assert read_rain(rain_file(tmp_path, text), notes=Notes()).rain_mm.tolist() == [1.5, 0.0]


def test_a_file_that_is_no_text_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "rain.csv"
    for content in (b"\x89PNG\r\n\x1a\n\xff\xfe", "date;rain\n2001-01-01;1".encode("utf-16")):
        path.write_bytes(content)
        with pytest.raises(InputError, match="cannot be read as a table; save it as CSV"):
            read_rain(path, notes=Notes())


def test_a_day_that_is_rare_anywhere_is_said(tmp_path: Path) -> None:
    # tenths of a millimetre taken for millimetres: 62.0 mm becomes 620 mm
    notes = Notes()
    text = "date,rain_mm\n2001-01-01,500\n2001-01-02,620\n2001-01-03,0"
    assert read_rain(rain_file(tmp_path, text), notes=notes).rain_mm.max() == 620.0
    assert [warned.code for warned in notes.warnings] == ["rain_rare_days"]
    assert "has 1 day above 500 mm, the largest 620 mm on 2001-01-02: check the unit" in notes.warnings[0].text


def test_the_greatest_day_ever_measured_is_taken(tmp_path: Path) -> None:
    # 1825 mm in 24 hours at Foc-Foc, La Reunion, 1966 (WMO Archive of Weather and Climate Extremes)
    notes = Notes()
    text = "date,rain_mm\n1966-01-07,1825\n1966-01-08,0"
    assert read_rain(rain_file(tmp_path, text), notes=notes).rain_mm.max() == 1825.0
    assert [warned.code for warned in notes.warnings] == ["rain_rare_days"]


def test_a_dry_reading_after_a_gap_is_no_sum(tmp_path: Path) -> None:
    notes = Notes()
    read_rain(rain_file(tmp_path, "date,rain_mm\n2001-01-01,4\n2001-01-03,0\n2001-01-04,0\n"), notes=notes)
    assert [warned.text for warned in notes.warnings] == ["The rain record lacks 1 day, the first 2001-01-02."]


def test_rain_that_lists_wet_days_alone_is_refused(tmp_path: Path) -> None:
    text = "date,rain_mm\n2001-01-01,4\n2001-01-02,3\n2001-01-12,5\n2001-01-22,0.2\n"
    message = "holds 4 of 22 days and no dry one: it seems to list wet days alone; write dry days as 0"
    with pytest.raises(InputError, match=message):
        read_rain(rain_file(tmp_path, text), notes=Notes())


def test_a_record_with_dry_days_may_lack_most_of_its_days(tmp_path: Path) -> None:
    notes = Notes()
    lines = days(10, "0") + days(10, "2.0", start="2001-03-01")
    rain = read_rain(rain_file(tmp_path, "date,rain_mm\n" + "\n".join(lines)), notes=notes)
    assert np.isnan(rain.rain_mm).sum() == 49
    assert "lacks 49 days, the first 2001-01-11; where those were dry, write them as 0; 1 reading" in notes.warnings[0].text


@pytest.mark.parametrize(
    ("column", "unit", "depth", "told"),
    [
        ("rain", None, "2.8", "1023 mm in a mean year"),  # the unit is assumed
        ("rain_mm", None, "2.8", None),
        ("rain", "mm", "4.2", "1534 mm in a mean year"),
        ("rain_mm", None, "4.2", "1534 mm in a mean year"),
        ("rain", None, "2.7", None),
    ],
)
def test_a_year_wetter_than_dry_country_has_is_said(
    tmp_path: Path, column: str, unit: str | None, depth: str, told: str | None
) -> None:
    notes = Notes()
    read_rain(rain_file(tmp_path, f"date,{column}\n" + "\n".join(days(400, depth))), unit=unit, notes=notes)
    texts = [warned.text for warned in notes.warnings if warned.code == "rain_wet"]
    assert len(texts) == (told is not None)
    assert told is None or (told in texts[0] and "tenths of a millimetre" in texts[0])


def test_marks_of_a_missing_day_may_have_decimals(tmp_path: Path) -> None:
    marks = ("-9999", "-9999.0", "-99.90", "-999,0", "NaN")
    text = "date;rain_mm\n2001-01-06;2\n" + "\n".join(f"2001-01-0{day};{mark}" for day, mark in enumerate(marks, 1))
    rain = read_rain(rain_file(tmp_path, text), notes=Notes())
    np.testing.assert_array_equal(rain.rain_mm, [np.nan] * 5 + [2.0])
