"""What the pages say, read from their HTML with the standard library's parser."""

from __future__ import annotations

from html.parser import HTMLParser
from pathlib import Path

import pytest
from flask.testing import FlaskClient

from ginnel.config import load_settings
from ginnel.errors import StoreError
from ginnel.store import open_store
from ginnel.web.app import create_app


class Tables(HTMLParser):
    """All tables of a page, as lists of rows of text."""

    def __init__(self) -> None:
        super().__init__()
        self.tables: list[list[list[str]]] = []
        self._in_cell = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag == "table":
            self.tables.append([])
        elif tag == "tr":
            self.tables[-1].append([])
        elif tag in ("td", "th"):
            self.tables[-1][-1].append("")
            self._in_cell = True

    def handle_endtag(self, tag: str) -> None:
        if tag in ("td", "th"):
            self._in_cell = False

    def handle_data(self, data: str) -> None:
        if self._in_cell:
            self.tables[-1][-1][-1] += data


def tables_of(client: FlaskClient, url: str) -> list[list[list[str]]]:
    answer = client.get(url)
    assert answer.status_code == 200
    parser = Tables()
    parser.feed(answer.text)
    return [[[" ".join(cell.split()) for cell in row] for row in table] for table in parser.tables]


BLANK = "\N{EN DASH}"
DAY = "/?sensor=corridor&day=2026-03-02"


def test_counts_stand_beside_their_hour_and_direction(client: FlaskClient) -> None:
    hours = {row[0]: row[1:] for row in tables_of(client, DAY)[0]}
    assert hours["Hour"] == ["to the looms", "to the gate", "direction unknown", "Listened"]
    # exact Poisson limits of 3 events: 0.6 to 8.8 (Garwood 1936, table)
    assert hours["08:00"][0] == "3 (0.6 to 8.8)"
    assert hours["09:00"][:2] == ["1 (0.0 to 5.6)", "1 (0.0 to 5.6)"]
    assert hours["11:00"] == ["1 (0.0 to 5.6)", "1 (0.0 to 5.6)", "1 (0.0 to 5.6)", "50 %"]


def test_a_quiet_hour_is_zero_and_an_unheard_hour_is_blank(client: FlaskClient) -> None:
    hours = {row[0]: row[1:] for row in tables_of(client, DAY)[0]}
    assert hours["08:00"][1] == "0 (0.0 to 3.7)"
    assert hours["10:00"] == [BLANK, BLANK, BLANK, "0 %"]
    assert hours["00:00"] == [BLANK, BLANK, BLANK, "0 %"]


def test_the_page_says_the_days_sums_and_its_85th_percentile(client: FlaskClient) -> None:
    text = client.get(DAY).text
    # of 1.05, 1.15, 1.25, 1.35, 1.45, 1.55, 2.05: position 1 + 0.85 * 6 = 6.1, so 1.55 + 0.1 * 0.5 = 1.60
    assert "1.60<small> m/s</small>" in text
    assert "10.4<small> %</small>" in text, "2.5 h of 24 h"


def test_speeds_are_told_for_each_direction(client: FlaskClient) -> None:
    rows = {row[0]: row[1:] for row in tables_of(client, DAY)[2]}
    assert rows["to the looms"][:2] == ["5", "1.37"]  # (1.05 + 1.15 + 1.25 + 1.35 + 2.05) / 5
    assert rows["direction unknown"] == ["0", BLANK, BLANK, BLANK, BLANK, BLANK]
    assert rows["all"][0] == "7"


def test_the_last_passages_come_latest_first_in_site_time(client: FlaskClient) -> None:
    rows = tables_of(client, DAY)[3]
    assert [row[0] for row in rows[1:3]] == ["11:45:00", "11:31:00"]
    assert rows[1][1:] == ["to the looms", "93 %", "2.05 ± 0.05", ""]
    assert rows[2][1:] == ["direction unknown", BLANK, BLANK, "overlapping"]
    assert len(rows) == 1 + 8


