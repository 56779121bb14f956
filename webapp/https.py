"""Serves HTTPS on a laptop of its own: threads that a slow phone holds alone, and a plain port that helps phones over.

waitress has no TLS. cheroot shakes hands in the thread that accepts, so one phone at the edge of the hotspot would stop
everybody; here each connection shakes hands in its own thread. Requests are read whole before they get one of the few
places in the application: a slow upload must hold neither a place nor the database.
"""

import errno
import io
import logging
import socket
import ssl
import threading
import time
from contextlib import suppress

import waitress
from cheroot.server import HTTPConnection
from cheroot.ssl import Adapter
from cheroot.ssl.builtin import BuiltinSSLAdapter
from cheroot.wsgi import Server

from webapp import authority as authorities
from webapp import reach

CONNECTIONS = 64  # threads, most of them waiting for a slow phone
SECONDS_OF_SILENCE = 15
SECONDS_BETWEEN_LOOKS = 30
LONGEST_HEADERS = 64 * 1024
FIRST_BYTE_OF_TLS = b"\x16"
PLAIN_PATHS = ("/trust", "/static/", "/scripts/", "/htmx.js")


class LazyAdapter(Adapter):
    """Wraps connections without shaking hands yet; its certificate can be replaced while it runs."""

    def __init__(self, certificate_path):
        super().__init__(str(certificate_path), str(certificate_path))
        self.context = ssl.create_default_context(ssl.Purpose.CLIENT_AUTH)
        self.renew(certificate_path)

    def renew(self, certificate_path):
        """Use the certificate now in the file for every new connection."""
        self.context.load_cert_chain(str(certificate_path))

    def bind(self, sock):
        """Return the listening socket as it is."""
        return sock

    def wrap(self, sock):
        """Return the connection, with its handshake still to come."""
        return self.context.wrap_socket(sock, server_side=True, do_handshake_on_connect=False), self.get_environ()

    def get_environ(self):
        """Return what the application is told about the connection."""
        return {"wsgi.url_scheme": "https", "HTTPS": "on"}

    makefile = BuiltinSSLAdapter.makefile


class Connection(HTTPConnection):
    """A connection that shakes hands in its own thread, and leads who speaks plain HTTP to the plain port."""

    shaken = False

    def communicate(self):
        """Answer one request; return whether the connection stays open."""
        try:
            if not self.shaken:
                if not self._speaks_tls():
                    return False
                self.socket.do_handshake()
                self.shaken = True
        except OSError:  # gone, silent, or it does not trust us; TLS errors are OSErrors too
            return False
        return super().communicate()

    def _speaks_tls(self):
        first = socket.socket.recv(self.socket, 1, socket.MSG_PEEK)
        if first and first != FIRST_BYTE_OF_TLS:
            socket.socket.recv(self.socket, 65536)
            where = f"http://{self.socket.getsockname()[0]}:{self.server.plain_port}/trust"
            answer = f"HTTP/1.1 302 Found\r\nLocation: {where}\r\nContent-Length: 0\r\nConnection: close\r\n\r\n"
            socket.socket.sendall(self.socket, answer.encode("ascii"))
        return first == FIRST_BYTE_OF_TLS


class HttpsServer(Server):
    """cheroot's server with the two above."""

    ConnectionClass = Connection

    def __init__(self, app, host, port, plain_port, certificate_path, places):
        super().__init__(
            (host, port),
            whole_requests(app, places),
            numthreads=CONNECTIONS,
            request_queue_size=64,
            timeout=SECONDS_OF_SILENCE,
            server_name="bankside",
        )
        self.max_request_header_size = LONGEST_HEADERS
        self.max_request_body_size = (
            2 * app.config["MAX_CONTENT_LENGTH"]
        )  # the application explains what is not far over
        self.plain_port = plain_port
        self.ssl_adapter = LazyAdapter(certificate_path)

    def error_log(self, msg="", level=logging.INFO, traceback=False):
        """Log what cheroot has to say."""
        logging.getLogger("webapp.https").log(level, msg, exc_info=traceback)


def whole_requests(app, places):
    """Return the application behind a reader of whole requests, with so many requests inside at once."""
    free = threading.BoundedSemaphore(places)

    def guarded(environ, start_response):
        length = environ.get("CONTENT_LENGTH") or "0"
        if length.isascii() and length.isdigit() and int(length) <= app.config["MAX_CONTENT_LENGTH"]:
            body = environ["wsgi.input"].read(int(length))
            if len(body) < int(length):
                raise ConnectionResetError(errno.ECONNRESET, "the phone went away before its request was whole")
            environ["wsgi.input"] = io.BytesIO(body)
        with free:
            answer = app(environ, start_response)
            try:
                return [b"".join(answer)]
            finally:
                getattr(answer, "close", bool)()

    return guarded


def plain_side(app):
    """Return a WSGI application for the plain port: the trust page and its files; everything else leads there."""

    def helped(environ, start_response):
        if environ.get("PATH_INFO", "").startswith(PLAIN_PATHS):
            return app(environ, start_response)
        start_response("302 Found", [("Location", "/trust"), ("Content-Length", "0")])
        return [b""]

    return helped


def serve(app, config, certificate, plain_port, authority):
    """Serve HTTPS on the config's port and the plain side on another, until somebody stops it."""
    plain = waitress.create_server(plain_side(app), host=config.host, port=plain_port, threads=4, ident=None)
    server = HttpsServer(app, config.host, config.port, plain_port, certificate.path, config.threads)
    server.prepare()  # takes its port before it starts a thread, so that a port in use ends the start
    threading.Thread(target=plain.run, daemon=True).start()
    watch = (server.ssl_adapter, config, authority, certificate)
    threading.Thread(target=_follow_networks, args=watch, daemon=True).start()
    with suppress(KeyboardInterrupt):  # Ctrl+C is how people stop it
        try:
            server.serve()
        finally:
            server.stop()


def _follow_networks(adapter, config, authority, certificate):
    while True:
        time.sleep(SECONDS_BETWEEN_LOOKS)
        try:
            certificate = renewed(adapter, config, authority, certificate)
        except OSError:  # a full disk: the old certificate serves on
            logging.getLogger(__name__).exception("The certificate could not be renewed.")


def renewed(adapter, config, authority, certificate):
    """Return the certificate for the machine's names as they are now, in use when it is not the one before.

    The names change when the hotspot starts or the laptop joins another network; and its last month begins one day.
    """
    newer = authorities.server_certificate(authority, config.data_dir, reach.machine_names(config.host))
    if newer.serial != certificate.serial:
        adapter.renew(newer.path)
    return newer
