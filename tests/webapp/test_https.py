"""The authority, the certificate, the HTTPS server and the trust page."""

import ipaddress
import re
import socket
import ssl
import stat
import threading
from contextlib import contextmanager
from datetime import UTC, datetime, timedelta
from http.client import HTTPConnection, HTTPSConnection
from urllib.parse import urlencode

import pytest
from click.testing import CliRunner
from cryptography import x509
from cryptography.hazmat.primitives import hashes
from cryptography.x509.oid import ExtendedKeyUsageOID

from tests.browser.conftest import free_port
from tests.conftest import PASSWORD
from webapp import authority as authorities
from webapp import cli, create_app, https, reach
from webapp.https import HttpsServer, plain_side, renewed

NAMES = ("fieldlaptop", "fieldlaptop.local", "localhost", "127.0.0.1", "10.42.0.1")
NOW = datetime(2026, 8, 12, 6, tzinfo=UTC)


def certificate_in(path):
    return x509.load_pem_x509_certificate(path.read_bytes())


def alternative_names(certificate):
    held = certificate.extensions.get_extension_for_class(x509.SubjectAlternativeName).value
    return {str(one.value) for one in held}


@pytest.fixture
def authority(tmp_path):
    return authorities.read_or_make(tmp_path, NAMES)


def test_authority_is_made_once_and_its_key_is_its_owners_only(tmp_path):
    first, second = authorities.read_or_make(tmp_path), authorities.read_or_make(tmp_path)
    assert first.fingerprint == second.fingerprint
    assert re.fullmatch(r"([0-9A-F]{2} ){31}[0-9A-F]{2}", first.fingerprint)
    assert stat.S_IMODE((tmp_path / "https" / "authority.pem").stat().st_mode) == 0o600
    assert stat.S_IMODE((tmp_path / "https").stat().st_mode) == 0o700


def test_authority_is_made_anew_only_when_it_is_about_to_end(tmp_path):
    first = authorities.read_or_make(tmp_path, now=NOW)
    later = authorities.read_or_make(tmp_path, now=NOW + timedelta(days=3600))
    last = authorities.read_or_make(tmp_path, now=NOW + timedelta(days=3630))
    assert first.fingerprint == later.fingerprint != last.fingerprint


def test_certificate_keeps_the_rules_of_phones(authority, tmp_path):
    made = authorities.server_certificate(authority, tmp_path, NAMES)
    certificate = certificate_in(made.path)
    assert alternative_names(certificate) == set(NAMES)
    usage = certificate.extensions.get_extension_for_class(x509.ExtendedKeyUsage).value
    assert list(usage) == [ExtendedKeyUsageOID.SERVER_AUTH]
    assert certificate.not_valid_after_utc - certificate.not_valid_before_utc <= timedelta(days=398)
    assert isinstance(certificate.signature_hash_algorithm, hashes.SHA256)
    assert certificate.public_key().curve.name == "secp256r1"
    assert stat.S_IMODE(made.path.stat().st_mode) == 0o600
    certificate.verify_directly_issued_by(authority.certificate)


def test_certificate_stays_while_nothing_changed(authority, tmp_path):
    first = authorities.server_certificate(authority, tmp_path, NAMES)
    assert authorities.server_certificate(authority, tmp_path, NAMES).serial == first.serial


def test_certificate_is_made_anew_for_a_new_address_or_in_its_last_month(authority, tmp_path):
    now = datetime.now(UTC)
    first = authorities.server_certificate(authority, tmp_path, NAMES, now)
    moved = authorities.server_certificate(authority, tmp_path, (*NAMES, "192.168.4.1"), now)
    assert moved.serial != first.serial
    assert "192.168.4.1" in alternative_names(certificate_in(moved.path))
    kept = authorities.server_certificate(authority, tmp_path, moved.names, now + timedelta(days=365))
    assert kept.serial == moved.serial
    renewed = authorities.server_certificate(authority, tmp_path, moved.names, now + timedelta(days=367))
    assert renewed.serial != moved.serial


def test_certificate_of_another_authority_is_replaced(authority, tmp_path):
    first = authorities.server_certificate(authority, tmp_path, NAMES)
    (tmp_path / "https" / "authority.pem").unlink()
    newer = authorities.read_or_make(tmp_path, NAMES)
    second = authorities.server_certificate(newer, tmp_path, NAMES)
    assert second.serial != first.serial
    certificate_in(second.path).verify_directly_issued_by(newer.certificate)


def test_authority_vouches_for_local_names_only(authority, tmp_path):
    assert authority.vouches_for("other.local")
    assert authority.vouches_for("192.168.77.5")
    assert not authority.vouches_for("bank.example")
    assert not authority.vouches_for("198.51.100.7")
    made = authorities.server_certificate(authority, tmp_path, (*NAMES, "bank.example"))
    assert made.left_out == ("bank.example",)
    assert "bank.example" not in alternative_names(certificate_in(made.path))


def test_machine_is_reached_by_name_and_by_every_address_of_its_networks():
    names = reach.machine_names("field.example")
    assert {"localhost", "127.0.0.1", "field.example", f"{reach.host_name()}.local"} <= set(names)
    for address in reach.network_addresses():
        assert address in names
        assert not ipaddress.ip_address(address).is_loopback


