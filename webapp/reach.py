"""The names and addresses by which phones reach this machine."""

import socket

import psutil

EVERY_ADDRESS = {"0.0.0.0", "::", ""}
THIS_MACHINE_ONLY = {"127.0.0.1", "localhost", "::1"}
OF_CONTAINERS = ("docker", "br-", "veth", "virbr")


def machine_names(host="0.0.0.0"):
    """Return every name and IPv4 address of this machine, and the host it was told to listen on."""
    short = host_name()
    names = [short, f"{short}.local", "localhost", "127.0.0.1", *network_addresses()]
    if host not in EVERY_ADDRESS:
        names.append(host.lower())
    return tuple(dict.fromkeys(names))


def address_for_phones(host="0.0.0.0"):
    """Return the address to give to phones, or None where the machine listens to itself only or is on no network."""
    if host not in EVERY_ADDRESS:
        return None if host in THIS_MACHINE_ONLY else host
    addresses = network_addresses()
    towards = _address_towards_the_world()
    return towards if towards in addresses else next(iter(addresses), None)


def network_addresses():
    """Return the IPv4 addresses on this machine's networks, also of a hotspot of its own, where no route leads out."""
    found = [
        entry.address
        for name, entries in psutil.net_if_addrs().items()
        for entry in entries
        if entry.family == socket.AF_INET and not name.startswith(OF_CONTAINERS)
    ]
    return [address for address in dict.fromkeys(found) if not address.startswith("127.")]


def host_name():
    """Return the machine's name as a certificate can hold it."""
    first = socket.gethostname().split(".")[0]
    plain = "".join(letter if letter.isascii() and letter.isalnum() else "-" for letter in first)
    return plain.strip("-").lower() or "bankside"


def _address_towards_the_world():
    with socket.socket(socket.AF_INET, socket.SOCK_DGRAM) as probe:
        try:
            probe.connect(("192.0.2.1", 9))  # a documentation address: no packet is sent, only a route looked up
        except OSError:
            return None
        return probe.getsockname()[0]
