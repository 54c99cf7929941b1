"""What papers say otherwise of a board, a panel and a coupon: one table, so that no writer asks for the kind itself."""

from __future__ import annotations

from dataclasses import dataclass, replace

from planar.copper.layout import Kind


@dataclass(frozen=True)
class KindWords:
    """`thing` is what the outline bounds, `what` what it is, `origin` what lies at (0, 0), `around` why the layers
    round the board are stated. In the notes: `masked` is where mask goes, `openings` why it does not elsewhere,
    `window` where nothing may be altered, `short` and `no_short` what the DC resistance is. For the CAM operator:
    `purpose` is what the copper is for, `panel` whose business panel, tabs and scores are."""

    thing: str
    what: str
    origin: str
    around: str
    masked: str
    openings: str
    window: str
    short: str
    no_short: str
    purpose: str
    panel: str


_SINGLE = KindWords(
    thing="board",
    what="printed loop antenna, copper for a PCB layout",
    origin="feed",
    around="the antenna is designed for it",
    masked="over the antenna",
    openings="It is part of the design",
    window="Inside the antenna window",
    short="The antenna is a DC short: 0 ohm between feed and ground is intended, not a fault to repair.",
    no_short="Feed and ground are not connected at DC.",
    purpose="A printed loop antenna: its copper is the part.",
    panel="yours to choose outside the edge",
)
KIND_WORDS = {
    Kind.SINGLE: _SINGLE,
    Kind.ARRAY: replace(
        _SINGLE,
        thing="panel",
        what="panel of printed loop antennas, as the fab makes it",
        origin="origin",
        window="Inside the antenna window of every board",
        short="Every antenna is a DC short: 0 ohm between its feed and ground is intended, not a fault to repair.",
        purpose="A panel of printed loop antennas: the copper of every board is the part.",
        panel="as drawn, see the notes; another one only after asking",
    ),
    Kind.COUPON: KindWords(
        thing="coupon",
        what="coupon to measure the laminate on",
        origin="origin",
        around="it is measured with it",
        masked="as its files show",
        openings="Ring and lines to measure are bare of it on purpose",
        window="On the whole coupon",
        short="A DC short where the netlist says so: 0 ohm between signal and return is intended there.",
        no_short="Signal and return are not connected at DC.",
        purpose="A coupon to measure the laminate on: its copper is what is measured.",
        panel="yours to choose outside the edge",
    ),
}
