"""A certificate authority of this data folder's own, and a certificate for the names phones reach the machine by.

The authority is made once, for phones have to be told by hand to trust it. It may vouch for this machine's names and
addresses, names that end in .local and private addresses only: whoever takes its key can't pretend to be a bank.
"""

import ipaddress
import os
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from pathlib import Path

from cryptography import x509
from cryptography.hazmat.primitives import hashes, serialization
from cryptography.hazmat.primitives.asymmetric import ec
from cryptography.x509.oid import ExtendedKeyUsageOID, NameOID

from webapp.reach import host_name

FOLDER = "https"
AUTHORITY_FILE = "authority.pem"
SERVER_FILE = "server.pem"
AUTHORITY_DAYS = 3650
SERVER_DAYS = 397  # phones refuse a server's certificate that is valid for more than 398 days
RENEW_DAYS = 30
PRIVATE = ("10.0.0.0/8", "172.16.0.0/12", "192.168.0.0/16", "100.64.0.0/10", "169.254.0.0/16", "127.0.0.0/8")


@dataclass(frozen=True)
class Authority:
    """The authority: its certificate, and the key that signs in its name."""

    certificate: x509.Certificate
    key: ec.EllipticCurvePrivateKey

    @property
    def der(self):
        """The certificate as phones take it."""
        return self.certificate.public_bytes(serialization.Encoding.DER)

    @property
    def fingerprint(self):
        """The SHA-256 fingerprint, as phones show it: pairs of hexadecimal digits."""
        return self.certificate.fingerprint(hashes.SHA256()).hex(" ").upper()

    @property
    def name(self):
        """What a phone calls it in its list of authorities."""
        return self.certificate.subject.get_attributes_for_oid(NameOID.COMMON_NAME)[0].value

    def vouches_for(self, name):
        """Return whether it may sign for a name or address."""
        allowed = self.certificate.extensions.get_extension_for_class(x509.NameConstraints).value.permitted_subtrees
        if isinstance(one := _general_name(name), x509.IPAddress):
            return any(isinstance(net, x509.IPAddress) and one.value in net.value for net in allowed)
        domains = [domain.value for domain in allowed if isinstance(domain, x509.DNSName)]
        return any(one.value == domain or one.value.endswith(f".{domain}") for domain in domains)


@dataclass(frozen=True)
class ServerCertificate:
    """The file with this machine's key and certificate, the names in it, and those the authority may not vouch for."""

    path: Path
    serial: int
    names: tuple
    left_out: tuple


def read_or_make(data_dir, names=(), now=None):
    """Return the data folder's Authority, made for the names when there is none or when the old one is about to end."""
    path = Path(data_dir) / FOLDER / AUTHORITY_FILE
    now = now or datetime.now(UTC)
    if path.exists():
        certificate, key = _read(path)
        if certificate.not_valid_after_utc - now > timedelta(days=RENEW_DAYS):
            return Authority(certificate, key)
    certificate, key = _make_authority(names, now)
    _keep(path, certificate, key)
    return Authority(certificate, key)


def server_certificate(authority, data_dir, names, now=None):
    """Return the ServerCertificate for the names, made anew when they changed, it is about to end or another signed."""
    path = Path(data_dir) / FOLDER / SERVER_FILE
    now = now or datetime.now(UTC)
    vouched = tuple(name for name in names if authority.vouches_for(name))
    left_out = tuple(name for name in names if name not in vouched)
    certificate = _read(path)[0] if path.exists() else None
    if certificate is None or not _still_good(certificate, authority, vouched, now):
        certificate, key = _make_server(authority, vouched, now)
        _keep(path, certificate, key)
    return ServerCertificate(path, certificate.serial_number, vouched, left_out)


def _general_name(name):
    try:
        return x509.IPAddress(ipaddress.ip_address(name))
    except ValueError:
        return x509.DNSName(name)


