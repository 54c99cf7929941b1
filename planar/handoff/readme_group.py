"""What the page of a panel or coupon says where that of one board lists every land: summed up by part.

A panel is not for a PCB layout: it repeats one board, so what holds for each is said once, on the first as an example.
"""

from __future__ import annotations

from collections import Counter

from planar.copper.boolean import contains
from planar.copper.layout import Layout, Pad, Role
from planar.copper.outline import Outline
from planar.handoff.net_tie import NetTie, net_ties
from planar.handoff.page import place, titled, wrapped

_NAMED = 24
"""Parts that are named, and no more: a page has room for them."""


def panel_sections(layout: Layout) -> list[str]:
    """Boards, net ties, keepout of a snapped panel, and what must stay as it is."""
    return [
        titled("BOARDS", *wrapped(*_board_texts(layout))),
        titled("NET TIE", *wrapped(*_panel_tie_texts(layout))),
        titled("KEEPOUT", *wrapped(_KEEPOUT)),
        titled("DO NOT ALTER", *wrapped(f"On every board: {_DO_NOT_ALTER}")),
    ]


def coupon_sections(layout: Layout) -> list[str]:
    """Terminals by part, net ties of a snapped coupon, and what must stay as it is."""
    return [
        titled("TERMINALS (part: lands, nets; centre of the first signal land)", *_part_lines(layout)),
        titled("NET TIE", *wrapped(*_coupon_tie_texts(layout))),
        titled("DO NOT ALTER", *wrapped(f"On the whole coupon: {_DO_NOT_ALTER}")),
    ]


_KEEPOUT = (
    "Each board has its own KEEPOUT outlines, on every level; they bind who builds the board in, not the rails of the "
    "panel. For a PCB layout take the files of the single board, not these."
)
_DO_NOT_ALTER = (
    "no width, gap or bend; no teardrops, thermal reliefs, thieving, solder mask change or text. Dimensions are "
    "finished copper at the foot of the conductor, artwork 1:1 without etch compensation."
)


def tie_text(tie: NetTie) -> str:
    """Where signal and return meet."""
    named = " and ".join(f"the {island.role} on {island.level}" for island in tie.islands)
    if tie.hole is not None:
        return f"They meet in the plated hole at {place(tie.hole.centre)} mm, which joins {named} (net {tie.net})."
    x0, y0, x1, y1 = tie.islands[0].outline.bounds
    corners = f"{place((x0, y0))} to {place((x1, y1))} mm"
    return f"They meet in one island, {named} from {corners}, which is the loop itself (net {tie.net})."


def _board_texts(layout: Layout) -> list[str]:
    parts = {island.part: island.net for island in layout.islands if island.role is Role.RADIATOR}
    lands = {part: [pad for pad in layout.pads if pad.part == part] for part in parts}
    first = next(iter(lands.values()), [])
    named = [f"{part} ({_nets(pads)})" for part, pads in lands.items()]
    more = f" and {len(named) - _NAMED} more" if len(named) > _NAMED else ""
    texts = [
        f"{len(layout.boards)} copies of one board, as explicit copper, not turned against each other. Each board: "
        f"{_lands(first)}; a part and nets of its own.",
        f"Parts (nets): {', '.join(named[:_NAMED])}{more}.",
    ]
    others = sorted({pad.part for pad in layout.pads} - set(parts))
    if others:
        texts.append(f"Beside the boards, on a coupon to measure the laminate on: {', '.join(others)}.")
    return texts


def _nets(pads: list[Pad]) -> str:
    return ", ".join(dict.fromkeys(pad.net for pad in pads))


def _lands(pads: list[Pad]) -> str:
    """How many lands of which kind, in words."""
    counts = Counter(pad.terminal for pad in pads)
    return " and ".join(f"{n} {kind} land{'' if n == 1 else 's'}" for kind, n in counts.items()) or "no land"


def _panel_tie_texts(layout: Layout) -> list[str]:
    ties = net_ties(layout)
    if not ties:
        return ["Signal and return of the boards are not connected at DC: no net tie, do not join them."]
    shares = [[tie for tie in ties if _inside(tie, board)] for board in layout.boards]
    found = next((share for share in shares if share), [])
    texts = ["Signal and return of the boards are not connected at DC: do not join them."]
    if found:
        texts = [
            "Each board: signal and return are one net: 0 ohm between feed and ground is intended. On the first one:",
            *(tie_text(tie) for tie in found),
        ]
    beside = len(ties) - sum(map(len, shares))
    if beside:
        texts.append(f"Beside the boards, on the coupon: {beside} net tie{'' if beside == 1 else 's'}.")
    return [*texts, "Every net tie is outlined on NET_TIE. Do not open, cut or repair anything there."]


def _inside(tie: NetTie, board: Outline) -> bool:
    return contains(board, tie.hole.centre if tie.hole else tie.islands[0].outline.edges[0].start)


def _part_lines(layout: Layout) -> list[str]:
    lines = []
    for part in dict.fromkeys(pad.part for pad in layout.pads):
        pads = [pad for pad in layout.pads if pad.part == part]
        signal = next((pad for pad in pads if pad.terminal == "signal"), pads[0])
        x0, y0, x1, y1 = signal.outline.bounds
        where = f"{place((0.5 * (x0 + x1), 0.5 * (y0 + y1)))} mm on {signal.level}"
        lines += wrapped(f"{part}: {_lands(pads)}, {_nets(pads)}; {where}")
    return lines


def _coupon_tie_texts(layout: Layout) -> list[str]:
    ties = net_ties(layout)
    if not ties:
        return ["Signal and return are not connected at DC: no net tie."]
    nets = ", ".join(sorted({tie.net for tie in ties}))
    places = " and ".join(f"({place(tie.hole.centre)}) mm" for tie in ties if tie.hole)
    holes = f" They meet in plated holes at {places}." if places else ""
    return [f"Signal and return of a short are one net ({nets}): 0 ohm there is intended.{holes} Outlined on NET_TIE."]
