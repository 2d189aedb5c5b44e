"""One line of the benchmark's table: what, asked, measured, and whether met."""

from dataclasses import asdict, dataclass, field

WIDTHS = (12, 72, 14, 42)
HEADINGS = ("part", "figure", "asked", "measured")


@dataclass
class Figure:
    """A measured figure. `asked` is "" where nothing is asked; `met` is then
    None. `values` holds the plain numbers for the JSON file."""

    part: str
    what: str
    measured: str
    asked: str = ""
    met: bool | None = None
    values: dict = field(default_factory=dict)

    def line(self):
        """The figure as a line of the table."""
        verdict = {None: "", True: "met", False: "missed"}[self.met]
        cells = zip((self.part, self.what, self.asked, self.measured), WIDTHS)
        return "".join(f"{cell:<{width}} " for cell, width in cells) + verdict

    def record(self):
        """The figure as plain data."""
        return asdict(self)


def heading():
    """First lines of the table."""
    titles = "".join(f"{title:<{width}} " for title, width in zip(HEADINGS, WIDTHS))
    return f"{titles}verdict\n{'-' * (sum(WIDTHS) + 11)}"


def at_least(part, what, value, asked, unit="", note="", **values):
    """A figure that should reach a value."""
    return Figure(part, what, f"{number(value)}{unit}{note}", f">= {number(asked)}{unit}",
                  bool(value >= asked), {"value": value, "asked": asked, **values})


def at_most(part, what, value, asked, unit="", note="", **values):
    """A figure that should not exceed a value."""
    return Figure(part, what, f"{number(value)}{unit}{note}", f"<= {number(asked)}{unit}",
                  bool(value <= asked), {"value": value, "asked": asked, **values})


def refused(part, what, error, asked=""):
    """A figure that could not be had; what was asked is then missed."""
    return Figure(part, what, f"none: {error}", asked, False if asked else None)


def number(value):
    """A number in few digits."""
    if isinstance(value, int) or abs(value) >= 100:
        return f"{value:,.0f}"
    return f"{value:.3g}"
