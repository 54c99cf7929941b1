"""An antenna family as its file describes it: the names of its dimensions, and where sizing starts.

The names are one vocabulary for the brief, sizing, reports and the command line. How a family is
drawn is code (`planar.copper.families`); everything that is a number or a word is here.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from planar.errors import Fault, LibraryError
from planar.library.reading import (
    Key,
    Rows,
    Table,
    boolean,
    choice,
    count,
    list_of,
    measure,
    nearest,
    number,
    read,
    text,
)

TRAITS = ("corner", "rectangle", "circular", "via", "open", "trim")
"""What a design may have that makes a dimension needed."""


@dataclass(frozen=True)
class DimensionRule:
    """A dimension of a family, its meaning, and the traits a design must have to need it.

    `along` tells that it is a length along the loop. Sizing moves it where it is `sized` and the design has all
    traits of `sized_with`. Where every edge of the copper recedes by some length, the dimension grows by `etch` of them
    (-2 a width, +2 a gap, -1 a free end, +1 where the wider copper it starts at recedes), in a design with all traits
    of `etch_with`.
    """

    name: str
    meaning: str
    needs: frozenset[str]
    along: bool
    sized: bool
    sized_with: frozenset[str]
    etch: int = 0
    etch_with: frozenset[str] = frozenset()


@dataclass(frozen=True)
class Start:
    """Where the first sizing starts.

    `frequency_error` is the fraction by which the sized frequency may be off. `perimeter_ratio` is
    the mean line over that of the bare loop at resonance, `gap_resistance_ratio` the resistance the
    line meets over that of the bare loop. The second gap lies `second_gap_angle` rad round the loop
    and is `second_gap_wavelengths` free-space wavelengths long.
    """

    frequency_error: float
    perimeter_ratio: float
    gap_resistance_ratio: float | None
    second_gap_angle: float | None
    second_gap_wavelengths: float | None


@dataclass(frozen=True)
class Family:
    """One antenna family. `feed` is "coax" or "balanced".

    `trace_wavelengths` and `gap_wavelengths` are default widths in free-space wavelengths,
    `trace_line_widths` the least trace in widths of the line it guides (0 where it guides none).
    `starts` is by polarisation and end: "linear", "circular", "linear-via", ...
    """

    key: str
    title: str
    summary: str
    levels: int
    feed: str
    trace_wavelengths: float
    trace_line_widths: float
    gap_wavelengths: float
    circular_note: str
    dimensions: tuple[DimensionRule, ...]
    starts: Mapping[str, Start]

    def needed(self, traits: frozenset[str]) -> tuple[str, ...]:
        """Names of the dimensions a design with `traits` has."""
        return tuple(rule.name for rule in self.dimensions if rule.needs <= traits)

    @property
    def along(self) -> frozenset[str]:
        """Names of the dimensions that are lengths along the loop."""
        return frozenset(rule.name for rule in self.dimensions if rule.along)

    def sized(self, traits: frozenset[str]) -> tuple[str, ...]:
        """Names of the dimensions sizing moves, beside the loop itself, in a design with `traits`."""
        return tuple(r.name for r in self.dimensions if r.sized and r.needs <= traits and r.sized_with <= traits)

    def etched(self, traits: frozenset[str]) -> dict[str, int]:
        """Edges by which each dimension a design with `traits` has grows where all copper edges recede; 0 left out."""
        return {r.name: r.etch for r in self.dimensions if r.etch and r.needs <= traits and r.etch_with <= traits}

    def meaning(self, name: str) -> str:
        """What the dimension `name` is."""
        return next(rule.meaning for rule in self.dimensions if rule.name == name)

    def start(self, traits: frozenset[str]) -> Start:
        """Starting values of a design with `traits`. Raises `LibraryError` where the family has none."""
        polarisation = "circular" if "circular" in traits else "linear"
        ends = traits & {"via", "open"}
        name = "-".join([polarisation, *ends])
        if name not in self.starts:
            raise LibraryError(
                [Fault(f"family {self.key}", f"start.{name}", "(not given)", "starting values are needed")]
            )
        return self.starts[name]

    @property
    def ends(self) -> tuple[str, ...]:
        """How the line may end past the gap; empty where there is no such line."""
        return tuple(sorted({name.partition("-")[2] for name in self.starts} - {""}))

    def dimension_faults(
        self, given: Mapping[str, float], traits: frozenset[str], defaulted: frozenset[str], *, where: str
    ) -> list[Fault]:
        """What is wrong with the names of `given` dimensions; those in `defaulted` may be left out."""
        needed = self.needed(traits)
        faults = [
            Fault(
                where,
                f"antenna.dimensions.{name}",
                f'"{value * 1e3:g} mm"',
                f"{self.key} has no such dimension here{nearest(name, needed)}; there are: {', '.join(needed)}",
            )
            for name, value in given.items()
            if name not in needed
        ]
        missing = [name for name in needed if name not in given and name not in defaulted]
        faults += [
            Fault(where, f"antenna.dimensions.{name}", "(not given)", f"needed: {self.meaning(name)}")
            for name in missing
        ]
        return faults


def _sourced(value: Key, *, required: bool = True) -> Table:
    return Table({"value": value, "source": Key(text)}, required)


_SHARE = Key(number(1e-4, 0.5))
_HEAD: dict[str, Key | Table | Rows] = {
    "title": Key(text),
    "summary": Key(text),
    "levels": Key(count(1, 2)),
    "feed": Key(choice("coax", "balanced")),
    "trace_wavelengths": _sourced(_SHARE),
    "trace_line_widths": _sourced(Key(number(1.0, 20.0)), required=False),
    "gap_wavelengths": _sourced(_SHARE, required=False),
    "circular_note": _sourced(Key(text), required=False),
}
_DIMENSION = Table(
    {
        "meaning": Key(text),
        "needs": Key(list_of(choice(*TRAITS)), required=False),
        "along": Key(boolean, required=False),
        "sized": Key(boolean, required=False),
        "sized_with": Key(list_of(choice(*TRAITS)), required=False),
        "etch": Key(count(-2, 2), required=False),
        "etch_with": Key(list_of(choice(*TRAITS)), required=False),
    }
)
_START = Table(
    {
        "frequency_error": _sourced(Key(measure("fraction", 0.0, 0.5))),
        "perimeter_ratio": _sourced(Key(number(0.5, 2.0))),
        "gap_resistance_ratio": _sourced(Key(number(0.2, 10.0)), required=False),
        "second_gap_angle": _sourced(Key(measure("angle", 0.1, 3.1)), required=False),
        "second_gap_wavelengths": _sourced(_SHARE, required=False),
    }
)


def read_family(key: str, raw: Mapping[str, Any], where: str) -> Family:
    """Family of a parsed file. Raises `LibraryError` with every fault of the file `where`."""
    shape = Table(
        {
            **_HEAD,
            "dimensions": Table(dict.fromkeys(_names(raw, "dimensions"), _DIMENSION)),
            "start": Table(dict.fromkeys(_names(raw, "start"), _START)),
        }
    )
    values = read(raw, shape, where)
    for table in ("dimensions", "start"):
        if not values[table]:
            raise LibraryError([Fault(where, table, "(empty)", f"at least one [{table}.<name>] is needed")])
    rules = tuple(
        DimensionRule(
            name,
            rule["meaning"],
            frozenset(rule["needs"] or ()),
            bool(rule["along"]),
            bool(rule["sized"]),
            frozenset(rule["sized_with"] or ()),
            rule["etch"] or 0,
            frozenset(rule["etch_with"] or ()),
        )
        for name, rule in values["dimensions"].items()
    )
    starts = {name: Start(**{k: _value(v) for k, v in start.items()}) for name, start in values["start"].items()}
    return Family(
        key=key,
        title=values["title"],
        summary=values["summary"],
        levels=values["levels"],
        feed=values["feed"],
        trace_wavelengths=_value(values["trace_wavelengths"]),
        trace_line_widths=_value(values["trace_line_widths"]) or 0.0,
        gap_wavelengths=_value(values["gap_wavelengths"]) or 0.0,
        circular_note=_value(values["circular_note"]) or "",
        dimensions=rules,
        starts=starts,
    )


def _names(raw: Mapping[str, Any], table: str) -> list[str]:
    found = raw.get(table, {})
    return list(found) if isinstance(found, Mapping) else []


def _value(sourced: Mapping[str, Any] | None) -> Any:
    return None if sourced is None else sourced["value"]
