"""Validates the signature of a PDF with pyHanko and prints what it finds as JSON.

    python signature_check.py record.pdf certificate.pem
"""

import datetime
import json
import logging
import sys

from asn1crypto import pem, x509
from pyhanko.pdf_utils.reader import PdfFileReader
from pyhanko.sign.validation import validate_pdf_signature
from pyhanko_certvalidator import ValidationContext


def main():
    path, root = sys.argv[1:]
    logging.disable(logging.CRITICAL)
    with open(root, "rb") as file:
        _, _, der = pem.unarmor(file.read())
    moment = datetime.datetime(2026, 10, 6, tzinfo=datetime.timezone.utc)
    context = ValidationContext(
        trust_roots=[x509.Certificate.load(der)], moment=moment, allow_fetching=False
    )
    with open(path, "rb") as file:
        reader = PdfFileReader(file)
        signatures = list(reader.embedded_signatures)
        found = {"signatures": len(signatures)}
        for signature in signatures:
            status = validate_pdf_signature(signature, signer_validation_context=context)
            attributes = [
                attribute["type"].native
                for attribute in signature.signer_info["signed_attrs"]
            ]
            found |= {
                "intact": status.intact,
                "valid": status.valid,
                "trusted": status.trusted,
                "coverage": status.coverage.name,
                "bottom_line": status.bottom_line,
                "mechanism": status.pkcs7_signature_mechanism,
                "digest": status.md_algorithm,
                "subfilter": str(signature.sig_object["/SubFilter"]),
                "time": signature.self_reported_timestamp.isoformat(),
                "attributes": sorted(attributes),
                "unsigned_attributes": signature.signer_info["unsigned_attrs"].native is not None,
                "subject": status.signing_cert.subject.native,
            }
    json.dump(found, sys.stdout)


main()
