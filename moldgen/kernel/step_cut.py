"""Cut single products out of a STEP assembly as text: their geometry need not be translated a second time."""

from __future__ import annotations

import re
from collections.abc import Iterable
from typing import Final

from moldgen.errors import KernelError

_DATA: Final = b"DATA;\n"
_END: Final = b"ENDSEC;\nEND-ISO-10303-21;"
_REFERENCE: Final = re.compile(rb"#(\d+)")
_TEXT: Final = re.compile(rb"'[^']*'")
_FILE_NAME: Final = re.compile(rb"FILE_NAME\(\s*'(?:[^']|'')*'")

_PROTOCOL: Final = b"APPLICATION_PROTOCOL_DEFINITION("
_CATEGORY: Final = b"PRODUCT_RELATED_PRODUCT_CATEGORY("
_DEFINITION: Final = b"SHAPE_DEFINITION_REPRESENTATION("
_SOLIDS: Final = b"ADVANCED_BREP_SHAPE_REPRESENTATION("
_STYLE: Final = b"MECHANICAL_DESIGN_GEOMETRIC_PRESENTATION_REPRESENTATION("


class StepAssembly:
    """A STEP assembly as our own writer makes it: one statement a line group, names on one line."""

    def __init__(self, data: bytes) -> None:
        head, _, rest = data.partition(_DATA)
        body, _, tail = rest.rpartition(_END)
        self._head, self._body, self._tail = head + _DATA, body, _END + tail
        self._statements: dict[int, bytes] = {}
        self._referred: dict[int, list[int]] = {}
        self._kinds: dict[bytes, list[int]] = {k: [] for k in (_PROTOCOL, _CATEGORY, _DEFINITION, _SOLIDS, _STYLE)}
        for statement in body.removeprefix(b"#").removesuffix(b";\n").split(b";\n#"):
            number, _, text = statement.partition(b" = ")
            self._statements[int(number)] = text
            kind = text[: text.find(b"(") + 1]
            if kind in self._kinds:
                self._kinds[kind].append(int(number))

    def whole(self, file_name: str) -> bytes:
        """Return the bytes of the assembly; `file_name` for the header, coded as STEP text."""
        return self._named(file_name) + self._body + self._tail

    def product(self, place: int, file_name: str) -> bytes:
        """Return the bytes of a STEP file with one product, its category and its colour.

        Parameters
        ----------
        place : which of the products that have a solid, counted from 0 in the order of the file
        file_name : for the header, coded as STEP text

        Raises
        ------
        KernelError : the assembly is not built as expected
        """
        solids = self._kinds[_SOLIDS]
        definition = [d for d in self._kinds[_DEFINITION] if solids[place] in self._references(d)]
        if len(definition) != 1:
            raise KernelError(f"product {place + 1} of the STEP assembly has {len(definition)} definitions")
        wanted = self._closure([*self._kinds[_PROTOCOL], definition[0]])
        wanted |= self._closure(c for c in self._kinds[_CATEGORY] if wanted.issuperset(self._references(c)))
        for style in self._kinds[_STYLE]:
            styled = self._references(style)[0]
            if self._references(styled)[-1] in wanted:
                wanted |= self._closure([style])
        lines = b"".join(b"#%d = %s;\n" % (n, self._statements[n]) for n in sorted(wanted))
        return self._named(file_name) + lines + self._tail

    def _named(self, file_name: str) -> bytes:
        name = b"FILE_NAME('" + file_name.replace("'", "''").encode("ascii") + b"'"
        return _FILE_NAME.sub(lambda _: name, self._head, count=1)

    def _references(self, number: int) -> list[int]:
        known = self._referred.get(number)
        if known is None:
            text = self._statements[number]
            if b"'" in text:
                text = _TEXT.sub(b"", text)
            known = self._referred[number] = [int(n) for n in _REFERENCE.findall(text)]
        return known

    def _closure(self, roots: Iterable[int]) -> set[int]:
        """Return the roots and everything they refer to, directly or not."""
        found: set[int] = set()
        waiting = list(roots)
        while waiting:
            number = waiting.pop()
            if number not in found:
                found.add(number)
                waiting += self._references(number)
        return found
