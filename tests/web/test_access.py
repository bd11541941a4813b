"""Who gets in: strangers learn nothing, users what they may, and no answer goes out unguarded."""

from __future__ import annotations

import html
import http.client
import logging
import re
import socket
import urllib.parse
import urllib.request
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from click.testing import CliRunner
from flask import Flask
from flask.testing import FlaskClient
from tests.web.conftest import CORRIDOR, SPANS, at_us, serving

from ginnel.cli import main
from ginnel.config import Settings, load_settings
from ginnel.errors import ConfigError
from ginnel.store import open_store, put_site, record_span, users
from ginnel.web.access.secrets import digest, hash_password
from ginnel.web.access.throttle import Throttle
from ginnel.web.app import create_app
from ginnel.web.server import check_reach
from ginnel.words import Sensor, Site, Span

PASSWORD = "correct horse battery"
#: What no stranger may learn: names of site, sensor and directions.
KNOWN_INSIDE = ("Weaver", "corridor", "looms")


@pytest.fixture
def guarded(tmp_path: Path) -> Settings:
    """Settings of a store that has one user, hilda, who may look."""
    file = tmp_path / "ginnel.toml"
    file.write_text("", "utf-8")
    settings = load_settings(file)
    with open_store(settings.store.url, create=True) as store:
        put_site(store, Site(name="Weavers' yard", timezone="Europe/Dublin"))
        span = Span(started_us=at_us(SPANS[0][0]), ended_us=at_us(SPANS[0][1]), sample_rate_hz=8000.0)
        record_span(store, CORRIDOR, span, [], "test")
        person = users.User(name="hilda", role=users.Role.LOOK, password_hash=hash_password(PASSWORD))
        users.put_user(store, person, new=True)
    return settings


@pytest.fixture
def app(guarded: Settings) -> Iterator[Flask]:
    app = create_app(guarded)
    yield app
    app.extensions["ginnel.store"].close()


def csrf(client: FlaskClient, url: str = "/login") -> str:
    found = re.search(r'name="csrf_token" value="([^"]+)"', client.get(url).text)
    assert found is not None
    return html.unescape(found[1])


def log_in(client: FlaskClient, name: str = "hilda", password: str = PASSWORD, next_url: str = "") -> int:
    form = {"csrf_token": csrf(client), "name": name, "password": password, "next": next_url}
    return client.post("/login", data=form).status_code


def addresses(app: Flask) -> list[str]:
    """An address of every route, with something in each of its gaps."""
    gaps = {"tag": "0", "name": "x", "page": "busy", "kind": "passages", "form": "csv", "sensor": "corridor"}
    found = []
    for rule in app.url_map.iter_rules():
        address = rule.rule
        for argument in rule.arguments:
            address = re.sub(rf"<(?:\w+:)?{argument}>", gaps.get(argument, "x"), address)
        found.append(address)
    return found


def test_a_stranger_learns_nothing_at_any_address(app: Flask) -> None:
    client = app.test_client()
    for address in [
        *addresses(app),
        "/nothing",
        "/busy?sensor=corridor",
        "/busy?sensor=cellar",
        "/busy?on=x",
    ]:
        for method in ("GET", "POST", "PUT", "DELETE", "OPTIONS"):
            answer = client.open(address, method=method)
            said = answer.text + str(answer.headers)
            asked_back = said.replace("sensor%3Dcorridor", "").replace("sensor=corridor", "")
            assert not any(word in asked_back for word in KNOWN_INSIDE), address
            if method == "GET" and answer.status_code == 200:
                assert address in ("/login", "/healthz")


def test_a_stranger_cannot_tell_what_exists(app: Flask) -> None:
    client = app.test_client()
    real, made_up = (client.get(f"/busy?sensor={name}") for name in ("corridor", "cellar"))
    assert (real.status_code, made_up.status_code) == (302, 302)
    assert client.get("/nothing").status_code == 302
    assert client.get("/api/v1/sensors").status_code == client.get("/api/v1/nothing").status_code == 401