def test_listening_shows_as_stretches(client: FlaskClient) -> None:
    assert tables_of(client, DAY)[1][1:] == [
        ["08:00:00", "10:00:00", "120.0 min"],
        ["11:30:00", "12:00:00", "30.0 min"],
    ]


def test_a_day_of_23_hours_has_23_rows(client: FlaskClient) -> None:
    hours = tables_of(client, "/?sensor=gate&day=2026-03-29")[0]
    labels = [row[0] for row in hours[1:]]
    assert len(labels) == 23
    assert labels[:3] == ["00:00", "02:00", "03:00"]
    assert hours[2][2].startswith("1 "), "01:30 UTC is 02:30 on the wall"


def test_turning_back_is_not_counted(client: FlaskClient) -> None:
    tables = tables_of(client, "/?sensor=gate&day=2026-03-30")
    assert tables[0][12][1].startswith("0 ")
    assert "None were logged" in client.get("/?sensor=gate&day=2026-03-30").text


def test_without_a_query_the_first_sensor_and_its_last_day_are_shown(client: FlaskClient) -> None:
    assert client.get("/").text == client.get(DAY).text


def test_a_day_before_all_listening_is_blank_all_through(client: FlaskClient) -> None:
    text = client.get("/?sensor=corridor&day=2020-01-01").text
    assert '<strong class="none">' + BLANK in text
    assert "not at all" in text


def test_names_are_escaped(client: FlaskClient) -> None:
    text = client.get(DAY).text
    assert "Loom house &lt;5&gt;" in text
    assert "<5>" not in text


@pytest.mark.parametrize(
    ("url", "status", "said"),
    [
        ("/?sensor=cellar", 404, "No sensor here is called cellar."),
        ("/?day=yesterday", 400, "yesterday is not a day such as 2026-03-02."),
        ("/?day=0001-01-01", 400, "outside the years"),
        ("/?day=9999-12-31", 400, "outside the years"),
        ("/?sensor=<script>", 404, "&lt;script&gt;"),
        ("/nothing", 404, "Not found"),
        ("/charts.json?scheme=pink", 404, "Not found"),
        ("/bokeh/0.0.0/bokeh.min.js", 404, "Not found"),
    ],
)
def test_a_wrong_address_is_answered_in_words(client: FlaskClient, url: str, status: int, said: str) -> None:
    answer = client.get(url)
    assert answer.status_code == status
    assert said in answer.text


def test_pages_allow_nothing_from_elsewhere_and_no_inline_script(client: FlaskClient) -> None:
    for url in (DAY, "/nothing", "/static/charts.js"):
        answer = client.get(url)
        policy = dict(part.split(" ", 1) for part in answer.headers["Content-Security-Policy"].split("; "))
        answer.close()
        assert policy["default-src"] == "'none'"
        assert policy["script-src"] == "'self'"
        assert policy["connect-src"] == "'self'"
    text = client.get(DAY).text
    assert "http://" not in text
    assert "https://" not in text
    assert "style=" not in text
    assert text.count("<script") == text.count("<script src=") == 2


def test_another_host_name_is_refused(client: FlaskClient) -> None:
    assert client.get("/", headers={"Host": "evil.example"}).status_code == 400
    assert client.get("/", headers={"Host": "localhost:8470"}).status_code == 200


def test_the_chart_library_comes_from_the_installed_package(client: FlaskClient) -> None:
    src = next(part for part in client.get(DAY).text.split('"') if part.endswith("bokeh.min.js"))
    answer = client.get(src)
    assert answer.status_code == 200
    assert len(answer.data) > 500_000
    assert "immutable" in answer.headers["Cache-Control"]
    answer.close()


def test_a_log_without_sensors_says_what_to_do(tmp_path: Path) -> None:
    file = tmp_path / "ginnel.toml"
    file.write_text("", "utf-8")
    settings = load_settings(file)
    with pytest.raises(StoreError, match="ginnel init"):
        create_app(settings)
    open_store(settings.store.url, create=True).close()
    with create_app(settings).test_client() as client:
        assert "ginnel replay" in client.get("/").text
        assert client.get("/charts.json").status_code == 404
