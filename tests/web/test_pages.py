"""What the pages say, read from their HTML."""

from __future__ import annotations

from pathlib import Path

import pytest
from flask.testing import FlaskClient
from tests.web.conftest import tables_of

from ginnel.config import Settings, load_settings
from ginnel.errors import StoreError
from ginnel.store import open_store
from ginnel.web.app import create_app

BLANK = "\N{EN DASH}"
WHAT = "sensor=corridor&show=day&on=2026-03-02"
BUSY = f"/busy?{WHAT}"
PAGES = ("/", "/busy", "/fast", "/full", "/one-by-one", "/sure", "/take-away", "/side-by-side")


def words(html: str) -> str:
    """Text of a page with single spaces."""
    return " ".join(html.replace("<strong>", "").replace("</strong>", "").split())


def test_counts_stand_beside_their_hour_and_direction(client: FlaskClient) -> None:
    hours = {row[0]: row[1:] for row in tables_of(client, BUSY)[0]}
    assert hours["Hour"] == ["to the looms", "to the gate", "direction unknown", "All", "Usual", "Listened"]
    assert hours["08:00"] == ["3", "0", "0", "3", BLANK, "100%"]
    assert hours["09:00"] == ["1", "1", "0", "2", BLANK, "100%"]
    assert hours["11:00"] == ["1", "1", "1", "3", BLANK, "50%"]
    assert hours["All"] == ["5", "2", "1", "8", "", "10%"]


def test_a_quiet_hour_is_zero_and_an_unheard_hour_is_blank(client: FlaskClient) -> None:
    hours = {row[0]: row[1:] for row in tables_of(client, BUSY)[0]}
    assert hours["08:00"][1] == "0"
    assert hours["10:00"] == [BLANK, BLANK, BLANK, BLANK, BLANK, "0%"]


def test_the_answer_is_a_sentence_with_both_ways_and_the_coverage(client: FlaskClient) -> None:
    text = words(client.get(BUSY).text)
    assert "8 passed:" in text
    assert "5 to the looms" in text
    assert "corridor listened 10.4% of the time" in text, "2.5 h of 24 h"
    # exact Poisson limits of 8 events: 3.45 to 15.76 (Garwood 1936, table)
    assert "between 3 and 16 (95 %)" in text


def test_speeds_are_told_for_each_direction_and_all(client: FlaskClient) -> None:
    answer = words(client.get(f"/fast?{WHAT}").text)
    # of 1.05, 1.15, 1.25, 1.35, 1.45, 1.55, 2.05 the median is 1.35, in a class from 1.35 to 1.36
    assert "Half passed at up to 1.36 m/s" in answer
    rows = {row[0]: row[1:] for row in tables_of(client, f"/fast?{WHAT}")[0]}
    assert rows["to the looms"][:2] == ["5", "1.37"]  # (1.05 + 1.15 + 1.25 + 1.35 + 2.05) / 5
    assert rows["all"][0] == "7"
    assert "direction unknown" not in rows, "its speed was not measured"


def test_passages_of_an_hour_come_in_order_in_site_time(client: FlaskClient) -> None:
    (rows,) = tables_of(client, f"/one-by-one?{WHAT}&hour=11")
    assert [row[0] for row in rows[1:]] == ["11:30:00", "11:31:00", "11:45:00"]
    assert rows[3][1:] == ["to the looms", "93%", "2.05 ± 0.05", "0.0 s", "20 dB", ""]
    assert rows[2][1:] == ["direction unknown", BLANK, BLANK, "0.0 s", "20 dB", "overlapping"]


def test_without_an_hour_the_last_busy_one_is_shown(client: FlaskClient) -> None:
    assert "From 11:00 to 12:00 3 passed." in words(client.get(f"/one-by-one?{WHAT}").text)


def test_who_turned_back_is_shown_when_asked_for_and_never_counted(client: FlaskClient) -> None:
    day = "sensor=gate&show=day&on=2026-03-30"
    assert tables_of(client, f"/busy?{day}")[0][12][3] == "0", "hour 11:00 of the wall clock"
    assert tables_of(client, f"/one-by-one?{day}&hour=11") == []
    (rows,) = tables_of(client, f"/one-by-one?{day}&hour=11&with=uncounted")
    assert rows[1][-1] == "turn-back, not counted"


def test_listening_shows_its_gaps(client: FlaskClient) -> None:
    gaps = tables_of(client, f"/sure?{WHAT}")[0]
    assert [row[2].replace("\N{NARROW NO-BREAK SPACE}", " ") for row in gaps[1:]] == [
        "8 h",
        "1 h 30 min",
        "12 h",
    ]


def test_a_day_of_23_hours_has_23_rows(client: FlaskClient) -> None:
    url = "/busy?sensor=gate&show=day&on=2026-03-29"
    hours = tables_of(client, url)[0]
    labels = [row[0] for row in hours[1:-1]]
    assert len(labels) == 23
    assert labels[:3] == ["00:00", "02:00", "03:00"]
    assert hours[2][2] == "1", "01:30 UTC is 02:30 on the wall"
    assert "where the clock changes" in client.get(url).text


