"""HTML for one offline page: escaped text, tables, pictures inside the file, a style for screen and paper."""

from __future__ import annotations

import base64
import html
import re
from collections.abc import Iterable, Sequence
from pathlib import Path, PurePosixPath
from urllib.parse import quote

from moldgen.output import palette
from moldgen.output.palette import Rgb

_UNSEEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069\ud800-\udfff]")
"""What has no place in text: controls, and marks that turn the direction of what follows."""


class Markup(str):
    """Text that is HTML already; everything else is escaped."""

    __slots__ = ()


def text(value: object) -> Markup:
    """Return `value` as HTML text: escaped, unless it is `Markup`; controls are shown as a mark."""
    if isinstance(value, Markup):
        return value
    return Markup(html.escape(_UNSEEN.sub("\ufffd", str(value)), quote=True))


def element(tag: str, *inside: object, **attributes: object) -> Markup:
    """Return an element; `inside` is escaped unless it is `Markup`. Write ``class_`` for the attribute class."""
    named = "".join(f' {name.rstrip("_")}="{text(value)}"' for name, value in attributes.items() if value != "")
    return Markup(f"<{tag}{named}>{''.join(text(i) for i in inside)}</{tag}>")


def lines(parts: Iterable[Markup]) -> Markup:
    """Return blocks under each other, the empty ones left out."""
    return Markup("\n".join(p for p in parts if p))


def table(columns: Sequence[str], rows: Sequence[Sequence[object]], numeric: Sequence[int] = ()) -> Markup:
    """Return a table that scrolls by itself where it is wider than the page; `numeric` columns stand to the right."""
    kind = ["number" if k in numeric else "" for k in range(len(columns))]
    head = element("tr", *(element("th", c, scope="col", class_=kind[k]) for k, c in enumerate(columns)))
    body = (element("tr", *(element("td", c, class_=kind[k]) for k, c in enumerate(row))) for row in rows)
    inside = Markup(f"<thead>{head}</thead>\n<tbody>\n{lines(body)}\n</tbody>")
    return element("div", element("table", inside), class_="wide", tabindex="0")


def picture(path: Path, words: str) -> Markup:
    """Return a PNG file as a figure that the page holds itself."""
    data = base64.b64encode(path.read_bytes()).decode("ascii")
    return element("figure", Markup(f'<img src="data:image/png;base64,{data}" alt="{text(words)}">'))


def file_link(folder: Path, name: str) -> Markup:
    """Return a link to a file inside `folder`; plain text for a path that leads out of it or to nothing."""
    path = PurePosixPath(name)
    inside = bool(name) and not path.is_absolute() and ".." not in path.parts
    if not inside or not (folder / path).is_file():
        return text(name)
    return element("a", name, href=f"./{quote(path.as_posix())}")  # "./": a colon in the name makes no scheme


def page(title: str, body: Markup) -> str:
    """Return the whole document. It may load nothing, not even by mistake: its own policy forbids it."""
    policy = "default-src 'none'; img-src data:; style-src 'unsafe-inline'"
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        f'<meta http-equiv="Content-Security-Policy" content="{policy}">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        '<meta name="color-scheme" content="light dark">\n'
        f"<title>{text(title)}</title>\n<style>\n{STYLE}</style>\n</head>\n<body>\n{body}\n</body>\n</html>\n"
    )


def _css(colour: Rgb) -> str:
    return "#{:02x}{:02x}{:02x}".format(*colour)


def _shades(*colours: tuple[str, Rgb]) -> str:
    return " ".join(f"--{name}: {_css(colour)};" for name, colour in colours)


_LIGHT = _shades(
    ("paper", palette.PAPER),
    ("text", palette.TEXT),
    ("quiet", palette.darken(palette.QUIET_TEXT, 0.1)),
    ("rule", palette.RULE),
    ("band", palette.tint(palette.RULE, 0.7)),
    ("link", palette.PULL.colour),
)
_DARK = _shades(
    ("paper", palette.darken(palette.TEXT, 0.45)),
    ("text", palette.tint(palette.RULE, 0.4)),
    ("quiet", palette.darken(palette.RULE, 0.15)),
    ("rule", palette.tint(palette.TEXT, 0.25)),
    ("band", palette.darken(palette.TEXT, 0.1)),
    ("link", palette.ROLES["cavity"].colour),
)

STYLE = f"""\
:root {{ {_LIGHT}
  --cut: {_css(palette.CUT.colour)}; --weld: {_css(palette.WELD.colour)}; --steel: {_css(palette.STEEL.colour)}; }}
@media (prefers-color-scheme: dark) {{ :root {{ {_DARK} }} }}
* {{ box-sizing: border-box; }}
body {{ max-width: 72rem; margin: 0 auto; padding: 1.5rem 1.25rem 4rem; background: var(--paper); color: var(--text);
  font: 16px/1.45 system-ui, sans-serif; overflow-wrap: break-word; }}
h1 {{ font-size: 1.5rem; margin: 0 0 .5rem; }}
h2 {{ font-size: 1.25rem; margin: 2.25rem 0 .5rem; padding-top: .75rem; border-top: 1px solid var(--rule); }}
h3 {{ font-size: 1.1rem; margin: 2rem 0 .25rem; }}
p {{ margin: .4rem 0; }}
ul {{ margin: .4rem 0; padding-left: 1.3rem; }}
a {{ color: var(--link); }}
.verdict {{ font-size: 1.3rem; font-weight: 600; margin: .5rem 0; }}
.quiet {{ color: var(--quiet); }}
.cautions {{ margin: 1rem 0; padding: .5rem 1rem; border: 1px solid var(--rule); border-left-width: .4rem;
  background: var(--band); font-size: .93rem; }}
.tag {{ display: inline-block; white-space: nowrap; }}
.tag::before {{ content: ""; display: inline-block; width: .85em; height: .85em; margin-right: .4em;
  border: 1px solid var(--text); vertical-align: -.08em; }}
.tag.cut::before {{ background: var(--cut); }}
.tag.weld::before {{ background: var(--weld); border-radius: 50%; }}
.tag.steel::before {{ background: var(--steel); }}
.tag.none::before {{ background: none; border-style: dashed; }}
.wide {{ overflow-x: auto; margin: .5rem 0 1rem; }}
table {{ border-collapse: collapse; font-size: .9rem; min-width: 60%; }}
th, td {{ text-align: left; vertical-align: top; padding: .3rem .8rem .3rem 0; border-bottom: 1px solid var(--rule); }}
th {{ font-weight: 600; color: var(--quiet); }}
td {{ font-variant-numeric: tabular-nums; }}
.number {{ text-align: right; white-space: nowrap; }}
.place {{ white-space: nowrap; }}
figure {{ margin: .75rem 0; }}
img {{ display: block; width: 100%; height: auto; border: 1px solid var(--rule); }}
@page {{ size: A4; margin: 14mm 12mm; }}
@media print {{
  :root {{ {_LIGHT} --paper: #ffffff; }}
  body {{ max-width: none; padding: 0; font-size: 10pt; }}
  h2, h3, h3 + p {{ break-after: avoid; }}
  figure, tr, .cautions {{ break-inside: avoid; }}
  thead {{ display: table-header-group; }}
  img {{ max-height: 118mm; width: auto; max-width: 100%; }}
  .wide {{ overflow: visible; }}
  table {{ font-size: 7.5pt; width: 100%; }}
  th, td {{ padding-right: .5rem; }}
  .tag::before {{ -webkit-print-color-adjust: exact; print-color-adjust: exact; }}
}}
"""
"""Light and dark as the reader's system has it; on paper always light. A square is cut, a disc is weld."""
