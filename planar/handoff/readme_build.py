"""The page of who builds the board and measures it: connector, mounting, what to expect, what to beware of.

What is to be expected comes from the prediction where there is one and is left out where there is none; places and
sizes come from the layout. Cautions are common practice, no source.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from planar.copper.layout import Layout, Pad
from planar.handoff.page import listed, mm, page, place, titled, wrapped
from planar.handoff.stackup_sheet import StackupSheet
from planar.units import SPEED_OF_LIGHT, show

_AT_THE_EDGE = 10e-3
"""m, a feed nearer than this to the board edge is reached from there."""


@dataclass(frozen=True)
class Expected:
    """What the prediction says of the nominal board at its feed: frequency (Hz) of least reflection, the largest
    reflection (dB) inside the band, the (low, high) Hz matched as well as asked, None where nothing is, and the
    impedance (ohm) in the middle of the band."""

    best_match_hz: float
    worst_reflection_db: float
    matched_hz: tuple[float, float] | None
    impedance_ohm: complex


@dataclass(frozen=True)
class BuildFacts:
    """What the page says beside layout and stackup: title of the `connector`, whether the feed is `balanced`, the
    impedance (ohm) it is measured against, the band (low, high) Hz and the reflection (dB) asked over it, whether the
    antenna is to `transmit`, the sentence on how far the numbers can be trusted, and what is `expected`.

    `cuts` are the cuts that were computed: what is cut off, and the shift of the response in Hz.
    """

    connector: str
    balanced: bool
    impedance_ohm: float
    band_hz: tuple[float, float]
    match_db: float
    transmit: bool
    status: str
    expected: Expected | None = None
    cuts: tuple[tuple[str, float], ...] = ()


def build_readme(layout: Layout, sheet: StackupSheet, *, facts: BuildFacts) -> str:
    """The page for a snapped `layout` on the stackup of `sheet`, at most 96 columns."""
    head = "\n".join([f"{sheet.facts.name}: for who builds the antenna and measures it", *wrapped(facts.status)])
    return page(
        head,
        titled("CONNECTOR", *wrapped(*_connector_texts(layout, facts))),
        titled("MOUNTING", *wrapped(*_mounting_texts(layout, sheet))),
        titled("MEASURING", *_numbered(_measuring_texts(layout, facts))),
        titled("WHEN IT IS OFF", *wrapped(*_off_texts(facts))),
        titled("CAUTIONS", *wrapped(*_caution_texts(facts))),
    )


def _numbered(texts: list[str]) -> list[str]:
    return listed((f"{i}." for i in range(1, len(texts) + 1)), texts)


def _connector_texts(layout: Layout, facts: BuildFacts) -> list[str]:
    signal, back = ([pad for pad in layout.pads if pad.terminal == kind] for kind in ("signal", "return"))
    texts = [
        f"{facts.connector}. It goes {_side(layout)}; the origin of all files is the feed.",
        f"Signal: {_lands(signal)}. Return: {_lands(back)}. Places in mm from the feed, seen from the top.",
    ]
    if facts.balanced:
        texts.append(
            "Both lands are alike and neither is ground: solder the balun or the balanced part to them with leads as "
            "short as it allows. A coax soldered on directly becomes part of the antenna."
        )
    else:
        texts.append(
            "Solder one return land first, look that the part sits square, then the signal, then every other return "
            "land: one left open moves the match. The copper draws heat: a broad tip, no longer than needed."
        )
    texts.append("No solder, flux, paint or label on the loop, the line or in a gap. Clean flux off the lands.")
    return texts


def _side(layout: Layout) -> str:
    x0, y0, x1, y1 = layout.edge.bounds
    distance, side = min((-x0, "left"), (x1, "right"), (-y0, "lower"), (y1, "upper"))
    if distance <= _AT_THE_EDGE:
        return f"by the {side} edge of the board, seen from the top, which is {mm(distance, 2)} mm from the feed"
    return "inside the loop, and the cable leaves at right angles to the board"


def _lands(pads: list[Pad]) -> str:
    places = []
    for pad in pads:
        x0, y0, x1, y1 = pad.outline.bounds
        places.append(f"{pad.name} on the {pad.level} at {place((0.5 * (x0 + x1), 0.5 * (y0 + y1)), 2)}")
    return "; ".join(places)


def _mounting_texts(layout: Layout, sheet: StackupSheet) -> list[str]:
    holes = [hole for hole in layout.holes if hole.purpose == "mounting"]
    sizes = " and ".join(f"{mm(size, 1)} mm" for size in sorted({hole.diameter for hole in holes}))
    texts = [f"{len(holes)} holes of {sizes}: nylon or other plastic screws and spacers, no metal."] if holes else []
    quarter = show(0.25 * SPEED_OF_LIGHT / sheet.facts.frequency_hz, "length", 2)
    texts.append(
        f"Metal, batteries, cables, walls and hands nearer than a quarter wavelength ({quarter}) move the frequency; "
        "lead the cable away at right angles to the loop."
    )
    if sheet.surroundings:
        around = ", ".join(
            layer.material + (f" {show(layer.thickness_m, 'length', 4)}" if layer.thickness_m > 0.0 else "")
            for layer in sheet.surroundings
        )
        texts.append(f"Designed with these around it, top to bottom, the board left out: {around}. Measure it so.")
    else:
        texts.append("Designed for free space, without cover or reflector: measure it so.")
    return texts


def _measuring_texts(layout: Layout, facts: BuildFacts) -> list[str]:
    low, high = facts.band_hz
    wide = f"{show(0.8 * low, 'frequency', 3)} to {show(1.2 * high, 'frequency', 3)}"
    short = "0 ohm (below 1 ohm) between signal and return: the loop is a short at DC, that is right"
    texts = [
        f"Ohmmeter first: {short if layout.dc_short else 'no connection between signal and return'}.",
        f"Calibrate the analyser at the end of its cable over {wide}, then move the reference plane by the length of "
        "the connector to the feed: every number here holds there. Ferrites on the cable keep it from radiating.",
        "Put the board as it will work, with all it was designed for in place, everything else a wavelength away.",
        f"Read the reflection against {show(facts.impedance_ohm, 'impedance', 4)}"
        + (" between the two lands" if facts.balanced else "")
        + f". Asked: {facts.match_db:g} dB or less from {_band(facts.band_hz)}.",
    ]
    if facts.expected is not None:
        texts.append(_expected_text(facts.expected, facts))
    texts.append("Save the sweep as a Touchstone file (.s1p) with date, board number and surroundings.")
    return texts


def _band(band: tuple[float, float]) -> str:
    return " to ".join(show(end, "frequency", 4) for end in band)


def _expected_text(expected: Expected, facts: BuildFacts) -> str:
    ohms = expected.impedance_ohm
    matched = f"; {facts.match_db:g} dB or less from {_band(expected.matched_hz)}" if expected.matched_hz else ""
    return (
        f"Expected of the nominal board: least reflection at {show(expected.best_match_hz, 'frequency', 4)}, at most "
        f"{expected.worst_reflection_db:.1f} dB in the band{matched}; {ohms.real:.0f} {'+' if ohms.imag >= 0 else '-'} "
        f"j{abs(ohms.imag):.0f} ohm at its middle."
    )


def _off_texts(facts: BuildFacts) -> list[str]:
    middle = math.sqrt(facts.band_hz[0] * facts.band_hz[1])
    texts = [
        "Look first at what is nearest: a cold joint, a return land left open, flux in a gap, metal near by, the plane "
        "of calibration, another laminate or thickness than ordered.",
        "Then compare the edges of the matched band, and where reflection is least, with those expected: all 1 % too "
        f"low ({_one_percent(middle)}) means about 1 % too long a loop, or a permittivity some per cent too "
        "high. Copper can be cut off, not put on: change one thing at a time, measure after each, and keep an uncut "
        "board.",
    ]
    if facts.cuts:
        rows = "; ".join(f"{name}: {hz / 1e6:+.1f} MHz" for name, hz in facts.cuts)
        texts.append(f"Cuts computed, shift of the response: {rows}. Cut half of it, measure, go on.")
    return texts


def _one_percent(frequency: float) -> str:
    return show(0.01 * frequency, "frequency", 2)


def _caution_texts(facts: BuildFacts) -> list[str]:
    texts = [
        "Etching at home: gloves, goggles, air; etchant never into a drain or a metal vessel, used up, it is hazardous "
        "waste.",
        "Dust of glass or ceramic from sawing, drilling and sanding harms lungs: wet, with a mask, with extraction.",
        "Solder and flux fumes: extract them; wash hands.",
    ]
    if facts.transmit:
        texts.append(
            "Transmitting: only in a band, at a power and with a duty cycle local rules allow or a licence grants; "
            "they may count e.r.p. or e.i.r.p. (2.15 dB apart). First measure the match, then transmit; keep the "
            "distance from people that exposure rules ask."
        )
    else:
        texts.append("For reception: not meant to transmit. An analyser's signal is one: keep it weak and short.")
    return texts
