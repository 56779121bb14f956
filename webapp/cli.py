"""The `bankside` commands: serve, demo, backup, password."""

import sys
from dataclasses import replace
from datetime import UTC, datetime

import click
import segno

from webapp.config import BadSetting, read_config


@click.group()
def main():
    """Bankside: river oxygen surveys, from plan and predicted sag to a clean dataset."""


def listening(command):
    """Give a command the options of a server."""
    for option in (
        click.option("--data", "data_dir", help="Folder of the database file. [BANKSIDE_DATA, else bankside-data]"),
        click.option("--host", help="Address to listen on. [BANKSIDE_HOST, else 0.0.0.0: every address]"),
        click.option("--port", type=click.IntRange(1, 65535), help="Port. [BANKSIDE_PORT, else 8080]"),
        click.option("--https", is_flag=True, help="Serve HTTPS with a certificate made here, as phones need it."),
        click.option(
            "--http-port", type=click.IntRange(1, 65535), help="Plain port beside HTTPS. [the next after --port]"
        ),
    ):
        command = option(command)
    return command


@main.command()
@listening
@click.option("--office-name", help="Name of the first office account, at the first start.")
@click.option("--office-sign-in", help="Its sign-in name.")
@click.option("--office-password", envvar="BANKSIDE_OFFICE_PASSWORD", help="Its password. [BANKSIDE_OFFICE_PASSWORD]")
def serve(data_dir, host, port, https, http_port, office_name, office_sign_in, office_password):
    """Serve Bankside. The first start makes the database and the first office account."""
    config = _config(data_dir=data_dir, host=host, port=port)
    database = _open(config)
    _first_office(database, office_name, office_sign_in, office_password)
    database.engine.dispose()
    _serve_https(config, http_port) if https else _serve(config)


@main.command()
@listening
def demo(data_dir, host, port, https, http_port):
    """Load the demo survey into a data folder of its own, then serve it."""
    config = _config(data_dir=data_dir or "bankside-demo", host=host, port=port)
    from webapp import demo as demo_survey

    database = _open(config)
    with database.writing() as db:
        loaded = demo_survey.load(db, datetime.now(UTC))
    database.engine.dispose()
    click.echo("The demo survey is loaded." if loaded else "The demo survey was loaded before; it is as you left it.")
    click.echo("Sign in as one of:")
    for sign_in, password, role in demo_survey.SIGN_INS:
        click.echo(f"  {role:7} {sign_in:8} password {password}")
    _serve_https(config, http_port) if https else _serve(config)


@main.command()
@click.option("--data", "data_dir", help="Folder of the database file. [BANKSIDE_DATA, else bankside-data]")
@click.argument("sign_in")
@click.option("--password", prompt="New password", hide_input=True, confirmation_prompt=True)
def password(data_dir, sign_in, password):
    """Set a new password for somebody, for example when the office forgot its own."""
    from webapp.people import queries, service
    from webapp.people.forms import parse_password

    database = _open(_config(data_dir=data_dir))
    with database.writing() as db:
        person = queries.find_by_sign_in(db, sign_in)
        if person is None:
            raise click.ClickException(f"Nobody signs in as {sign_in}.")
        checked, errors = parse_password({"password": password}, person.sign_in)
        if errors:
            raise click.ClickException(errors["password"])
        service.change_password(db, person.id, checked, person.id)
    click.echo(f"{person.name} has a new password; their open sessions have ended.")


@main.command()
@click.option("--data", "data_dir", help="Folder of the database file. [BANKSIDE_DATA, else bankside-data]")
@click.argument("target")
def backup(data_dir, target):
    """Copy database, secret key and all else of the data folder to the new folder TARGET, also while it is served."""
    from webapp import backup as copies

    try:
        made = copies.backup(_config(data_dir=data_dir), target)
    except copies.NoBackup as trouble:
        raise click.ClickException(str(trouble)) from trouble
    click.echo(f"Copied to {made.folder}: {made.readings} readings, {made.size_mb:.1f} MB, checked.")
    click.echo("It is a data folder itself, with passwords' hashes and keys in it: keep it as you keep the server.")


