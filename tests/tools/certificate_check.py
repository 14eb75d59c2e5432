"""Looks at a PDF lot record with pikepdf and zxing-cpp and prints what it finds as JSON.

    python certificate_check.py record.pdf page.png...

The PNGs are pages as an outside program renders them; two-dimensional codes on them are read.
"""

import json
import sys

import pikepdf
import zxingcpp
from PIL import Image


def main():
    path, *pictures = sys.argv[1:]
    with pikepdf.open(path) as pdf:
        # Read only: as a context manager it would write itself in as the editor.
        xmp = pdf.open_metadata(set_pikepdf_as_editor=False, update_docinfo=False)
        metadata = {key: str(value) for key, value in xmp.items()}
        status = xmp.pdfa_status
        attachments = {}
        for name, specification in pdf.attachments.items():
            attachments[name] = {
                "relationship": str(specification.relationship),
                "mime": specification.get_file().mime_type,
                "size": specification.get_file().size,
            }
        found = {
            "pages": len(pdf.pages),
            "problems": list(pdf.check_pdf_syntax()),
            "pdfa_status": status,
            "metadata": metadata,
            "title": str(pdf.docinfo.get("/Title")),
            "author": str(pdf.docinfo.get("/Author")),
            "subject": str(pdf.docinfo.get("/Subject")),
            "producer": str(pdf.docinfo.get("/Producer")),
            "attachments": attachments,
        }
    codes = []
    for picture in pictures:
        with Image.open(picture) as image:
            codes += [code.text for code in zxingcpp.read_barcodes(image, formats=zxingcpp.BarcodeFormat.QRCode)]
    found["codes"] = codes
    json.dump(found, sys.stdout)


main()
