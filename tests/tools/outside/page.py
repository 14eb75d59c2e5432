"""Tables of the page of results, in numbers that are the same wherever they are computed."""

from dataclasses import dataclass, field


@dataclass
class Check:
    """One comparison with the outside."""

    what: str
    source: str
    tolerance: str
    why: str
    measured: str
    passed: bool


@dataclass
class Section:
    title: str
    text: str
    checks: list = field(default_factory=list)
    head: tuple = ()
    lines: list = field(default_factory=list)

    def markdown(self):
        parts = [f"## {self.title}", self.text]
        if self.checks:
            parts.append(grid(
                ("what", "against", "allowed", "why", "measured"),
                [(c.what, c.source, c.tolerance, c.why, c.measured if c.passed else f"**{c.measured}: fails**") for c in self.checks],
            ))
        if self.lines:
            parts.append(grid(self.head, self.lines))
        return "\n\n".join(parts)


def grid(head, lines):
    out = ["| " + " | ".join(head) + " |", "|" + "---|" * len(head)]
    out += ["| " + " | ".join(str(cell).replace("|", "\\|") for cell in line) + " |" for line in lines]
    return "\n".join(out)


def share(value):
    """A relative error: percent with two digits."""
    if value < 1e-7:
        return "< 0.00001 %"
    return f"{float(f'{100 * value:.2g}'):.10f}".rstrip("0").rstrip(".") + " %"


def tiny(value, floor=1e-12):
    """A difference that should be rounding: below the floor only that is said."""
    return f"< {floor:.0e}" if value < floor else f"{value:.0e}"