def test_with_name_and_password_one_gets_in_and_out_again(app: Flask) -> None:
    client = app.test_client()
    assert client.get("/busy").headers["Location"] == "/login?next=/busy"
    assert log_in(client) == 302
    assert "corridor" in client.get("/busy").text
    client.post("/logout", data={"csrf_token": csrf(client, "/busy")})
    assert client.get("/busy").status_code == 302


def test_a_wrong_name_and_a_wrong_password_look_alike(app: Flask) -> None:
    pages = []
    for name in ("hilda", "hulda"):
        client = app.test_client()
        token = csrf(client)
        answer = client.post("/login", data={"csrf_token": token, "name": name, "password": "wrong"})
        assert answer.status_code == 401
        pages.append(re.sub(r'(csrf_token" value=")[^"]+', r"\1", answer.text).replace(name, ""))
    assert pages[0] == pages[1]


def test_after_five_wrong_passwords_even_the_right_one_must_wait(app: Flask) -> None:
    client = app.test_client()
    assert [log_in(client, password="guess") for _ in range(5)] == [401] * 5
    assert log_in(client) == 429
    assert log_in(client, name="someone else", password="guess") == 401, "others are not kept out"


def test_guesses_at_many_names_from_one_address_must_wait_too() -> None:
    throttle = Throttle()
    for number in range(20):
        assert throttle.is_open("10.0.0.1", f"name{number}")
        throttle.failed("10.0.0.1", f"name{number}")
    assert not throttle.is_open("10.0.0.1", "another")
    assert throttle.is_open("10.0.0.2", "another")


def test_nothing_is_done_without_the_forms_own_token(app: Flask) -> None:
    client = app.test_client()
    assert client.post("/login", data={"name": "hilda", "password": PASSWORD}).status_code == 400
    log_in(client)
    assert client.post("/logout").status_code == 400
    assert client.get("/busy").status_code == 200, "still logged in"


def test_a_new_password_ends_old_sessions(app: Flask, guarded: Settings) -> None:
    client = app.test_client()
    log_in(client)
    with open_store(guarded.store.url) as store:
        person = users.user(store, "hilda")
        assert person is not None
        users.put_user(store, replace(person, password_hash=hash_password("another one 123")), new=False)
    assert client.get("/busy").status_code == 302


def test_a_session_cannot_be_made_up(app: Flask) -> None:
    client = app.test_client()
    client.set_cookie("ginnel", "eyJfdXNlcl9pZCI6ImhpbGRhIn0.aaaaaa.bbbbbbbbbbbbbbbbbbbbbbbbbbb")
    assert client.get("/busy").status_code == 302


def test_a_token_lets_a_program_in_until_it_is_removed(app: Flask, guarded: Settings) -> None:
    with open_store(guarded.store.url) as store:
        token = users.Token(user="hilda", label="script", digest=digest("ginnel_secret"), made_us=0)
        users.put_token(store, token)
        client = app.test_client()
        shown = {"Authorization": "Bearer ginnel_secret"}
        assert client.get("/files/counts.csv", headers=shown).status_code == 200
        assert client.get("/files/counts.csv", headers={"Authorization": "Bearer wrong"}).status_code == 302
        users.remove_token(store, "hilda", "script")
    assert client.get("/files/counts.csv", headers=shown).status_code == 302


@pytest.mark.parametrize(
    "next_url",
    [
        "//elsewhere.example",
        "https://elsewhere.example/",
        "/\\elsewhere.example",
        "javascript:alert(1)",
        "/\t/x.example",
    ],
)
def test_after_the_login_nobody_is_sent_elsewhere(app: Flask, next_url: str) -> None:
    client = app.test_client()
    form = {"csrf_token": csrf(client), "name": "hilda", "password": PASSWORD, "next": next_url}
    assert client.post("/login", data=form).headers["Location"] == "/"