def _config(**overrides):
    try:
        return read_config(**overrides)
    except BadSetting as bad:
        raise click.ClickException(str(bad)) from bad


def _open(config):
    """Return the Database, brought to this version's tables."""
    from webapp.db import Database, make_engine
    from webapp.migrate import upgrade

    config.data_dir.mkdir(parents=True, exist_ok=True)
    if (copy := upgrade(config.database_url, config.data_dir / "copies")) is not None:
        click.echo(f"The database was upgraded; a copy of it as it was is kept at {copy}")
    return Database(make_engine(config.database_url))


def _first_office(database, name, sign_in, password):
    from webapp.people import queries, service
    from webapp.people.forms import parse_person

    with database.writing() as db:
        if queries.active_offices(db):
            return
        if not (name and sign_in and password) and not sys.stdin.isatty():
            raise click.ClickException(
                "This database has no office account yet. Start with --office-name, --office-sign-in and "
                "--office-password (or BANKSIDE_OFFICE_PASSWORD), or from a terminal to be asked."
            )
        click.echo("This is the first start: make the first office account.")
        given = {
            "name": name or click.prompt("Your name"),
            "sign_in": sign_in or click.prompt("Sign-in name, for example d.marsh"),
            "password": password or click.prompt("Password", hide_input=True, confirmation_prompt=True),
            "role": "office",
        }
        new, errors = parse_person(given)
        if errors:
            raise click.ClickException(" ".join(errors.values()))
        service.add_person(db, new)


def _app(config, **flask_settings):
    """Return the application, or stop with words where the data folder does not allow one."""
    from webapp import create_app

    try:
        return create_app(config, **flask_settings)
    except BadSetting as bad:
        raise click.ClickException(str(bad)) from bad


def _serve(config):
    from waitress import serve as waitress_serve

    app = _app(config)
    for line in welcome(config):
        click.echo(line)
    waitress_serve(app, host=config.host, port=config.port, threads=config.threads, ident=None)


def _serve_https(config, http_port):
    """Serve HTTPS with a certificate of the data folder's own authority, and the trust page on a plain port."""
    from webapp import authority as authorities
    from webapp import https, reach

    config = replace(config, secure_cookies=True)
    http_port = http_port or (config.port + 1 if config.port < 65535 else config.port - 1)
    if http_port == config.port:
        raise click.ClickException("--http-port must differ from --port.")
    names = reach.machine_names(config.host)
    authority = authorities.read_or_make(config.data_dir, names)
    certificate = authorities.server_certificate(authority, config.data_dir, names)
    app = _app(config, AUTHORITY=authority, PLAIN_PORT=http_port)
    for line in [*welcome(config, scheme="https"), *_trust_lines(config, http_port, authority, certificate)]:
        click.echo(line)
    try:
        https.serve(app, config, certificate, http_port, authority)
    except OSError as taken:
        raise click.ClickException(f"Cannot listen on ports {config.port} and {http_port}: {taken}") from taken


def _trust_lines(config, http_port, authority, certificate):
    from webapp import reach

    left_out = ", ".join(certificate.left_out)
    lines = [f"The authority was not made for {left_out}: see README, HTTPS."] if left_out else []
    if (address := reach.address_for_phones(config.host)) is not None:
        url = f"http://{address}:{http_port}/trust"
        lines += [f"A phone that warns of the certificate is helped by {url}", _qr(url)]
    return [*lines, "The fingerprint to compare on the phone:", f"  {authority.fingerprint}"]


def welcome(config, network_address=None, scheme="http"):
    """Return the lines that say where Bankside is reached, with a QR code for phones."""
    from webapp.reach import address_for_phones

    lines = [f"On this machine: {scheme}://127.0.0.1:{config.port}/"]
    address = network_address or address_for_phones(config.host)
    if address is None:
        lines.append("For phones: this machine listens to itself only, or is on no network.")
    else:
        url = f"{scheme}://{address}:{config.port}/"
        lines += [f"For phones on the same network: {url}", _qr(url)]
    lines.append("Stop with Ctrl+C.")
    return lines


def _qr(url):
    import io

    text = io.StringIO()
    segno.make(url, error="m").terminal(out=text, border=2, compact=True)
    return text.getvalue()
