"""What changed between two manifests of one tool, in a line: for a watcher at the terminal, from plain data alone.

`moldgen compare` says what must be done to the steel; this only says what a rebuild has touched.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Final

SAME_PLACE: Final = 1e-4
"""mm: what moved by less has kept its place (the manifest has twelve digits, places come from calculations)."""

SAME_SIZE: Final = 1e-4
"""mm: the same for sizes that the layout chose."""

NOISE: Final = 0.005
"""Share by which a calculated number must change to be told (our choice)."""

MOST_NAMED: Final = 4
"""So many phrases of one kind stand in the line, the rest are counted."""

_SIZES: Final = {
    "core_pins": ("diameter", "top_z", "base_z", "fit_length"),
    "ejector_pins": ("diameter", "length", "tip_z"),
}
_GATE_SIZES: Final = ("width", "depth", "land", "diameter", "runner_diameter", "runner_length", "sprue_foot_diameter")
_SUMS: Final = (("stroke_mm", "ejection stroke", "mm"), ("ejection_force_n", "ejection force", "N"))


@dataclass(frozen=True)
class ManifestChanges:
    """What changed, as phrases, each kind in an order of its own.

    choices : resin, pull, shrink, block, steels, stroke, force
    items : pins and gate that moved, came, went or changed their size
    recut, new, gone : names of components whose STEP file is another, that came, that went
    unchanged : how many components have the very same file
    proofs : those whose verdict is another
    findings_new, findings_gone : codes of findings, as often as they came and went
    """

    choices: tuple[str, ...] = ()
    items: tuple[str, ...] = ()
    recut: tuple[str, ...] = ()
    new: tuple[str, ...] = ()
    gone: tuple[str, ...] = ()
    unchanged: int = 0
    proofs: tuple[str, ...] = ()
    findings_new: tuple[str, ...] = ()
    findings_gone: tuple[str, ...] = ()

    def line(self) -> str:
        """Return everything in one line."""
        said = [*_some(self.choices), *_some(self.items)]
        for names, what in ((self.recut, "recut"), (self.new, "new"), (self.gone, "gone")):
            said += [f"{', '.join(_some(names))} {what}"] if names else []
        said += self.proofs
        for codes, what in ((self.findings_new, "new"), (self.findings_gone, "gone")):
            said += [f"{len(codes)} finding{'s' if len(codes) > 1 else ''} {what} ({codes[0]})"] if codes else []
        if not said:
            return "nothing changed"
        others = "others " if self.recut or self.new or self.gone else "components "
        return "; ".join([*said, f"{self.unchanged} {others}unchanged"] if self.unchanged else said)


def manifest_changes(old: Mapping[str, Any], new: Mapping[str, Any]) -> ManifestChanges:
    """Return what changed from one `manifest.json` to another; what either lacks counts as absent."""
    before, after = _files(old), _files(new)
    both = [name for name in after if name in before]
    was, now = (_codes(manifest) for manifest in (old, new))
    return ManifestChanges(
        choices=tuple(_choices(old, new)),
        items=tuple(_items(_map(old.get("layout")), _map(new.get("layout")))),
        recut=tuple(n for n in both if before[n] != after[n]),
        new=tuple(n for n in after if n not in before),
        gone=tuple(n for n in before if n not in after),
        unchanged=sum(before[n] == after[n] for n in both),
        proofs=tuple(_proofs(old, new)),
        findings_new=_beyond(now, was),
        findings_gone=_beyond(was, now),
    )


def _files(manifest: Mapping[str, Any]) -> dict[str, str]:
    """Return what each component of a manifest is made of: the content of its file and the places where it stands."""
    content = _map(manifest.get("files"))
    found = {}
    for component in _rows(manifest.get("components")):
        file = str(component.get("file", ""))
        name = str(component.get("name", file))
        found[name] = f"{content.get(file, '')} {len(_rows_or_points(component.get('positions')))}"
    return found


def _choices(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[str]:
    if old.get("resin") != new.get("resin"):
        yield f"resin {old.get('resin')} -> {new.get('resin')}"
    was, now = (_map(manifest.get("pull")).get("direction") for manifest in (old, new))
    if was != now:
        yield f"pull {_point(was)} -> {_point(now)}"
    low, high = (_map(m.get("shrink")).get("x") for m in (old, new))
    if _differ(low, high, 1e-9):
        yield f"shrink factor {low:.5g} -> {high:.5g}"
    one, two = (_block(manifest) for manifest in (old, new))
    if one != two:
        yield f"block {one} -> {two} mm"
    yield from _materials(old, new)
    before, after = (_map(manifest.get("layout")) for manifest in (old, new))
    for key, name, unit in _SUMS:
        was, now = before.get(key), after.get(key)
        if _differ(was, now, NOISE * abs(was) if isinstance(was, int | float) else 0.0):
            yield f"{name} {was:.4g} -> {now:.4g} {unit}"


def _materials(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[str]:
    """Yield components that are of another steel; that of the part is its resin, which is told already."""
    was, now = ({c.get("name"): c.get("material") for c in _rows(m.get("components"))} for m in (old, new))
    for name, material in now.items():
        if name in was and was[name] != material and material != new.get("resin"):
            yield f"{name} of {was[name]} -> {material}"


def _block(manifest: Mapping[str, Any]) -> str:
    corners = _map(manifest.get("parting")).get("block_mm")
    if not (isinstance(corners, list) and len(corners) == 2):
        return ""
    return " x ".join(f"{high - low:.1f}" for low, high in zip(*corners, strict=False))


def _items(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[str]:
    for key, sizes in _SIZES.items():
        yield from _pins(_rows(old.get(key)), _rows(new.get(key)), sizes)
    was, now = _map(old.get("gate")), _map(new.get("gate"))
    if not (was and now):
        return
    if was.get("kind") != now.get("kind"):
        yield f"gate: {was.get('kind')} -> {now.get('kind')}"
        return
    way = _way(was.get("at"), now.get("at"))
    if way:
        yield f"gate moved by {way}"
    for size in _GATE_SIZES:
        if _differ(was.get(size), now.get(size), SAME_SIZE):
            yield f"gate {size.replace('_', ' ')} {was[size]:.4g} -> {now[size]:.4g} mm"


def _pins(old: list[Mapping[str, Any]], new: list[Mapping[str, Any]], sizes: Sequence[str]) -> Iterator[str]:
    """Yield what became of pins. They are matched by place, then by name: their numbers shift when one goes."""
    left, rest = list(old), list(new)
    pairs = _taken(left, rest, lambda a, b: not _way(_axis(a), _axis(b)))
    pairs += _taken(left, rest, lambda a, b: a.get("name") == b.get("name"))
    for was, now in sorted(pairs, key=lambda pair: new.index(pair[1])):
        way = _way(_axis(was), _axis(now))
        if way:
            yield f"{now.get('name')} moved by {way}"
        for size in sizes:
            if _differ(was.get(size), now.get(size), SAME_SIZE):
                yield f"{now.get('name')} {size.replace('_', ' ')} {was[size]:.4g} -> {now[size]:.4g} mm"
    for pin in rest:
        yield f"{pin.get('name')} new at {_point(_axis(pin))}"
    for pin in left:
        yield f"{pin.get('name')} gone from {_point(_axis(pin))}"


def _taken(
    old: list[Mapping[str, Any]],
    new: list[Mapping[str, Any]],
    alike: Callable[[Mapping[str, Any], Mapping[str, Any]], bool],
) -> list[tuple[Mapping[str, Any], Mapping[str, Any]]]:
    """Take pairs that are alike out of both lists."""
    pairs = []
    for one in list(old):
        other = next((n for n in new if alike(one, n)), None)
        if other is not None:
            old.remove(one)
            new.remove(other)
            pairs.append((one, other))
    return pairs


def _proofs(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[str]:
    before = {p.get("name"): p.get("verdict") for p in _rows(old.get("proofs"))}
    for proof in _rows(new.get("proofs")):
        name, verdict = proof.get("name"), proof.get("verdict")
        if name in before and before[name] != verdict:
            yield f"proof '{name}': {before[name]} -> {verdict}"


def _codes(manifest: Mapping[str, Any]) -> list[str]:
    return [f"{f.get('severity')} {f.get('code')}" for f in _rows(manifest.get("findings"))]


def _beyond(these: list[str], those: list[str]) -> tuple[str, ...]:
    """Return what is in the first list more often than in the second."""
    left = list(those)
    found = []
    for code in these:
        if code in left:
            left.remove(code)
        else:
            found.append(code)
    return tuple(found)


def _way(old: Any, new: Any) -> str:
    """Return how far a point moved, "" if it did not."""
    if not (isinstance(old, list) and isinstance(new, list) and len(old) == len(new)):
        return ""
    way = [b - a for a, b in zip(old, new, strict=True)]
    return f"{_point(way)} mm" if max(map(abs, way), default=0.0) > SAME_PLACE else ""


def _axis(pin: Mapping[str, Any]) -> list[Any]:
    return [pin.get("x", 0.0), pin.get("y", 0.0)]


def _point(value: Any) -> str:
    return ", ".join(f"{round(v, 2) + 0.0:.2f}" for v in value) if isinstance(value, list) else "?"


def _differ(old: Any, new: Any, by: float) -> bool:
    return isinstance(old, int | float) and isinstance(new, int | float) and abs(new - old) > by


def _some(texts: Sequence[str]) -> list[str]:
    more = len(texts) - MOST_NAMED
    return [*texts] if more <= 0 else [*texts[:MOST_NAMED], f"{more} more"]


def _map(value: Any) -> Mapping[str, Any]:
    return value if isinstance(value, dict) else {}


def _rows(value: Any) -> list[Mapping[str, Any]]:
    return [row for row in value if isinstance(row, dict)] if isinstance(value, list) else []


def _rows_or_points(value: Any) -> list[Any]:
    return value if isinstance(value, list) else []
