"""Sweep files in the forms that instruments and their operators leave behind."""

from dataclasses import dataclass


@dataclass
class Form:
    """How a delimited file is written."""

    delimiter: str = ","
    decimal: str = "."
    newline: str = "\n"
    encoding: str = "utf-8"
    preamble: tuple = ()
    align: bool = False  # pad with blanks, as a printout does


def number(value, digits=7):
    """A number to so many significant digits, plain where it is short, with an exponent elsewhere."""
    return f"{value:.{digits}g}"


def table(path, headings, rows, form):
    """Writes rows of texts under headings."""
    lines = list(form.preamble)
    cells = [headings, *rows]
    if form.decimal != ".":
        cells = [headings] + [[cell.replace(".", form.decimal) for cell in row] for row in rows]
    if form.align:
        width = [max(len(row[i]) for row in cells) for i in range(len(headings))]
        lines += ["  ".join(cell.rjust(w) for cell, w in zip(row, width)) for row in cells]
    else:
        lines += [form.delimiter.join(row) for row in cells]
    text = form.newline.join(lines) + form.newline
    path.write_bytes(text.encode(form.encoding))


def cut_short(path, lines_left, last):
    """Leaves so many lines and the first `last` bytes of the next: the export broke off."""
    content = path.read_bytes().split(b"\n")
    path.write_bytes(b"\n".join(content[:lines_left] + [content[lines_left][:last]]))
