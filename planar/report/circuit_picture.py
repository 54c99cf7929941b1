"""The equivalent circuit of a design as a schematic with its values.

From the port on the left the line runs along the top, through line sections and the coupling of an open line end, to
the rail on the right; the branches of the loop lie between that rail and the return on the left, one below the other:
any number of modes fits a narrow screen. A resistor is a box, an inductor arcs, as in IEC 60617.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from planar.network.circuit import Branch, Circuit, CouplingCapacitor, LineSection, OpenEnd
from planar.report.svg import Box, Lettering, Point, colour, element, group, pen, svg_document, text, tooltip, wrapped
from planar.units import show

WIDTH, SIZE, LINE = 380.0, 11.0, 13.5
LEFT, RIGHT, TOP = 20.0, 360.0, 62.0
"""The rails and the line, in units of the picture; letters are 11 units high, 10 px on a phone of 360 px."""
SLOTS = (95.0, 190.0, 285.0)
"""Where the elements of a branch lie across."""
FIRST, HEIGHT, SHUNTED = 76.0, 56.0, 30.0
"""From the line to the first branch, of a branch, and what it takes more with a resistor across its inductor."""
PREFIXES = (
    (1e9, "G"),
    (1e6, "M"),
    (1e3, "k"),
    (1.0, ""),
    (1e-3, "m"),
    (1e-6, "µ"),
    (1e-9, "n"),
    (1e-12, "p"),
    (1e-15, "f"),
    (1e-18, "a"),
)
SHOWN = 1.2
"""Of the units in px, where there is room."""
_PEN = pen("ink", 1.3, {"stroke-linejoin": "round"})


@dataclass(frozen=True)
class _Symbol:
    """A symbol centred on the wire: its `name`, path data of its `strokes`, `half` the width it takes of the wire,
    `words` with their middles, and where its name is written, if it is."""

    name: str
    half: float
    strokes: str
    words: tuple[tuple[Point, str], ...]
    named_at: Point | None = None


@dataclass(frozen=True)
class _Row:
    """A branch: what stands above it, its symbols with their places, and how much room it takes above and below."""

    title: str
    symbols: tuple[tuple[float, _Symbol], ...]
    shunted: bool = False


def circuit_picture(circuit: Circuit, frequency: float) -> str:
    """Schematic of `circuit`; lengths of lines in degrees at `frequency` Hz. SVG text."""
    chain, rows = _chain(circuit, frequency), _rows(circuit)
    levels = _levels(rows)
    bottom = levels[-1] + 30.0 + (SHUNTED if rows[-1].shunted else 0.0)
    caption = wrapped(_caption(circuit, frequency), WIDTH - 8.0, SIZE)
    muted = Lettering(SIZE, "start", "muted")
    titles = [text((LEFT + 9.0, y - 19.0), row.title, muted) for row, y in zip(rows, levels, strict=True)]
    body = [
        *_on_wire(TOP, LEFT + 4.0, chain),
        *(part for row, y in zip(rows, levels, strict=True) for part in _on_wire(y, LEFT, row.symbols)),
        *_rails(levels),
        group("titles", {}, titles),
        group("caption", {}, [text((4.0, bottom + (i + 1) * LINE), words, muted) for i, words in enumerate(caption)]),
    ]
    view = Box(0.0, 0.0, WIDTH, bottom + (len(caption) + 0.6) * LINE)
    shown = (f"{SHOWN * view.width:.6g}", f"{SHOWN * view.height:.6g}")
    return svg_document(view, shown, ("Equivalent circuit", _description(chain, rows)), body)


def _levels(rows: Sequence[_Row]) -> list[float]:
    """Height of each branch's wire: below what hangs from the one above it."""
    levels: list[float] = []
    for i in range(len(rows)):
        above = SHUNTED if i and rows[i - 1].shunted else 0.0
        levels.append((levels[-1] if i else TOP + FIRST - HEIGHT) + HEIGHT + above)
    return levels


def engineering(value: float, unit: str) -> str:
    """`value` to three digits with a prefix; parts of a picofarad stay picofarad, as the trade writes them."""
    size, prefix = next((row for row in PREFIXES if value >= row[0] * 0.9995), PREFIXES[-1])
    if unit == "F" and 1e-14 <= value < 1e-12:
        size, prefix = 1e-12, "p"
    number = f"{value / size:#.3g}"
    return f"{number.rstrip('.')} {prefix}{unit}"


def _caption(circuit: Circuit, frequency: float) -> str:
    low, high = circuit.span
    has_line = bool(circuit.lines) or isinstance(circuit.coupling, OpenEnd)
    degrees = f"Degrees at {show(frequency, 'frequency')}. " if has_line else ""
    return (
        f"{degrees}Fitted from {show(low, 'frequency', 4)} to {show(high, 'frequency', 4)}: there its reflection is "
        f"within {circuit.deviation:.2g} of the field solution's. It says nothing outside."
    )


def _description(chain: Sequence[tuple[float, _Symbol]], rows: Sequence[_Row]) -> str:
    """The circuit in words."""
    said = [_said(symbol) for _, symbol in chain]
    said += [f"{row.title}: {', '.join(_said(symbol) for _, symbol in row.symbols)}" for row in rows]
    return f"From the port inward: {'; '.join(said)}"


def _said(symbol: _Symbol) -> str:
    return f"{symbol.name} {' '.join(words for _, words in symbol.words)}"