def test_a_server_for_one_address_gives_that_address_to_phones():
    assert reach.address_for_phones("10.42.0.1") == "10.42.0.1"
    assert reach.address_for_phones("127.0.0.1") is None


@contextmanager
def https_server(app, config, authority):
    port = free_port()
    made = authorities.server_certificate(authority, config.data_dir, NAMES)
    server = HttpsServer(app, "127.0.0.1", port, 8081, made.path, config.threads)
    server.prepare()
    thread = threading.Thread(target=server.serve, daemon=True)
    thread.start()
    try:
        yield port, server
    finally:
        server.stop()
        thread.join(5)


@pytest.fixture
def served(config, people):
    """The port of an HTTPS server, and a TLS context that trusts nothing but its authority."""
    authority = authorities.read_or_make(config.data_dir, NAMES)
    app = create_app(config, TESTING=True, RATELIMIT_ENABLED=False, AUTHORITY=authority, PLAIN_PORT=8081)
    trusting = ssl.create_default_context(cadata=authority.der)
    with https_server(app, config, authority) as (port, _):
        yield port, trusting
    app.extensions["bankside_database"].engine.dispose()


def ask(port, trusting, path="/sign-in"):
    connection = HTTPSConnection("127.0.0.1", port, context=trusting, timeout=10)
    connection.request("GET", path)
    answer = connection.getresponse()
    answer.text = answer.read().decode()
    connection.close()
    return answer


def test_a_phone_that_trusts_the_authority_gets_its_page(served):
    answer = ask(*served)
    assert answer.status == 200
    assert "Sign in" in answer.text
    assert "plain HTTP" not in answer.text


def test_a_phone_that_does_not_trust_it_is_refused_by_its_own_tls(served):
    port, _ = served
    with pytest.raises(ssl.SSLCertVerificationError, match="unable to get local issuer|self.signed"):
        ask(port, ssl.create_default_context())


def test_a_form_is_saved_over_https_and_read_whole(served):
    port, trusting = served
    form = ask(port, trusting)
    token = re.search(r'name="csrf_token" value="([^"]+)"', form.text).group(1)
    connection = HTTPSConnection("127.0.0.1", port, context=trusting, timeout=10)
    body = urlencode({"csrf_token": token, "sign_in": "crew.test", "password": PASSWORD})
    headers = {
        "Cookie": form.getheader("Set-Cookie").split(";")[0],
        "Content-Type": "application/x-www-form-urlencoded",
        "Referer": f"https://127.0.0.1:{port}/sign-in",
    }
    connection.request("POST", "/sign-in", body, headers)
    answer = connection.getresponse()
    assert (answer.status, answer.getheader("Location")) == (303, "/")
    connection.close()


def test_slow_and_silent_phones_hold_nobody_up(served):
    port, trusting = served
    silent = [socket.create_connection(("127.0.0.1", port)) for _ in range(12)]
    dripping = [
        trusting.wrap_socket(socket.create_connection(("127.0.0.1", port)), server_hostname="127.0.0.1")
        for _ in range(12)
    ]
    for one in dripping:
        one.sendall(b"POST /sign-in HTTP/1.1\r\nHost: 127.0.0.1\r\nContent-Length: 500\r\n\r\ncsrf")
    assert ask(port, trusting).status == 200
    for one in [*silent, *dripping]:
        one.close()


@pytest.mark.parametrize(
    ("headers", "status"),
    [
        ({"Content-Length": str(6 * 1024 * 1024)}, 413),
        ({"Content-Length": str(10**12)}, 413),
        ({"Content-Length": "many"}, 400),
        ({"X-Long": "x" * 100_000}, 413),
    ],
)
def test_a_request_that_is_too_large_is_refused_unread(served, headers, status):
    port, trusting = served
    connection = HTTPSConnection("127.0.0.1", port, context=trusting, timeout=10)
    connection.putrequest("POST", "/sign-in")
    for name, value in headers.items():
        connection.putheader(name, value)
    connection.endheaders()
    assert connection.getresponse().status == status
    connection.close()
    assert ask(port, trusting).status == 200


def test_plain_http_on_the_https_port_is_led_to_the_trust_page(served):
    port, _ = served
    connection = HTTPConnection("127.0.0.1", port, timeout=10)
    connection.request("GET", "/")
    answer = connection.getresponse()
    assert answer.status == 302
    assert answer.getheader("Location") == "http://127.0.0.1:8081/trust"
    connection.close()


def test_a_hotspot_that_starts_later_is_in_the_certificate_of_the_next_connection(config, people, monkeypatch):
    monkeypatch.setattr(reach, "machine_names", lambda host: NAMES)
    authority = authorities.read_or_make(config.data_dir, NAMES)
    made = authorities.server_certificate(authority, config.data_dir, NAMES)
    app = create_app(config, TESTING=True, AUTHORITY=authority, PLAIN_PORT=8081)
    with https_server(app, config, authority) as (port, server):
        assert renewed(server.ssl_adapter, config, authority, made).serial == made.serial == serial_at(port)
        monkeypatch.setattr(reach, "machine_names", lambda host: (*NAMES, "192.168.137.1"))
        newer = renewed(server.ssl_adapter, config, authority, made)
        assert newer.serial == serial_at(port) != made.serial
    app.extensions["bankside_database"].engine.dispose()


