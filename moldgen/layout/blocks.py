"""Size of the cavity and core blocks around the part."""

from __future__ import annotations

from dataclasses import dataclass

from moldgen.catalog import Resin, core_pin_blank, preferred_size_up, steel
from moldgen.errors import SpecError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.body import Body
from moldgen.kernel.round_faces import hollow_round_faces
from moldgen.layout.carry_block import KeptBlock, Least, found_again, keep_block, size_text, sized_anew, stands_in
from moldgen.model.layout import BlockLayout
from moldgen.quantity import Quantity
from moldgen.rules.cavity_floor import cavity_floor_thickness_rectangular
from moldgen.rules.cavity_wall import (
    cavity_side_wall,
    cavity_side_wall_practice,
    cavity_side_wall_thickness,
    parting_gap_limit,
)
from moldgen.rules.layout_practice import STEEL_BEHIND_FIT, STEEL_OVER_PART, STEEL_UNDER_PART, WALL_CAP
from moldgen.rules.pins import guided_fit_length
from moldgen.rules.practice import SEALING_LAND
from moldgen.rules.sheet import given
from moldgen.spec.sections import Blocks

SHORTEST_FIT_RATIO = 2.0
"""Length of the fit over diameter that the core block must hold (common practice: 2 to 3)."""

THINNEST_STEEL = 2.0
"""mm: with less steel than this beside the part there is no block."""


@dataclass(frozen=True)
class _Load:
    """What presses on the steel: mean cavity pressure [MPa], allowed movement [mm], modulus of the steel [MPa]."""

    pressure: float
    limit: float
    modulus: float
    depth: float


@dataclass(frozen=True)
class _Span:
    """One dimension of both blocks [mm]: name, extent of the part, least wall by the rules, wall or size as given."""

    name: str
    part: float
    wall: float
    given_wall: float | None
    given_size: float | None


def size_blocks(
    body: Body, resin: Resin, blocks: Blocks, level: float | None = None, kept: KeptBlock | None = None
) -> tuple[BlockLayout, Notes]:
    """Return the closed block around a part that stands in the mold frame (pull along +z).

    Parameters
    ----------
    body : the part in the mold [mm]
    blocks : section `blocks` of the spec; what is given there is kept and checked
    level : height of the parting plane [mm]; without it the lower end of the part is assumed, so that the cavity
        block holds the whole depth
    kept : an accepted block: it stays as it stands where the rules' least walls allow it, and grows only at the sides
        where they do not; what the spec gives comes first. Where the part stands elsewhere the block is sized anew

    Raises
    ------
    SpecError : a size given in the spec does not hold the part

    Source of every number: the quantities in the notes.
    """
    low, high = body.box
    plane = float(low[2]) if level is None else level
    load, notes = _load(body, resin, blocks, plane)
    spans = []
    for axis, name, size in ((0, "length", blocks.length), (1, "width", blocks.width)):
        along = float((high - low)[1 - axis])
        wall, more = _wall(name, along, load)
        notes += more
        spans.append(_Span(name, float((high - low)[axis]), wall, blocks.wall, size))
    sizes = []
    for span in spans:
        size, more = _size(span)
        sizes.append(size)
        notes += more
    up, more = _height("cavity_height", float(high[2]) - plane, _over(), blocks.cavity_height)
    notes += more
    under, lines = _under(body, load)
    down, more = _height("core_height", plane - float(low[2]), under, blocks.core_height)
    notes += more
    notes += Notes(quantities=lines)
    middle = 0.5 * (low + high)
    corner = (float(middle[0]) - sizes[0] / 2, float(middle[1]) - sizes[1] / 2, plane - down)
    layout = BlockLayout(corner, (corner[0] + sizes[0], corner[1] + sizes[1], plane + up))
    if kept is None or found_again(layout, kept):
        return layout, notes + _told(layout)
    if not stands_in(kept, body):
        return layout, notes + sized_anew(layout, kept)
    walls = [s.wall if s.given_wall is None else s.given_wall for s in spans]
    layout, more = keep_block(layout, kept, Least(walls[0], walls[1], _over(), under), body, blocks)
    return layout, notes + more


def _load(body: Body, resin: Resin, blocks: Blocks, plane: float) -> tuple[_Load, Notes]:
    low, high = body.box
    numbers = (blocks.cavity_material or blocks.material, blocks.core_material or blocks.material)
    modulus = min(steel(number).modulus.low for number in numbers)
    limit = parting_gap_limit(resin.vent_depth.high)
    depth = max(float(high[2]) - plane, plane - float(low[2]), 1.0)
    lines = (
        resin.line("cavity_pressure", "wall and floor of the blocks; the upper end is used"),
        parting_gap_limit.line("wall and floor of the blocks", resin.vent_depth.high),
    )
    return _Load(resin.cavity_pressure.high, limit, modulus, depth), Notes(quantities=lines)


