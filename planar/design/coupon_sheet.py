"""The sheet that goes with a measuring board, and the report of a measurement: plain text with Markdown tables.

The sheet is complete without a computer: what to measure in which order, the formulas with their sources, the
expected numbers, and columns to fill in with a pencil.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

from planar.design.coupon import Coupon, eps_at
from planar.design.coupon_budget import COVERAGE, Estimate, permittivity_slope
from planar.design.coupon_measure import CouponMeasurement
from planar.errors import RangeError
from planar.units import show

SCALES = (0.90, 0.95, 1.0, 1.05, 1.10)
"""Permittivities over the library's for which the sheet lists what would be measured."""


def coupon_sheet(coupon: Coupon, *, design: str) -> str:
    """The sheet of `coupon`; `design` is what stands for it on the command line (its folder or file)."""
    sections = (_head(coupon), _solder(coupon), _order(coupon), _ring(coupon), _lines(coupon), _cautions(coupon))
    return "\n\n".join((*sections, _command(design))) + "\n"


def measurement_report(measurement: CouponMeasurement) -> str:
    """What a measurement gave, with every contribution to its uncertainty."""
    m = measurement
    at = show(m.frequency, "frequency", 4)
    apart = 100.0 * (m.eps_r / m.nominal - 1.0)
    lines = [
        f"eps_r = {m.eps_r:.3f} +- {m.uncertainty:.3f} (k = {COVERAGE:g}) at {at}",
        f"library: {m.nominal:.3f} within {show(m.nominal_tolerance, 'fraction', 3)}; measured {apart:+.1f} % from it",
    ]
    if m.tan_d is not None:
        where = show(m.tan_d.frequency, "frequency", 3)
        lines.append(f"loss tangent = {m.tan_d.tan_d:.4f} +- {m.tan_d.uncertainty:.4f} (k = {COVERAGE:g}) near {where}")
    lines += ["", *_budget(m.by_method, m.estimate)]
    if m.resonances:
        head = ("n", "frequency", "Q loaded", "Q unloaded", "peak", "taken off for gaps", "eps_eff", "eps_r there")
        rows = [
            (
                str(r.order), show(r.frequency, "frequency", 6), f"{r.q:.0f}", f"{r.unloaded_q:.0f}",
                f"{r.height_db:.1f} dB", show(r.pull, "fraction", 2), f"{r.eps_eff:.4f}",
                f"{r.estimate.eps_r:.3f} +- {r.estimate.uncertainty:.3f}",
            )
            for r in m.resonances
        ]  # fmt: skip
        lines += ["", *_table(head, rows)]
    return "\n".join([*lines, "", *(f"- {text}" for text in m.assumptions)]) + "\n"


def _budget(by_method: Sequence[tuple[str, Estimate]], total: Estimate) -> list[str]:
    """Contributions as a table, one column a method."""
    columns = [*by_method, ("together", total)] if len(by_method) > 1 else list(by_method)
    causes = {c.name: c.why for _, each in columns for c in each.contributions}
    rows = [("eps_r", *(f"{each.eps_r:.4f}" for _, each in columns), "")]
    for name, why in causes.items():
        found = [next((c.standard for c in each.contributions if c.name == name), None) for _, each in columns]
        rows.append((name, *("-" if value is None else f"{value:.4f}" for value in found), why))
    rows.append(("together, k = 1", *(f"{each.standard:.4f}" for _, each in columns), "root of the sum of squares"))
    rows.append(("expanded, k = 2", *(f"{each.uncertainty:.4f}" for _, each in columns), "about 95 %"))
    return _table(("standard uncertainty of eps_r", *(name for name, _ in columns), "cause"), rows)


def _table(head: Sequence[str], rows: Iterable[Sequence[str]]) -> list[str]:
    """A Markdown table with columns padded, so that it also reads as text."""
    body = [head, *rows]
    widths = [max(len(row[i]) for row in body) for i in range(len(head))]
    lines = [
        "| " + " | ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)) + " |" for row in body
    ]
    return [lines[0], "|" + "|".join("-" * (width + 2) for width in widths) + "|", *lines[1:]]


