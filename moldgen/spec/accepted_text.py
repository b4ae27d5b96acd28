"""An accepted layout as the text of its file: one item a line or a small block, always in the same order."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from typing import Any, Final

from moldgen.canon import to_json
from moldgen.model.accepted import FORMAT, PLACE_DIGITS, Accepted, AcceptedCore, AcceptedPin, AcceptedSide
from moldgen.model.face_sign import AXIS_DIGITS, FaceSign
from moldgen.model.layout import GateKind

HEAD: Final = """\
# The accepted layout of {name}, written by `moldgen accept`. Lengths in mm, in part coordinates.
# The next build keeps what is here wherever the changed part allows it, and says what it moved or dropped and why.
# You may edit it, delete items or the whole file; `moldgen build --fresh` ignores it. What the spec gives comes first.
# `feature` is how the face that an item belongs to is found again: the item follows it. Without one it stays.
# `fit_end` is the height along the pull at which a pin's fit ends and its bore widens.
# `given_pins` and `given_core_pins` stand where the spec places them; here is only how their holes are cut.
"""


PRESSURE_DIGITS: Final = 3

FEED: Final = ("runner_diameter", "runner_length", "sprue_foot")
"""What is written of the feed of an edge gate."""


def accepted_text(accepted: Accepted) -> str:
    """Return the text of the file of an accepted layout; `moldgen.spec.accepted` reads it back."""
    return HEAD.format(name=accepted.name) + "\n".join(_lines(accepted)) + "\n"


def _lines(accepted: Accepted) -> Iterator[str]:
    yield f"accepted: {FORMAT}"
    yield f"name: {_text(accepted.name)}"
    yield f"part_sha256: {_text(accepted.part_sha256)}"
    yield f"pull: {_direction(accepted.pull)}"
    yield f"fixed_point: {_point(accepted.fixed_point)}"
    yield "parting:"
    yield f"  height: {_number(accepted.parting_height)}"
    blocks = accepted.blocks
    yield "blocks:  # at: the middle in plan, in the parting plane; sizes of the steel"
    yield from _fields(2, {"at": _point(blocks.at), **_numbers(blocks, "length width cavity_height core_height")})
    yield from _list("side_actions", 0, (_side(s) for s in accepted.side_actions))
    yield from _list("core_pins", 0, (_core(c) for c in accepted.core_pins))
    if accepted.given_cores:
        yield from _list("given_core_pins", 0, (_core(c) for c in accepted.given_cores))
    yield from _list("cores_in_block", 0, (_core(c) for c in accepted.cores_in_block))
    yield "ejection:"
    yield f"  stroke: {_number(accepted.stroke)}"
    if accepted.pressure > 0.0:
        yield f"  pressure: {_number(accepted.pressure, PRESSURE_DIGITS)}  # MPa, the highest of a pin on the part"
    yield from _list("pins", 2, (_pin(p) for p in accepted.ejector_pins))
    if accepted.given_pins:
        yield from _list("given_pins", 2, (_pin(p) for p in accepted.given_pins))
    gate = accepted.gate
    sizes = "width depth land" if gate.kind is GateKind.EDGE else "diameter land"
    sizes += "".join(f" {key}" for key in FEED if getattr(gate, key) > 0.0)
    yield "gate:"
    place = {"kind": gate.kind.value, "at": _point(gate.at)}
    place |= {} if gate.inward is None else {"inward": _direction(gate.inward)}
    yield from _fields(2, {**place, **_numbers(gate, sizes), **_feature(gate.feature)})


def _side(side: AcceptedSide) -> dict[str, str]:
    return {"name": _text(side.name), "kind": side.kind.value, "direction": _direction(side.direction)}


def _pin(pin: AcceptedPin) -> dict[str, str]:
    size = {**_numbers(pin, "diameter length"), **_fit_end(pin.fit_end)}
    return {"name": _text(pin.name), "at": _point(pin.at), **size, **_feature(pin.feature)}


def _core(core: AcceptedCore) -> dict[str, str]:
    size = {"diameter": _number(core.diameter)} if core.diameter > 0.0 else {}
    return {"name": _text(core.name), "at": _point(core.at), **size, **_fit_end(core.fit_end), **_feature(core.feature)}


def _fit_end(height: float | None) -> dict[str, str]:
    return {} if height is None else {"fit_end": _number(height)}


def _list(key: str, indent: int, items: Iterable[Mapping[str, str]]) -> Iterator[str]:
    found = list(items)
    pad = " " * indent
    yield f"{pad}{key}:" + ("" if found else " []")
    for item in found:
        lines = list(_fields(indent + 4, item))
        yield f"{pad}  - {lines[0].lstrip()}"
        yield from lines[1:]


def _fields(indent: int, values: Mapping[str, str]) -> Iterator[str]:
    yield from (f"{' ' * indent}{key}: {value}" for key, value in values.items())


def _feature(sign: FaceSign | None) -> dict[str, str]:
    if sign is None:
        return {}
    parts = (f"{key}: {_flow(value)}" for key, value in sign.to_plain().items())
    return {"feature": "{" + ", ".join(parts) + "}"}


def _flow(value: Any) -> str:
    """Return plain data in one line; numbers have been rounded where they were read."""
    if isinstance(value, list):
        return "[" + ", ".join(_flow(v) for v in value) + "]"
    if isinstance(value, float):
        return _number(value, AXIS_DIGITS)
    return str(value) if isinstance(value, int) else _text(value)


def _numbers(item: Any, names: str) -> dict[str, str]:
    return {name: _number(getattr(item, name)) for name in names.split()}


def _point(values: Iterable[float]) -> str:
    return "[" + ", ".join(_number(v) for v in values) + "]"


def _direction(values: Iterable[float]) -> str:
    return "[" + ", ".join(_number(v, AXIS_DIGITS) for v in values) + "]"


def _number(value: float, digits: int = PLACE_DIGITS) -> str:
    """Return a number without an exponent, without trailing zeros and without a minus zero."""
    text = f"{round(value, digits) + 0.0:.{digits}f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def _text(value: str) -> str:
    return to_json(str(value), indent=None).strip()