def test_secrets_are_not_logged(app: Flask, caplog: pytest.LogCaptureFixture) -> None:
    client = app.test_client()
    with caplog.at_level(logging.DEBUG):
        log_in(client, password="my-secret-guess")
        log_in(client)
    assert "login refused" in caplog.text
    assert "my-secret-guess" not in caplog.text
    assert PASSWORD not in caplog.text


def test_cookies_are_for_the_server_only(app: Flask) -> None:
    answer = app.test_client().get("/login")
    cookie = answer.headers["Set-Cookie"]
    assert "HttpOnly" in cookie
    assert "SameSite=Lax" in cookie


def test_behind_tls_cookies_keep_to_it_and_only_known_names_are_answered(guarded: Settings) -> None:
    web = guarded.web.model_copy(update={"public_url": "https://counts.example.org"})
    app = create_app(guarded.model_copy(update={"web": web}))
    client = app.test_client()
    assert "Secure" in client.get("/login", headers={"Host": "counts.example.org"}).headers["Set-Cookie"]
    assert client.get("/login", headers={"Host": "elsewhere.example"}).status_code == 400
    app.extensions["ginnel.store"].close()


def test_behind_a_proxy_addresses_have_its_path_and_guesses_are_of_the_client(
    guarded: Settings, caplog: pytest.LogCaptureFixture
) -> None:
    web = guarded.web.model_copy(update={"public_url": "https://counts.example.org/inside"})
    with serving(guarded.model_copy(update={"web": web})) as server:
        host, port = server.address.removeprefix("http://").rstrip("/").split(":")
        asked = http.client.HTTPConnection(host, int(port), timeout=20)
        outside = {"Host": "counts.example.org", "X-Forwarded-Proto": "https", "X-Forwarded-For": "192.0.2.7"}
        asked.request("GET", "/inside/busy?show=week", headers=outside)
        answer = asked.getresponse()
        answer.read()
        assert answer.headers["Location"] == "/inside/login?next=/busy?show%3Dweek"
        asked.request("GET", answer.headers["Location"], headers=outside)
        page = asked.getresponse()
        token = re.search(r'csrf_token" value="([^"]+)"', page.read().decode())
        assert token is not None
        form = urllib.parse.urlencode({"csrf_token": token[1], "name": "hilda", "password": "guess"})
        cookie = page.headers["Set-Cookie"].split(";")[0]
        kind = {"Content-Type": "application/x-www-form-urlencoded", "Cookie": cookie}
        kind["Referer"] = "https://counts.example.org/inside/login"
        asked.request("POST", "/inside/login", body=form, headers=outside | kind)
        assert asked.getresponse().status == 401
        asked.close()
    assert "login refused, from 192.0.2.7" in caplog.text


def test_every_answer_is_hardened(app: Flask, client: FlaskClient) -> None:
    for address in addresses(app):
        headers = client.get(address).headers
        policy = headers["Content-Security-Policy"]
        assert "default-src 'none'" in policy
        assert "script-src 'self';" in policy, "no inline script, no eval"
        assert headers["X-Content-Type-Options"] == "nosniff"
        assert "Cache-Control" in headers


@pytest.mark.parametrize(("address", "public_url"), [("0.0.0.0", None), ("127.0.0.1", "https://a.example")])
def test_others_are_not_let_in_before_somebody_has_a_password(
    settings: Settings, guarded: Settings, address: str, public_url: str | None
) -> None:
    reach = {"address": address, "public_url": public_url}
    open_to_others = settings.model_copy(update={"web": settings.web.model_copy(update=reach)})
    with pytest.raises(ConfigError, match="nobody has a password: run `ginnel users add NAME`"):
        check_reach(open_to_others)
    check_reach(guarded.model_copy(update={"web": guarded.web.model_copy(update=reach)}))


def test_another_name_for_this_machine_is_refused(client: FlaskClient) -> None:
    answer = client.get("/", headers={"Host": "rebound.example"})
    assert answer.status_code == 400
    assert "Loom house" not in answer.text