def _head(coupon: Coupon) -> str:
    eps_r, tan_d = eps_at(coupon.laminate, coupon.centre)
    width, height = (show(side, "length") for side in coupon.layout.size)
    copper = coupon.line.conductor.thickness
    notes = "\n".join(f"- {note}" for note in coupon.notes)
    return f"""# {coupon.name}: measure the permittivity of the laminate

Board {width} x {height}, dielectric {show(coupon.line.height, "length")} of {coupon.laminate.title}, finished copper
{show(copper, "length", 3)}, fab {coupon.fab.key}. The library says eps_r = {eps_r:.3f} and loss tangent {tan_d:.4f} at
{show(coupon.centre, "frequency", 4)}.

{notes}"""


def _solder(coupon: Coupon) -> str:
    drawn = coupon.dimensions
    return f"""## Parts and soldering

Connectors: {coupon.connector.title}.
J8, J9: ring. J1, J5: long line. J6, J7: short line. J10, J11: impedance trace.
J2: open, J3: short, J4: load. Fit only what you measure; the same kind everywhere, pushed to the stop, soldered in
the same way: what is equal at both lines cancels. Wash the flux off: flux and fingerprints on bare lines count as
dielectric.
R1, R2: 100 ohm, 1 %, 1.6 mm x 0.8 mm chips, for the load.
Measure the thickness with a caliper at a corner free of mask and copper, or subtract: total - 2 x {
        show(coupon.line.conductor.thickness, "length", 3)
    } copper - mask. Not measured, it is one of the largest
causes of uncertainty.
Drawn: line {show(drawn["line_width"], "length")} wide, ring mean radius {show(drawn["ring_radius"], "length")}, gap {
        show(drawn["ring_gap"], "length")
    }, slit {show(drawn["ring_slit"], "length")}."""


def _order(coupon: Coupon) -> str:
    trace = show(coupon.dimensions["trace_width"], "length")
    return f"""## Order of measurement

1. Warm the analyser up for half an hour. Calibrate at the cable ends over the sweep you will use.
2. Ring, J8 to J9, two ports (ring.s2p); with a one-port analyser J8, with J9 left open (ring.s1p). Sweep each resonance
   of the table by itself, 10 % to either side, with as many points as there are, averaged; or all in one sweep if the
   step is below a third of the half-power width.
3. Lines, J6 to J7 and then J1 to J5, one sweep, the same for both (short.s2p, long.s2p), from 0.5 GHz to the end of the
   analyser. An analyser that writes S11 and S21 only will do: the lines are mirror images of themselves.
4. Impedance trace, J10 to J11, {trace} wide, {coupon.trace_impedance:.1f} ohm by formulas: in the time domain, or from
   the largest |S11| at its first quarter wave, J11 terminated: (Z/50 ohm)^2 = (1 + |S11|)/(1 - |S11|), or its inverse
   where Z is below 50 ohm (the phase of S11 tells: 0 above, 180 degrees below).
5. Open J2, short J3, load J4: calibrate with them to put the reference plane where the antenna's line starts. They
   are plain copper and count as ideal only where a millimetre is nothing: fringing of the open, vias of the short."""


