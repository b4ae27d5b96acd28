"""The ejector pins that moldgen can take: straight ones, and shouldered ones where those find no room."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from moldgen.catalog import Pin, ShoulderedPin, ejector_pin_series, ejector_pin_up, shouldered_pin_series
from moldgen.layout.carry_fits import Fit, keep_fit
from moldgen.layout.sites import Disc
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser
from moldgen.rules.layout_practice import RETAINER_PLATE, SHOULDER_GAP
from moldgen.rules.pins import clearance_bore_diameter, euler_buckling_force, guided_fit_length
from moldgen.rules.practice import PIN_END_FACTOR
from moldgen.rules.stepped_column import stepped_buckling_force


@dataclass(frozen=True)
class PinKind:
    """One size of ejector pin, with the room that it wants [mm].

    diameter : of the face that pushes; shank : of the longest part of the pin, the same for a straight pin
    edge : steel between the pin's rim and the edge of the surface that it pushes on
    shank_lengths : from the foot to the shoulder, one for each of the lengths; empty for a straight pin
    """

    diameter: float
    shank: float
    head_diameter: float
    head_height: float
    lengths: tuple[float, ...]
    edge: float
    shank_lengths: tuple[float, ...] = ()

    @property
    def stepped(self) -> bool:
        """True for a shouldered pin."""
        return bool(self.shank_lengths)

    @property
    def room(self) -> float:
        """Least distance of the axis from the edge of the surface [mm]."""
        return self.diameter / 2 + self.edge

    @property
    def bore(self) -> float:
        """Diameter of the bore behind the fit [mm]."""
        return clearance_bore_diameter(self.shank)


@dataclass(frozen=True)
class Place:
    """One ejector pin: axis [mm] and size, what lies over its end face, who chose it; name : of one that is kept.

    fit_end, length : height at which the fit of a kept pin ends, None for a new hole, and its length on the market [mm]
    """

    x: float
    y: float
    kind: PinKind
    disc: Disc
    chooser: Chooser
    name: str = ""
    fit_end: float | None = None
    length: float = 0.0

    @property
    def diameter(self) -> float:
        """Diameter of the face that pushes [mm]."""
        return self.kind.diameter


@dataclass(frozen=True)
class Stack:
    """Heights of one ejector pin while the mold is closed [mm].

    seat : foot of the pin; fit : guided length; shank : from the foot to the shoulder, 0 for a straight pin
    ground : how much of the shank of the pin on the market is ground down to the tip's diameter
    length : of the pin on the market
    """

    seat: float
    fit: float
    shank: float
    ground: float
    length: float
    buckling: float


def straight(pin: Pin, edge: float) -> PinKind:
    """Return a straight pin of the catalog."""
    return PinKind(pin.diameter, pin.diameter, pin.head_diameter, pin.head_height, pin.lengths, edge)


def shouldered(pin: ShoulderedPin, edge: float) -> PinKind:
    """Return a shouldered pin of the catalog."""
    lengths, shanks = pin.lengths, pin.shank_lengths
    return PinKind(pin.diameter, pin.shank, pin.head_diameter, pin.head_height, lengths, edge, shanks)


def of_diameter(diameter: float, edge: float) -> PinKind:
    """Return the pin with this face: straight when there is one, else shouldered.

    A diameter that no series has gets a straight pin with the head of the next thicker one.
    """
    small = [pin for pin in shouldered_pin_series() if math.isclose(pin.diameter, diameter)]
    like = ejector_pin_up(diameter) or ejector_pin_series()[-1]
    if math.isclose(like.diameter, diameter):
        return straight(like, edge)
    if small:
        return shouldered(small[0], edge)
    return PinKind(diameter, diameter, max(like.head_diameter, diameter + 2.0), like.head_height, like.lengths, edge)


def fit_of(kind: PinKind, view: PartView, low: float, end: float | None = None) -> Fit:
    """Return the fit of a pin over which the core's surface is at `low` or higher; end : of the fit of a kept pin."""
    bottom = float(view.low[2])
    usual = min(guided_fit_length(kind.diameter), max(low - bottom, 0.0))
    return keep_fit(kind.diameter, usual, low, bottom, end)


def stack_up(
    kind: PinKind,
    view: PartView,
    stroke: float,
    high: float,
    low: float,
    end: float | None = None,
    bought: float = 0.0,
) -> Stack:
    """Return the heights of a pin whose face lies between `low` and `high` [mm].

    end, bought : height at which the fit of a kept pin ends, and its length on the market, which stay where they can

    A shoulder moves through the stroke in the wider bore and must not reach the end of the fit.
    """
    bottom = float(view.low[2])
    seat = bottom - stroke - RETAINER_PLATE.default
    fit = fit_of(kind, view, low, end).length
    free, needed = max(low - fit - seat, 1.0), high - seat
    if not kind.stepped:
        length = next((one for one in kind.lengths if one >= needed), math.ceil(needed))
        length = bought if bought >= needed else length
        load = euler_buckling_force(kind.diameter, free, end_factor=PIN_END_FACTOR.default)
        return Stack(seat, fit, 0.0, 0.0, length, load)
    most = max(free - stroke - SHOULDER_GAP.default, kind.head_height)
    wanted = bought if bought in kind.lengths and bought >= needed else needed
    number = int(np.searchsorted(kind.lengths, wanted - 1e-9))
    known = number < len(kind.lengths)
    length, stock = (kind.lengths[number], kind.shank_lengths[number]) if known else (math.ceil(needed), most)
    shank = min(stock, most)
    load = stepped_buckling_force(kind.diameter, max(free - shank, 1e-3), kind.shank, shank)
    return Stack(seat, fit, shank, stock - shank, length, load)
