"""What changed between two versions of a part and its tool: the words of `moldgen compare`.

Places are in the mold frame of the NEW tool [mm] unless a name says `part`: then they are in the new part's own
coordinates. OLD is the tool whose steel may be cut already.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum

from moldgen.finding import Finding
from moldgen.model.part import Box, Rows, Vector


class Fate(StrEnum):
    """What becomes of a component of the old tool, in the order in which a reader wants to see them."""

    WELD = "weld or new insert"  # steel is missing, whether or not some must also go
    CUT = "cut"  # steel must go, none is missing: steel-safe
    NOT_COMPARED = "not compared"  # the kernel could not: nothing is known of it
    NEW = "new component"
    GONE = "no longer used"
    MOVED = "moved"  # the same component at another place
    UNCHANGED = "unchanged"


class Work(StrEnum):
    """What is done to a piece of steel."""

    CUT = "cut"
    WELD = "weld"


@dataclass(frozen=True)
class Alignment:
    """How the old part was laid onto the new one: new = rotation @ old + translation, in part coordinates [mm].

    how : "as drawn: ...", "moved by ...", "turned by ... about ...": for the reader
    matched, faces : how many of the old part's faces lie on faces of the new one then, of how many
    residual_mm : largest distance between faces that match
    scale : how much larger the whole new part is; 1 unless it is the old one grown or shrunk
    """

    rotation: Rows
    translation: Vector
    how: str
    matched: int
    faces: int
    residual_mm: float
    scale: float = 1.0


class PartChangeKind(StrEnum):
    """What happened to a feature of the part."""

    MOVED = "moved"
    RESIZED = "resized"  # same surface kinds at the same place, other size
    DRAFT = "draft changed"
    ADDED = "added"
    GONE = "gone"
    RESHAPED = "reshaped"


@dataclass(frozen=True)
class PartChange:
    """One feature of the part that changed: faces that belong together and changed in the same way.

    feature : "boss d 8", "hole d 4", "rib 1.2 thick", "flat face", ...: for the reader
    old_faces, new_faces : numbers in the old and new part, in the kernel's order
    at, box : a point on it and its box in the new part's coordinates [mm]; where it is gone, of the old one, aligned
    shift : how far it moved [mm], for MOVED
    was, now : the size or draft that changed, with its unit, for the reader ("d 4 mm", "1.5 deg"); "" otherwise
    """

    kind: PartChangeKind
    feature: str
    old_faces: tuple[int, ...]
    new_faces: tuple[int, ...]
    at: Vector
    box: Box
    shift: Vector | None = None
    was: str = ""
    now: str = ""

    @property
    def told(self) -> str:
        """One sentence for the reader."""
        x, y, z = self.at
        text = f"{self.feature} at {x:.2f}, {y:.2f}, {z:.2f}: {self.kind.value}"
        if self.shift is not None:
            text += " by " + ", ".join(f"{round(v, 3) + 0.0:.3f}" for v in self.shift) + " mm"
        if self.was or self.now:
            text += f" from {self.was or 'nothing'} to {self.now or 'nothing'}"
        return text


@dataclass(frozen=True)
class SteelPiece:
    """One connected piece of steel that must go or is missing.

    component : its name in the new tool; number : counts the pieces of one component and work, largest first
    depth_mm : how far it reaches from the old steel's surface, into the steel (cut) or away from it (weld)
    at, at_part : a point in it, in the mold and in the part's coordinates; box : in the mold
    exact : True when the kernel made the solid; False for one made of facets, with a volume that is near only
    file : its STEP file inside the comparison's folder
    cause : what of the part, or of the layout, it follows from
    """

    component: str
    work: Work
    number: int
    volume_mm3: float
    depth_mm: float
    at: Vector
    at_part: Vector
    box: Box
    exact: bool
    file: str
    cause: str = ""


@dataclass(frozen=True)
class ComponentChange:
    """What becomes of one component. `old` is "" for a new one, `new` is "" for one that is gone.

    shift : how far it stands from its old place [mm], None where there is no old or no new one
    count_old, count_new : how many of it the tool has
    material : of the new component (old where gone); was_material : of the old one
    note : for the reader
    """

    old: str
    new: str
    role: str
    fate: Fate
    pieces: tuple[SteelPiece, ...] = ()
    shift: Vector | None = None
    count_old: int = 0
    count_new: int = 0
    material: str = ""
    was_material: str = ""
    note: str = ""

    @property
    def cut_mm3(self) -> float:
        """Steel that must go."""
        return sum(p.volume_mm3 for p in self.pieces if p.work is Work.CUT)

    @property
    def weld_mm3(self) -> float:
        """Steel that is missing."""
        return sum(p.volume_mm3 for p in self.pieces if p.work is Work.WELD)


@dataclass(frozen=True)
class ItemChange:
    """A pin, a gate or the block that moved, changed its size, came or went.

    kind : "ejector pin", "core pin", "gate", ...; was_at, now_at : in the mold, None where there is none
    was, now : sizes for the reader ("d 3 mm")
    """

    kind: str
    name: str
    was_at: Vector | None
    now_at: Vector | None
    was: str
    now: str
    note: str = ""


@dataclass(frozen=True)
class NumberChange:
    """A number of the manifest that changed beyond noise. `cause`: what it follows from, for the reader."""

    name: str
    unit: str
    was: float | None
    now: float | None
    cause: str = ""


@dataclass(frozen=True)
class Comparison:
    """All that changed between two output folders."""

    old: str
    new: str
    alignment: Alignment
    part: tuple[PartChange, ...]
    components: tuple[ComponentChange, ...]
    items: tuple[ItemChange, ...]
    numbers: tuple[NumberChange, ...]
    findings: tuple[Finding, ...] = field(default=())

    @property
    def steel_safe(self) -> bool:
        """True when nothing must be welded, no component is new and all were compared: cutting is enough."""
        return not any(c.fate in (Fate.WELD, Fate.NEW, Fate.NOT_COMPARED) for c in self.components)
