"""Makes certificates and keys for the tests of signatures, in a folder. They protect nothing.

    python signing_keys.py FOLDER
"""

import datetime
import pathlib
import sys

from cryptography import x509
from cryptography.hazmat.primitives import hashes, serialization
from cryptography.hazmat.primitives.asymmetric import ec, rsa
from cryptography.x509.oid import NameOID

FORMS = {
    "pkcs8": serialization.PrivateFormat.PKCS8,
    "traditional": serialization.PrivateFormat.TraditionalOpenSSL,
}


def certificate(key, first_year, last_year, name="Goods-in, demonstration site"):
    subject = x509.Name(
        [
            x509.NameAttribute(NameOID.ORGANIZATION_NAME, "Invented Pump Drives"),
            x509.NameAttribute(NameOID.COMMON_NAME, name),
        ]
    )
    usage = dict.fromkeys(
        [
            "key_encipherment", "data_encipherment", "key_agreement", "key_cert_sign", "crl_sign",
            "encipher_only", "decipher_only",
        ],
        False,
    )
    utc = datetime.timezone.utc
    return (
        x509.CertificateBuilder()
        .subject_name(subject)
        .issuer_name(subject)
        .public_key(key.public_key())
        .serial_number(0x1234567890)
        .not_valid_before(datetime.datetime(first_year, 1, 1, tzinfo=utc))
        .not_valid_after(datetime.datetime(last_year, 12, 31, tzinfo=utc))
        .add_extension(
            x509.KeyUsage(digital_signature=True, content_commitment=True, **usage), critical=True
        )
        .sign(key, hashes.SHA256())
    )


def main():
    folder = pathlib.Path(sys.argv[1])

    def write_certificate(name, made):
        (folder / name).write_bytes(made.public_bytes(serialization.Encoding.PEM))

    def write_key(name, key, form="pkcs8", passphrase=None):
        encryption = (
            serialization.BestAvailableEncryption(passphrase)
            if passphrase
            else serialization.NoEncryption()
        )
        pem = key.private_bytes(serialization.Encoding.PEM, FORMS[form], encryption)
        (folder / name).write_bytes(pem)

    site = ec.generate_private_key(ec.SECP256R1())
    write_certificate("site.pem", certificate(site, 2026, 2027))
    write_certificate("expired.pem", certificate(site, 2020, 2021))
    write_certificate("early.pem", certificate(site, 2030, 2031))
    write_key("site.key", site)
    write_key("sec1.key", site, form="traditional")
    write_key("encrypted.key", site, passphrase=b"correct horse")
    (folder / "passphrase.txt").write_text("correct horse\n")
    (folder / "wrong.txt").write_text("battery staple\n")
    write_key("other.key", ec.generate_private_key(ec.SECP256R1()))
    larger = ec.generate_private_key(ec.SECP384R1())
    write_certificate("p384.pem", certificate(larger, 2026, 2027))
    write_key("p384.key", larger)
    old = rsa.generate_private_key(public_exponent=65537, key_size=2048)
    write_certificate("rsa.pem", certificate(old, 2026, 2027))
    write_key("rsa.key", old)
    text = (folder / "site.key").read_text()
    (folder / "damaged.key").write_text(text.replace("M", "N", 1))
    (folder / "nothing.key").write_text("")


main()