def _ring(coupon: Coupon) -> str:
    ring = coupon.ring
    head = ("n", *(f"eps_r x {scale:.2f}" for scale in SCALES), "Q about", "your f", "your eps_eff", "your eps_r")
    rows = []
    for r in coupon.resonances:
        nominal = eps_at(coupon.laminate, r.frequency)[0]
        cells = [_resonance(coupon, r.order, scale * nominal) for scale in SCALES]
        rows.append((str(r.order), *cells, f"{r.q:.0f}", "........", "........", "........"))
    first = coupon.resonances[0]
    bend = ring.wavenumber(1, eps_at(coupon.laminate, first.frequency)[0], first.frequency) * ring.radius
    drawn = show(ring.radius, "length")
    gain = 2.0 * permittivity_slope(coupon.line, eps_at(coupon.laminate, first.frequency)[0], first.frequency)
    return "\n".join(
        [
            "## Ring",
            "",
            "n lambda_g = 2 pi r (Troughton, Electron. Lett. 5 (1969) 501), so with c = 299.792458 mm GHz",
            "",
            f"    eps_eff = (n c / (2 pi r f))^2 x K_n^2,   r = {drawn}, K_1 = {bend:.4f}",
            "",
            "K_n is the curvature (Wolff & Knoppik, Electron. Lett. 7 (1971) 779): an annulus of magnetic walls as",
            "wide as w_eff = 377 ohm h/(Z sqrt(eps_eff)) has K_n of nearly 1 + w_eff^2/(24 r^2); half the slit",
            "adds slit/(4 pi r). Before that the gaps:",
            "with |S21| at the peak and the loaded Q (f over the width at -3 dB), the external Q of a gap is",
            "Qe = 2 Q/|S21|, and the resonance lies by something between 0 and 1/sqrt(pi n Qe) of itself too low: add",
            "half of it to f, the other half is uncertainty. eps_r: find that f between the columns of the table,",
            "which hold everything else.",
            "",
            "Expected resonances in GHz for permittivities about the library's:",
            "",
            *_table(head, rows),
            "",
            f"Sensitivity: 1 % of frequency is {gain:.1f} % of eps_r.",
        ]
    )


def _resonance(coupon: Coupon, order: int, eps_r: float) -> str:
    try:
        return f"{coupon.ring.frequency(order, eps_r) / 1e9:.4f}"
    except RangeError:
        return "-"


def _lines(coupon: Coupon) -> str:
    head = ("frequency", "extra phase", "extra loss", "eps_eff", "Z", "your phase", "your eps_eff")
    rows = [
        (
            show(p.frequency, "frequency", 4), f"{math.degrees(p.phase):.1f} deg", f"{p.loss_db:.2f} dB",
            f"{p.eps_eff:.3f}", f"{p.impedance:.1f} ohm", "........", "........",
        )
        for p in coupon.phases
    ]  # fmt: skip
    difference = show(coupon.length_difference, "length")
    return "\n".join(
        [
            "## Two lines",
            "",
            f"The long line is {difference} longer between the same launches and bends. The eigenvalues of",
            "T_long T_short^-1 are exp(-+(alpha + j beta) dl) whatever the launches are (Marks, IEEE Trans. MTT-39",
            "(1991) 1205; Lee & Nam, Electron. Lett. 32 (1996) 1207). With a pencil, the launches being good: the",
            "phase of S21(long) less that of S21(short), unwrapped from low frequencies up, is -beta dl, and",
            "",
            f"    eps_eff = (phase / 360 deg x c / (f dl))^2,   dl = {difference}",
            "",
            "eps_eff(f) is inverted to eps_r by Hammerstad & Jensen 1980 with Kirschning & Jansen 1982.",
            "",
            *_table(head, rows),
        ]
    )


def _cautions(coupon: Coupon) -> str:
    etch = show(coupon.fab.etch_tolerance, "length", 3)
    return f"""## Cautions

- Keep hands, bench and metal 30 mm away from the top; the ring radiates a little, more at higher n.
- Do not read the peak off a trace with few points: fit it, or average left and right half-power points.
- The fab's etch ({etch} per edge) and thickness tolerance limit the result; send the thickness you measured with it.
- A strong peak (above -20 dB) is pulled noticeably and its uncertainty grows; one near the noise is not found.
- Glass-woven laminates differ by place and direction: measure two coupons before you believe the third digit.
- The coupon must come from the same order as the boards: only then is it their laminate."""


def _command(design: str) -> str:
    return f"""## Let the computer do it

    planar coupon {design} --measured ring.s2p
    planar coupon {design} --measured short.s2p --measured long.s2p
    planar coupon {design} --measured ring.s2p --measured short.s2p --measured long.s2p --thickness "1.52 mm"

It fits every resonance and the whole sweep of the lines, and states eps_r with its uncertainty and each cause of it."""
