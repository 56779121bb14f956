"""Where HTTPS is, what this connection lacks without it, and pictures of addresses for a phone's camera."""

from dataclasses import dataclass

import segno

from webapp.reach import THIS_MACHINE_ONLY, address_for_phones


@dataclass(frozen=True)
class Connection:
    """How a browser reaches this server: its scheme, and the host and port it asked for."""

    scheme: str
    host: str

    @property
    def name(self):
        """The host without its port."""
        return self.host.rsplit(":", 1)[0].strip("[]") if not self.host.endswith("]") else self.host.strip("[]")

    @property
    def is_this_machine(self):
        """Whether the browser runs on the server's own machine."""
        return self.name in THIS_MACHINE_ONLY

    @property
    def is_full(self):
        """Whether browsers allow everything here: work without signal, position."""
        return self.scheme == "https" or self.is_this_machine

    def base_for_phones(self, port, listening_host):
        """Return the address to begin a link with that phones are to open: the one in use, unless it is localhost."""
        if self.is_this_machine:
            return self.for_phones(self.scheme, port, listening_host)
        return f"{self.scheme}://{self.host}"

    def for_phones(self, scheme, port, listening_host):
        """Return the address that reaches the same server from a phone."""
        name = (address_for_phones(listening_host) or self.name) if self.is_this_machine else self.name
        return f"{scheme}://{f'[{name}]' if ':' in name else name}:{port}"


def code(address):
    """Return an address as a QR code, in a data: URI for an img element."""
    return segno.make(address, error="m").svg_data_uri(scale=6, border=3, dark="#000", light="#fff")