def test_the_first_page_tells_of_every_sensor(client: FlaskClient) -> None:
    text = words(client.get("/").text)
    assert "No sensor is listening now." in text
    assert "last heard Monday 2 March, 12:00" in text
    assert client.get("/now-part").text in client.get("/").text


def test_two_sensors_stand_beside_each_other(client: FlaskClient) -> None:
    (rows,) = tables_of(client, f"/side-by-side?{WHAT}&with=gate")
    assert rows[0] == ["Hour", "corridor", "gate"]
    assert rows[-1] == ["All", "8", BLANK]


@pytest.mark.parametrize("page", PAGES)
@pytest.mark.parametrize("show", ["day", "week", "month", "year", "range"])
def test_every_page_shows_every_length_of_time(client: FlaskClient, page: str, show: str) -> None:
    answer = client.get(f"{page}?sensor=corridor&show={show}&on=2026-03-02&to=2026-03-20")
    assert answer.status_code == 200
    assert "Europe/Dublin" in answer.text, "every page says whose clock it is"


def test_without_a_query_the_first_sensor_and_its_last_day_are_shown(client: FlaskClient) -> None:
    assert client.get("/busy").text == client.get(BUSY).text


def test_a_day_before_all_listening_is_blank_all_through(client: FlaskClient) -> None:
    text = client.get("/busy?sensor=corridor&on=2020-01-01").text
    assert "Nobody listened." in text
    assert "it is not zero" in text


def test_names_are_escaped(client: FlaskClient) -> None:
    text = client.get(BUSY).text
    assert "Loom house &lt;5&gt;" in text
    assert "<5>" not in text


@pytest.mark.parametrize(
    ("url", "status", "said"),
    [
        ("/busy?sensor=cellar", 404, "No sensor here is called cellar."),
        ("/busy?on=yesterday", 400, "yesterday is not a day such as 2026-03-02."),
        ("/busy?on=0001-01-01", 400, "outside the years"),
        ("/busy?on=9999-12-31", 400, "outside the years"),
        ("/busy?show=aeon", 400, "show=aeon is not understood"),
        ("/busy?show=range&on=1980-01-01&to=2026-01-01", 400, "more than ten years"),
        ("/busy?sensor=<script>", 404, "&lt;script&gt;"),
        ("/nothing", 404, "Not found"),
        ("/charts/busy.json?scheme=pink", 404, "Not found"),
        ("/files/passages.exe", 404, "Not found"),
        ("/files/passages.csv?every=eon", 400, "every=eon is not understood"),
    ],
)
def test_what_is_not_understood_is_said_in_a_line(
    client: FlaskClient, url: str, status: int, said: str
) -> None:
    answer = client.get(url)
    assert answer.status_code == status
    assert said in answer.text


def test_files_hold_what_the_page_looks_at(client: FlaskClient) -> None:
    answer = client.get(f"/files/passages.csv?{WHAT}")
    assert answer.headers["Content-Disposition"] == "attachment; filename=corridor-passages-2026-03-02.csv"
    lines = answer.text.splitlines()
    assert len(lines) == 1 + 8
    assert lines[0].startswith("passage_id,sensor,started_at")
    assert client.get(f"/files/counts.csv?{WHAT}&every=day").text.count("\r\n") == 1 + 3


def test_an_empty_store_says_so(tmp_path: Path) -> None:
    (tmp_path / "ginnel.toml").write_text("", "utf-8")
    settings = load_settings(tmp_path / "ginnel.toml")
    open_store(settings.store.url, create=True).close()
    app = create_app(settings)
    with app.test_client() as client:
        assert "Nothing has been logged yet." in client.get("/").text
        assert client.get("/busy").status_code == 404
    app.extensions["ginnel.store"].close()


def test_a_store_that_is_not_there_is_one_line(tmp_path: Path) -> None:
    (tmp_path / "ginnel.toml").write_text("", "utf-8")
    with pytest.raises(StoreError, match="there is no store"):
        create_app(load_settings(tmp_path / "ginnel.toml"))


def test_units_locale_and_limit_are_those_of_the_settings(settings: Settings) -> None:
    web = settings.web.model_copy(update={"units": "mph", "locale": "de", "speed_limit": 3.0})
    app = create_app(settings.model_copy(update={"web": web}))
    with app.test_client() as client:
        text = words(client.get(f"/fast?{WHAT}").text)
        # the median is 1.355 m/s: 1.355 / 0.44704 = 3.03 mph; 4 of 7 are above 3 mph, 1.341 m/s
        assert "Half passed at up to 3,0 mph" in text
        assert "57,1 % were faster than 3,0 mph" in text
        assert "Montag 2. M\N{LATIN SMALL LETTER A WITH DIAERESIS}rz 2026" in text
    app.extensions["ginnel.store"].close()