def _chain(circuit: Circuit, frequency: float) -> tuple[tuple[float, _Symbol], ...]:
    """Line sections and coupling, evenly along the top."""
    symbols = [_line(f"line {i}", line, frequency) for i, line in enumerate(circuit.lines, 1)]
    if isinstance(circuit.coupling, OpenEnd):
        symbols.append(_open_end(circuit.coupling.line, frequency))
    elif isinstance(circuit.coupling, CouplingCapacitor):
        symbols.append(_capacitor("coupling", circuit.coupling.capacitance))
    step = (RIGHT - LEFT) / (len(symbols) or 1)
    return tuple((LEFT + (i + 0.5) * step, symbol) for i, symbol in enumerate(symbols))


def _rows(circuit: Circuit) -> tuple[_Row, ...]:
    """The branches of the loop, from the top down."""
    rows: list[_Row] = []
    if circuit.dc is not None:
        parts = (_resistor(circuit.dc.resistance), _inductor(circuit.dc.inductance))
        rows.append(_Row("loop at DC", tuple(zip(SLOTS, parts, strict=False))))
    rows += [_mode(mode) for mode in circuit.modes]
    if circuit.static_capacitance > 0.0:
        static = _capacitor("static", circuit.static_capacitance)
        rows.append(_Row("static capacitance", ((SLOTS[1], static),)))
    return tuple(rows)


def _mode(mode: Branch) -> _Row:
    title = f"mode {mode.name}: {show(mode.resonance, 'frequency', 4)}, Q {mode.quality:.3g}"
    shunted = math.isfinite(mode.radiation)
    coil = _shunted_inductor(mode.inductance, mode.radiation) if shunted else _inductor(mode.inductance)
    symbols = [(SLOTS[1], coil), (SLOTS[2], _capacitor("series", mode.capacitance))]
    if mode.resistance > 0.0:
        symbols.insert(0, (SLOTS[0], _resistor(mode.resistance)))
    return _Row(title, tuple(symbols), shunted)


def _line(name: str, line: LineSection, frequency: float) -> _Symbol:
    """A box round its inner conductor, the name in front of it."""
    words = (((0.0, 24.0), engineering(line.impedance, "Ω")), ((0.0, 37.0), _degrees(line, frequency)))
    return _Symbol(name, 34.0, "M-34 -8h68v16h-68zM-34 0h68", words, (0.0, -14.0))


def _open_end(line: LineSection, frequency: float) -> _Symbol:
    """A stub across a break of the wire, open at its far end."""
    words = (((0.0, 24.0), engineering(line.impedance, "Ω")), ((0.0, 37.0), _degrees(line, frequency)))
    strokes = "M-5 0v-44M5 0v-44M-11 -10h22v-30h-22z"
    return _Symbol("open end", 5.0, strokes, words, (-40.0, -22.0))


def _degrees(line: LineSection, frequency: float) -> str:
    return f"{360.0 * frequency * line.delay:.1f}°"


def _resistor(ohm: float) -> _Symbol:
    return _Symbol("R", 16.0, "M-16 -5.5h32v11h-32z", (((0.0, 21.0), engineering(ohm, "Ω")),))


def _inductor(henry: float) -> _Symbol:
    return _Symbol("L", 18.0, _COIL, (((0.0, 17.0), engineering(henry, "H")),))


def _shunted_inductor(henry: float, ohm: float) -> _Symbol:
    """An inductor with a resistor across it."""
    across = f"{_COIL}M-26 0h8M18 0h8M-26 0v28h10M26 0v28h-10M-16 22.5h32v11h-32z"
    words = (((0.0, 15.0), engineering(henry, "H")), ((0.0, 47.0), engineering(ohm, "Ω")))
    return _Symbol("L and R across it", 26.0, across, words)


def _capacitor(name: str, farad: float) -> _Symbol:
    return _Symbol(f"{name} C", 3.0, "M-3 -10v20M3 -10v20", (((0.0, 24.0), engineering(farad, "F")),))


_COIL = "M-18 0" + "a4.5 4.5 0 0 1 9 0" * 4


def _on_wire(y: float, start: float, symbols: Sequence[tuple[float, _Symbol]]) -> list[str]:
    """A wire at height `y` from `start` to the right rail with symbols in it."""
    wire = f"M{start:.6g} {y:.6g}"
    drawn = []
    for place, symbol in symbols:
        wire += f"H{place - symbol.half:.6g}M{place + symbol.half:.6g} {y:.6g}"
        words = [text(at, said, Lettering(SIZE, "middle", "ink", bold=True)) for at, said in symbol.words]
        if symbol.named_at is not None:
            words.append(text(symbol.named_at, symbol.name, Lettering(SIZE, "middle", "muted")))
        strokes = element("path", _PEN | {"d": symbol.strokes})
        parts = "\n".join(["", tooltip(_said(symbol)), strokes, *words, ""])
        drawn.append(element("g", {"class": "symbol", "transform": f"translate({place:.6g} {y:.6g})"}, parts))
    return [element("path", _PEN | {"d": f"{wire}H{RIGHT:.6g}"}), *drawn]


def _rails(levels: Sequence[float]) -> list[str]:
    """The rails, the dots where branches meet them, and the port with its two terminals."""
    returns = TOP + 32.0
    rails = f"M{RIGHT} {TOP}V{levels[-1]:.6g}M{LEFT} {returns + 4}V{levels[-1]:.6g}"
    dots = [element("circle", {"cx": x, "cy": y, "r": 2.4}) for y in levels[:-1] for x in (LEFT, RIGHT)]
    rings = [element("circle", {"cx": LEFT, "cy": y, "r": 4.0}) for y in (TOP, returns)]
    return [
        element("path", _PEN | {"d": rails}),
        group("nodes", {"fill": colour("ink")}, dots),
        group("port", pen("feed", 1.6, {"fill": colour("paper")}), rings),
        text((4.0, TOP - 11.0), "port", Lettering(SIZE, "start", "feed")),
    ]