def _wall(name: str, along: float, load: _Load) -> tuple[float, Notes]:
    """Return the least wall that ends the block's `name`, beside a side of the part that is `along` long."""
    along = max(along, 1.0)
    drives = f"wall at both ends of the block's {name}"
    needed = cavity_side_wall_thickness.line(drives, load.pressure, load.depth, along, load.limit, load.modulus)
    thumb = cavity_side_wall_practice.line(drives, along)
    land = SEALING_LAND.line(drives)
    capped = min(needed.value, WALL_CAP.default * thumb.value)
    findings: tuple[Finding, ...] = cavity_side_wall_practice.outside(along)
    if capped < needed.value:
        moves = cavity_side_wall(load.pressure, load.depth, along, capped, load.modulus)
        findings += (
            Finding(
                "blocks.needs_support",
                Severity.CAUTION,
                f"a wall of {needed.value:.0f} mm would hold the melt alone; with {capped:.0f} mm it moves "
                f"{moves:.3f} mm at full pressure, so the plate around the block must hold it",
                where=f"blocks.{name}",
                value=round(moves, 4),
                limit=load.limit,
                unit="mm",
                remedy="let the block into a pocket of a plate, or give blocks.wall",
            ),
        )
    return max(capped, thumb.value, land.value), Notes(findings, quantities=(needed, thumb, land))


def _size(span: _Span) -> tuple[float, Notes]:
    wall = span.wall if span.given_wall is None else span.given_wall
    size = preferred_size_up(span.part + 2 * wall, "edge") if span.given_size is None else span.given_size
    left = (size - span.part) / 2
    if left < THINNEST_STEEL:
        raise SpecError(
            f"a {span.name} of {size:g} mm leaves {left:.1f} mm of steel beside the part, "
            f"at least {THINNEST_STEEL:g} mm are needed",
            where=f"blocks.{span.name}",
            remedy=f"give at least {preferred_size_up(span.part + 2 * span.wall, 'edge'):g} mm, or leave it out",
        )
    lines: list[Quantity] = []
    if span.given_size is not None:
        lines.append(given(f"{span.name} of the blocks", size, "mm", "blocks", where=f"blocks.{span.name}"))
    elif span.given_wall is not None:
        lines.append(given("wall of the blocks", wall, "mm", f"{span.name} of the blocks", where="blocks.wall"))
    return size, Notes(_thin(left, span.wall, span.name, "beside the part"), quantities=tuple(lines))


def _height(key: str, reach: float, floor: float, given_height: float | None) -> tuple[float, Notes]:
    """Return the height of one block, which the part enters by `reach` and which keeps `floor` of steel behind it."""
    reach = max(reach, 0.0)
    if given_height is None:
        return preferred_size_up(reach + floor, "thickness"), Notes()
    left = given_height - reach
    if left < THINNEST_STEEL:
        raise SpecError(
            f"{given_height:g} mm leave {left:.1f} mm of steel behind the part, which reaches {reach:.1f} mm into it",
            where=f"blocks.{key}",
            remedy=f"give at least {preferred_size_up(reach + floor, 'thickness'):g} mm, or leave it out",
        )
    line = given(key.replace("_", " "), given_height, "mm", "blocks", where=f"blocks.{key}")
    return given_height, Notes(_thin(left, floor, key, "behind the part"), quantities=(line,))


def _thin(left: float, needed: float, key: str, place: str) -> tuple[Finding, ...]:
    if left >= needed - 1e-9:
        return ()
    return (
        Finding(
            "blocks.thin_steel",
            Severity.WARNING,
            f"{left:.1f} mm of steel {place}, the rules ask for {needed:.1f} mm",
            where=f"blocks.{key}",
            value=round(left, 3),
            limit=round(needed, 3),
            unit="mm",
            remedy=f"leave blocks.{key} and blocks.wall to moldgen, or check the steel by other means",
        ),
    )


def _over() -> float:
    return STEEL_OVER_PART.default


def _under(body: Body, load: _Load) -> tuple[float, tuple[Quantity, ...]]:
    """Return the steel that the core block needs under the part: against bending over the ejector box, and for fits."""
    low, high = body.box
    width, length = (max(float(v), 1.0) for v in (high - low)[:2])
    drives = "height of the core block, hollow behind for the ejectors"
    bend = cavity_floor_thickness_rectangular.line(drives, load.pressure, width, length, load.limit, load.modulus)
    lines = [
        STEEL_OVER_PART.line("height of the cavity block"),
        STEEL_UNDER_PART.line("height of the core block"),
        bend,
    ]
    needed = max(STEEL_UNDER_PART.default, bend.value)
    blanks = [core_pin_blank(2 * max(f.radius_low, f.radius_high)) for f in hollow_round_faces(body)]
    pins = [blank for blank in blanks if blank is not None and blank.diameter <= CORE_PIN_LARGEST_SEAT]
    if pins:
        pin = max(pins, key=lambda blank: blank.diameter)
        fit = guided_fit_length.line("height of the core block", pin.diameter, SHORTEST_FIT_RATIO)
        lines += [fit, STEEL_BEHIND_FIT.line("height of the core block")]
        needed = max(needed, fit.value + STEEL_BEHIND_FIT.default + pin.head_height)
    return needed, tuple(lines)


CORE_PIN_LARGEST_SEAT = 16.0
"""mm: blanks up to this diameter can become core pins (see `moldgen.layout.core_pins`)."""


def _told(layout: BlockLayout) -> Notes:
    why = "part, walls against the melt pressure and steel behind it, rounded up to preferred sizes"
    return Notes(decisions=(Decision("blocks", f"{size_text(layout)} mm closed", why),))