def _make_authority(names, now):
    key = ec.generate_private_key(ec.SECP256R1())
    host = host_name()
    name = x509.Name([x509.NameAttribute(NameOID.COMMON_NAME, f"Bankside on {host[:30]}, {now:%Y-%m-%d}")])
    given = [_general_name(one) for one in names]
    domains = [host, "local", "localhost", *(one.value for one in given if isinstance(one, x509.DNSName))]
    networks = [*PRIVATE, *(one.value for one in given if isinstance(one, x509.IPAddress))]
    allowed = [x509.DNSName(domain) for domain in dict.fromkeys(domains)]
    allowed += [x509.IPAddress(network) for network in dict.fromkeys(map(ipaddress.ip_network, networks))]
    builder = (
        _builder(name, name, key, now, AUTHORITY_DAYS)
        .add_extension(x509.BasicConstraints(ca=True, path_length=0), critical=True)
        .add_extension(_usage(key_cert_sign=True, crl_sign=True), critical=True)
        .add_extension(x509.NameConstraints(allowed, None), critical=True)
    )
    return builder.sign(key, hashes.SHA256()), key


def _make_server(authority, names, now):
    key = ec.generate_private_key(ec.SECP256R1())
    subject = x509.Name([x509.NameAttribute(NameOID.COMMON_NAME, "Bankside")])
    issuer = authority.certificate
    signer = issuer.extensions.get_extension_for_class(x509.SubjectKeyIdentifier).value
    days = min(SERVER_DAYS, (issuer.not_valid_after_utc - now).days)
    builder = (
        _builder(subject, issuer.subject, key, now, days)
        .add_extension(x509.BasicConstraints(ca=False, path_length=None), critical=True)
        .add_extension(_usage(digital_signature=True), critical=True)
        .add_extension(x509.ExtendedKeyUsage([ExtendedKeyUsageOID.SERVER_AUTH]), critical=False)
        .add_extension(x509.SubjectAlternativeName([_general_name(name) for name in names]), critical=False)
        .add_extension(x509.AuthorityKeyIdentifier.from_issuer_subject_key_identifier(signer), critical=False)
    )
    return builder.sign(authority.key, hashes.SHA256()), key


def _builder(subject, issuer, key, now, days):
    start = now - timedelta(days=1)  # a phone whose clock is behind must not find it not yet valid
    return (
        x509.CertificateBuilder()
        .subject_name(subject)
        .issuer_name(issuer)
        .public_key(key.public_key())
        .serial_number(x509.random_serial_number())
        .not_valid_before(start)
        .not_valid_after(start + timedelta(days=days))
        .add_extension(x509.SubjectKeyIdentifier.from_public_key(key.public_key()), critical=False)
    )


def _usage(**yes):
    every = ("digital_signature", "content_commitment", "key_encipherment", "data_encipherment", "key_agreement")
    every += ("key_cert_sign", "crl_sign", "encipher_only", "decipher_only")
    return x509.KeyUsage(**{name: yes.get(name, False) for name in every})


def _still_good(certificate, authority, names, now):
    held = certificate.extensions.get_extension_for_class(x509.SubjectAlternativeName).value
    signed = certificate.issuer == authority.certificate.subject and _signed_by(certificate, authority)
    fresh = certificate.not_valid_after_utc - now >= timedelta(days=RENEW_DAYS)
    return signed and fresh and {str(one.value) for one in held} == set(names)


def _signed_by(certificate, authority):
    signer = certificate.extensions.get_extension_for_class(x509.AuthorityKeyIdentifier).value.key_identifier
    own = authority.certificate.extensions.get_extension_for_class(x509.SubjectKeyIdentifier).value.digest
    return signer == own


def _read(path):
    content = path.read_bytes()
    return x509.load_pem_x509_certificate(content), serialization.load_pem_private_key(content, None)


def _keep(path, certificate, key):
    """Write key and certificate as one file, for its owner only, whole or not at all."""
    path.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
    text = key.private_bytes(
        serialization.Encoding.PEM, serialization.PrivateFormat.PKCS8, serialization.NoEncryption()
    ) + certificate.public_bytes(serialization.Encoding.PEM)
    beside = path.with_suffix(f".{os.getpid()}")
    with os.fdopen(os.open(beside, os.O_WRONLY | os.O_CREAT | os.O_TRUNC, 0o600), "wb") as file:
        file.write(text)
        file.flush()
        os.fsync(file.fileno())
    os.replace(beside, path)