@pytest.mark.parametrize(
    "path", ["/assets/x/../../app.py", "/assets/x/%2e%2e%2fapp.py", "/files/..%2fx.csv", "/charts/..json"]
)
def test_no_path_leads_out(client: FlaskClient, path: str) -> None:
    assert client.get(path).status_code in (400, 404)


@pytest.mark.parametrize(
    "name", ["<script>alert(1)</script>", "=cmd|' /C calc'!A0", "'; DROP TABLE sensor; --"]
)
def test_injected_names_stay_names(tmp_path: Path, name: str) -> None:
    (tmp_path / "ginnel.toml").write_text("", "utf-8")
    settings = load_settings(tmp_path / "ginnel.toml")
    with open_store(settings.store.url, create=True) as store:
        sensor = Sensor(name=name, approaching_name=f"{name} in", receding_name="out")
        span = Span(started_us=at_us("08:00:00"), ended_us=at_us("09:00:00"), sample_rate_hz=8000.0)
        record_span(store, sensor, span, [], "test")
    app = create_app(settings)
    client = app.test_client()
    for page in ("/", "/busy", "/fast", "/full", "/one-by-one", "/sure", "/take-away", "/side-by-side"):
        answer = client.get(page, query_string={"sensor": name})
        assert answer.status_code == 200
        assert "<script>alert" not in answer.text
    line = client.get("/files/counts.csv", query_string={"sensor": name}).text.splitlines()[1]
    assert not line.startswith("=")
    app.extensions["ginnel.store"].close()


def _ask(address: str, head: bytes) -> bytes:
    host, port = address.removeprefix("http://").rstrip("/").split(":")
    with socket.create_connection((host, int(port)), timeout=20) as asked:
        asked.sendall(head)
        try:
            return asked.recv(4096)
        except ConnectionResetError:
            return b""


def test_a_megabyte_of_headers_is_refused(settings: Settings) -> None:
    with serving(settings) as server:
        head = b"GET / HTTP/1.1\r\nHost: localhost\r\nX-Long: " + b"a" * 1_000_000
        try:
            answer = _ask(server.address, head)
        except (ConnectionResetError, BrokenPipeError):
            answer = b""  # hung up while we were still talking
        assert answer == b"" or b" 431 " in answer.splitlines()[0]


def test_slow_clients_keep_nobody_waiting(settings: Settings) -> None:
    with serving(settings) as server:
        host, port = server.address.removeprefix("http://").rstrip("/").split(":")
        slow = [socket.create_connection((host, int(port))) for _ in range(40)]
        try:
            for one in slow:
                one.sendall(b"GET / HTTP/1.1\r\nHost: loc")
            with urllib.request.urlopen(server.address, timeout=20) as answer:
                assert answer.status == 200
        finally:
            for one in slow:
                one.close()


def test_users_are_managed_by_hand(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "ginnel.toml").write_text("", "utf-8")
    monkeypatch.chdir(tmp_path)
    open_store(load_settings().store.url, create=True).close()

    def run(*words: str, said: str = "") -> tuple[int, str]:
        done = CliRunner().invoke(main, ["users", *words], input=said)
        return done.exit_code, done.output

    assert run("add", "ada", "--role", "edit", said="short\n")[0] == 1
    assert run("add", "a b", said=f"{PASSWORD}\n")[0] == 2
    assert run("add", "ada", "--role", "edit", said=f"{PASSWORD}\n") == (0, "ada may edit now.\n")
    assert run("add", "ada", said=f"{PASSWORD}\n")[0] == 1
    code, token = run("token", "ada", "script")
    assert code == 0
    assert token.startswith("ginnel_")
    assert "ada  edit\n  token script" in run("list")[1]
    assert run("password", "ada", said="another long one\n")[0] == 0
    assert run("token", "ada", "script", "--remove")[0] == 0
    assert "There are no users left." in run("remove", "ada")[1]
    assert run("list")[1] == "There are no users.\n"
    stored = (tmp_path / "ginnel.db").read_bytes()
    assert PASSWORD.encode() not in stored
    assert token.split()[0].encode() not in stored