def serial_at(port):
    given = ssl.get_server_certificate(("127.0.0.1", port))
    return x509.load_pem_x509_certificate(given.encode()).serial_number


@pytest.fixture
def with_authority(config, people):
    """The application as `serve --https` makes it, and its authority."""
    authority = authorities.read_or_make(config.data_dir)
    app = create_app(config, TESTING=True, AUTHORITY=authority, PLAIN_PORT=8081)
    yield app, authority
    app.extensions["bankside_database"].engine.dispose()


def test_the_plain_port_serves_the_trust_page_and_leads_everything_else_there(with_authority):
    from werkzeug.test import Client

    app, _ = with_authority
    plain = Client(plain_side(app))
    assert plain.get("/trust").status_code == 200
    assert plain.get("/static/app.css").status_code == 200
    for path in ("/", "/sign-in", "/surveys/x/sheet"):
        answer = plain.get(path)
        assert (answer.status_code, answer.headers["Location"]) == (302, "/trust")
    assert plain.post("/sign-in", data={"sign_in": "crew.test"}).status_code == 302


def test_trust_page_shows_the_fingerprint_the_steps_and_the_https_address(with_authority):
    app, authority = with_authority
    answer = app.test_client().get("/trust", base_url="http://10.42.0.1:8081")
    assert authority.fingerprint in answer.text
    assert 'href="https://10.42.0.1:8080/"' in answer.text
    for words in ("without signal", "position", "Certificate Trust Settings", "Install anyway", authority.name):
        assert words in answer.text


def test_trust_page_on_the_laptop_itself_shows_a_code_for_phones(with_authority, monkeypatch):
    app, _ = with_authority
    monkeypatch.setattr("webapp.reach.network_addresses", lambda: ["10.42.0.1"])
    answer = app.test_client().get("/trust", base_url="https://127.0.0.1:8080")
    assert "http://10.42.0.1:8081/trust" in answer.text
    assert 'src="data:image/svg+xml' in answer.text


def test_certificate_comes_as_phones_take_it(with_authority):
    app, authority = with_authority
    answer = app.test_client().get("/trust/bankside.crt")
    assert answer.mimetype == "application/x-x509-ca-cert"
    assert not answer.headers["Content-Disposition"].startswith("attachment")
    given = x509.load_der_x509_certificate(answer.data)
    assert given == authority.certificate
    assert b"PRIVATE" not in answer.data


def test_without_https_the_page_says_how_to_get_it(app):
    client = app.test_client()
    answer = client.get("/trust", base_url="http://10.42.0.1:8080")
    assert "bankside serve --https" in answer.text
    assert client.get("/trust/bankside.crt").status_code == 404


@pytest.mark.parametrize(
    ("base", "linked"),
    [("http://10.42.0.1:8080", True), ("https://10.42.0.1:8080", False), ("http://localhost", False)],
)
def test_sign_in_page_names_what_plain_http_lacks(app, base, linked):
    answer = app.test_client().get("/sign-in", base_url=base)
    assert ('href="/trust"' in answer.text) is linked


OFFICE = ["--office-name", "Olive Reed", "--office-sign-in", "olive", "--office-password", "heron under willow"]


def started(tmp_path, *more):
    return CliRunner().invoke(cli.main, ["serve", "--https", "--data", str(tmp_path), *OFFICE, *more])


def test_serve_https_prints_both_addresses_and_the_fingerprint(tmp_path, monkeypatch):
    served = []
    monkeypatch.setattr(https, "serve", lambda *given: served.append(given))
    monkeypatch.setattr(reach, "network_addresses", lambda: ["10.42.0.1"])
    answer = started(tmp_path, "--port", "8443")
    assert answer.exit_code == 0, answer.output
    assert "https://10.42.0.1:8443/" in answer.output
    assert "http://10.42.0.1:8444/trust" in answer.output
    assert authorities.read_or_make(tmp_path).fingerprint in answer.output
    app, config, _, plain_port, _ = served[0]
    assert app.config["SESSION_COOKIE_SECURE"] is config.secure_cookies is True
    assert plain_port == 8444


@pytest.mark.parametrize("taken_is", ["--port", "--http-port"])
def test_a_port_in_use_ends_the_start_with_a_reason(tmp_path, taken_is):
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        ports = {"--port": free_port(), "--http-port": free_port(), taken_is: taken.getsockname()[1]}
        answer = started(tmp_path, "--host", "127.0.0.1", *(str(one) for pair in ports.items() for one in pair))
    assert answer.exit_code == 1
    assert "Cannot listen" in answer.output


def test_both_ports_the_same_is_refused(tmp_path):
    answer = started(tmp_path, "--port", "8443", "--http-port", "8443")
    assert answer.exit_code == 1
    assert "must differ" in answer.output
