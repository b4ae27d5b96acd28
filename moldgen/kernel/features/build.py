"""Making a part from its recipe: features in order, each one checked before the next."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any, Final

from OCP.TopoDS import TopoDS_Face, TopoDS_Shape

from moldgen.errors import KernelError, PartError
from moldgen.kernel.features import bodywork, copies, edges, holes, posts, primitives, sweeps
from moldgen.kernel.features.frame import Frame, frame_on
from moldgen.kernel.features.select import Chooser
from moldgen.kernel.features.shapes import LEAST_CHANGE, boundary, combine, combine_sized, moved
from moldgen.kernel.features.tools import Bench, Maker, Step
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.topology import faces_of, solids_of
from moldgen.model.recipe import MAIN_BODY, ResolvedFeature, ResolvedRecipe

_MAKERS: Final[Mapping[str, Maker]] = {
    "block": primitives.block,
    "cylinder": primitives.cylinder,
    "sphere": primitives.sphere,
    "torus": primitives.torus,
    "extrude": sweeps.extrude,
    "revolve": sweeps.revolve,
    "loft": sweeps.loft,
    "hole": holes.hole,
    "window": holes.window,
    "boss": posts.boss,
    "rib": posts.rib,
    "snap_hook": posts.snap_hook,
}


def build_recipe(recipe: ResolvedRecipe) -> TopoDS_Shape:
    """Return the solid that a recipe describes.

    Parameters
    ----------
    recipe : features with every expression worked out (`moldgen.spec.recipe.Recipe.resolve`)

    Returns
    -------
    One valid solid, in part coordinates [mm].

    Raises
    ------
    PartError : a feature cannot be made; the message names it and says what to try
    """
    workshop = _Workshop()
    for feature in recipe.features:
        try:
            workshop.make(feature)
        except (PartError, KernelError) as error:
            raise _named(feature, error) from error
    return workshop.result()


def _named(feature: ResolvedFeature, error: PartError | KernelError) -> PartError:
    return PartError(
        f"feature '{feature.name}' ({feature.kind}): {error.what}",
        where=error.where,
        remedy=error.remedy or "check the sizes and the place of this feature",
        evidence=error.evidence,
    )


class _Workshop:
    """The bodies so far, and what every feature was made from."""

    def __init__(self) -> None:
        self.bodies: dict[str, TopoDS_Shape] = {}
        self.sizes: dict[str, float] = {}  # body -> volume [mm^3]
        self.makers: dict[str, str] = {}  # body -> feature that started it
        self.steps: dict[str, list[Step]] = {}
        self.made: dict[str, Sequence[TopoDS_Face]] = {}
        self._changes: Mapping[str, Callable[[ResolvedFeature], None]] = {
            "shell": self._shell,
            "fillet": self._fillet,
            "chamfer": self._chamfer,
            "draft": self._draft,
            "pattern": self._pattern,
            "mirror": self._mirror,
            "union": self._combine,
            "cut": self._combine,
            "intersect": self._combine,
        }

    def make(self, feature: ResolvedFeature) -> None:
        """Carry one feature out."""
        if feature.kind in self._changes:
            self._changes[feature.kind](feature)
            return
        values = feature.values
        body = self.bodies.get(values["body"])
        bench = Bench(values["body"], body, lambda on: self._frame(on, body))
        self._apply(feature, _MAKERS[feature.kind](values, bench))

    def result(self) -> TopoDS_Shape:
        """Return the finished part.

        Raises
        ------
        PartError : there is none, or a body was never used
        """
        left = sorted(set(self.bodies) - {MAIN_BODY})
        if left:
            raise PartError(
                f"feature '{self.makers[left[0]]}': its body '{left[0]}' is never joined to the part",
                remedy="add a union, cut or intersect feature that uses it",
            )
        if MAIN_BODY not in self.bodies:
            raise PartError("the recipe makes no part", remedy="start with a feature that adds material, e.g. a block")
        return self.bodies[MAIN_BODY]

    # --- steps -------------------------------------------------------------------------------------------------------
    def _apply(self, feature: ResolvedFeature, steps: Sequence[Step]) -> None:
        for mode, group in _grouped(steps):
            self._apply_group(feature, mode, group)
        self.steps[feature.name] = list(steps)
        self.made[feature.name] = boundary(step.solid for step in steps)

    def _apply_group(self, feature: ResolvedFeature, mode: str, group: Sequence[Step]) -> None:
        body = group[0].body
        if mode == "new" or (body not in self.bodies and mode == "add"):
            name = feature.name if mode == "new" else body
            solid = group[0].solid if len(group) == 1 else combine("add", group[0].solid, [s.solid for s in group[1:]])
            self.makers.setdefault(name, feature.name)
            self._replace(name, solid, None)
            return
        before = self._body(body)
        solid, size = combine_sized(mode, before, [s.solid for s in group], self.sizes[body])
        self._replace(body, solid, before, size)

    def _replace(self, name: str, solid: TopoDS_Shape, before: TopoDS_Shape | None, size: float | None = None) -> None:
        """Put a new state of a body in place, after the checks that hold for every feature."""
        pieces = solids_of(solid)
        if len(pieces) != 1:
            raise PartError(f"the body '{name}' falls into {len(pieces)} pieces")
        if not is_valid(pieces[0]):
            raise PartError(f"the body '{name}' would cross itself", remedy="move the feature by 0.01 mm, or resize it")
        size = volume(pieces[0]) if size is None else size
        if size < LEAST_CHANGE:
            raise PartError(f"the body '{name}' would have no volume")
        if before is not None and abs(size - self.sizes[name]) < LEAST_CHANGE:
            raise PartError("nothing changes", remedy="the feature misses the body or lies wholly inside it; move it")
        self.bodies[name] = pieces[0]
        self.sizes[name] = size

    def _body(self, name: str) -> TopoDS_Shape:
        if name not in self.bodies:
            raise PartError(f"there is no body '{name}' yet", remedy="start it with a feature that adds material")
        return self.bodies[name]

    def _chooser(self, body: TopoDS_Shape) -> Chooser:
        return Chooser(body, self.made)

    def _frame(self, on: Mapping[str, Any], body: TopoDS_Shape | None) -> Frame:
        if on["face"] and body is None:
            raise PartError(f"there is no body with a face '{on['face'].text}' yet", remedy="use a plane: xy, xz, yz")
        return frame_on(on, lambda selector: self._chooser(body).planar_face(selector))

    # --- features that change what is there --------------------------------------------------------------------------
    def _change(self, feature: ResolvedFeature, before: TopoDS_Shape, after: TopoDS_Shape) -> None:
        self._replace(feature.values["body"], after, before)
        old = Chooser(after, {"before": faces_of(before)})
        self.made[feature.name] = tuple(f for f in old.all_faces if not old.lies_on(f, "before"))

    def _shell(self, feature: ResolvedFeature) -> None:
        body = self._body(feature.values["body"])
        opened = self._chooser(body).faces(feature.values["open"])
        self._change(feature, body, bodywork.shell(body, feature.values["thickness"], opened))

    def _fillet(self, feature: ResolvedFeature) -> None:
        body = self._body(feature.values["body"])
        chosen = self._chooser(body).edges(feature.values["edges"])
        self._change(feature, body, edges.fillet(body, chosen, feature.values["radius"]))

    def _chamfer(self, feature: ResolvedFeature) -> None:
        body = self._body(feature.values["body"])
        chosen = self._chooser(body).edges(feature.values["edges"])
        self._change(feature, body, edges.chamfer(body, chosen, feature.values["distance"]))

    def _draft(self, feature: ResolvedFeature) -> None:
        values = feature.values
        body = self._body(values["body"])
        walls = self._chooser(body).faces(values["faces"])
        sloped = bodywork.draft(body, walls, values["angle"], values["pull"], values["neutral"])
        self._change(feature, body, sloped)

    def _pattern(self, feature: ResolvedFeature) -> None:
        self._apply(feature, copies.pattern(feature.values, self._originals(feature)))

    def _mirror(self, feature: ResolvedFeature) -> None:
        values = feature.values
        if values["of"]:
            self._apply(feature, copies.mirror(values, self._originals(feature)))
            return
        body = self._body(values["body"])
        twin = moved(body, copies.mirror_transformation(values))
        self._apply(feature, [Step("add", values["body"], twin)])

    def _originals(self, feature: ResolvedFeature) -> list[Step]:
        """Return the steps to repeat; a feature that started its body repeats as an addition."""
        found = [step for name in feature.values["of"] for step in self.steps.get(name, [])]
        for step in found:
            if step.mode == "new":
                raise PartError(
                    "a feature with 'mode: new' cannot be repeated",
                    remedy="repeat features that add or cut, or mirror the body",
                )
        return found

    def _combine(self, feature: ResolvedFeature) -> None:
        values = feature.values
        mode = {"union": "add"}.get(feature.kind, feature.kind)
        steps = [Step(mode, values["body"], self._body(name)) for name in values["tools"]]
        if not values["keep"]:
            for name in values["tools"]:
                self.bodies.pop(name)
        self._apply(feature, steps)


def _grouped(steps: Sequence[Step]) -> list[tuple[str, list[Step]]]:
    """Return runs of steps that one boolean can do at once: same mode, same body."""
    groups: list[tuple[str, list[Step]]] = []
    for step in steps:
        if groups and groups[-1][0] == step.mode != "intersect" and groups[-1][1][0].body == step.body:
            groups[-1][1].append(step)
        else:
            groups.append((step.mode, [step]))
    return groups
