"""The page around the map: folium's figure and map with nothing of theirs that reaches the network.

folium renders what its elements produce a second time as a template, so that a site's name could run
code on the machine that writes the map. Nothing that comes from a file passes through its popups,
tooltips, names or properties; and what this module hands over is wrapped in :class:`Verbatim`, whose
template is constant, so that it is rendered once and never read as a template.
"""

from __future__ import annotations

import base64
import hashlib
import html
import re
from collections.abc import Mapping
from functools import cache
from importlib import metadata, resources
from typing import Any, Final

import folium
from branca.element import Element, Figure
from jinja2 import Template

from geoskew.errors import OutputError

LEAFLET_PACKAGE: Final = "django-js-lib-leaflet"
# The order matters: each file may use what the ones before it define.
SCRIPTS: Final = (
    "base.js",
    "data.js",
    "geodesy.js",
    "sun.js",
    "sheet.js",
    "basemap.js",
    "picture.js",
    "lines.js",
    "marks.js",
    "choice.js",
    "list.js",
    "words.js",
    "tabs.js",
    "drawings.js",
    "notes.js",
    "aim.js",
    "card.js",
    "place.js",
    "layers.js",
    "about.js",
    "address.js",
    "main.js",
)
STYLES: Final = ("look.css", "panel.css", "print.css")


class Verbatim(Element):
    """Text that goes into the page as it is: its template is constant and is rendered once."""

    _template = Template("{{ this.text }}")

    def __init__(self, text: str) -> None:
        super().__init__()
        self.text = text

    @classmethod
    def _generate_id(cls) -> str:
        # branca draws random names; a constant keeps equal content equal.
        return "verbatim"


class PageFigure(Figure):
    """A page with a language, a title that is escaped, and a content policy that forbids the network."""

    _template = Template(
        "<!DOCTYPE html>\n"
        '<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta http-equiv="Content-Security-Policy" content="{{ this.policy }}">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        '<meta name="color-scheme" content="light dark">\n'
        '<meta name="referrer" content="no-referrer">\n'
        '<link rel="icon" href="data:,">\n'
        "<title>{{ this.title|e }}</title>\n"
        "{{ this.header.render(**kwargs) }}\n</head>\n"
        "<body>\n{{ this.html.render(**kwargs) }}\n{{ this.script.render(**kwargs) }}\n</body>\n</html>\n"
    )

    def __init__(self, title: str, policy: str) -> None:
        super().__init__()
        self.title = title
        self.policy = policy
        self.header._children.clear()


class PageMap(folium.Map):
    """folium's map without its links: container, options and Leaflet itself, nothing else."""

    default_js: list[tuple[str, str]] = []  # noqa: RUF012  declared so by folium
    default_css: list[tuple[str, str]] = []  # noqa: RUF012

    def __init__(self, middle: tuple[float, float], zoom: int) -> None:
        super().__init__(location=middle, zoom_start=zoom, tiles=None, zoom_control=False, prefer_canvas=True)

    @classmethod
    def _generate_id(cls) -> str:
        return "field"

    def start(self) -> dict[str, Any]:
        """Options that the page's own script hands to Leaflet."""
        return {"center": list(self.location), "zoom": self.options["zoom"]}

    def render(self, **kwargs: Any) -> str:
        """Put the container into the page, past the second rendering that folium's macros get."""
        figure = self.get_root()
        if isinstance(figure, Figure):
            figure.html.add_child(Verbatim(_asset("page.html").strip()), name="page")
        return ""


def page(
    *,
    title: str,
    middle: tuple[float, float],
    zoom: int,
    meta: Mapping[str, Any],
    blocks: Mapping[str, str],
    tile_origin: str = "",
) -> str:
    """The whole page as text.

    Parameters
    ----------
    title : str
        Title of the page; escaped here.
    middle : tuple of float
        Latitude and longitude to open at, and `zoom` the level.
    meta : mapping
        What goes into the JSON block.
    blocks : mapping of str to str
        Packed blocks by name.
    tile_origin : str
        Scheme and host of an online background, or empty for none.
    """
    from geoskew.outputs.fieldmap.blocks import inert_json

    styles = [_leaflet_css(), "\n".join(f"/* {name} */\n{_asset(name)}" for name in STYLES)]
    scripts = [_leaflet_js(), "\n".join(f"/* {name} */\n{_asset('js/' + name)}" for name in SCRIPTS)]
    figure = PageFigure(title, _policy(scripts, styles, tile_origin))
    field = PageMap(middle, zoom)
    figure.add_child(field)
    for number, style in enumerate(styles):
        figure.header.add_child(Verbatim(f"<style>{style}</style>"), name=f"style{number}")
    data = {**meta, "start": field.start()}
    inert = [f'<script type="application/json" id="data-meta">{inert_json(data)}</script>']
    inert += [
        f'<script type="text/plain" id="data-{html.escape(name)}">{text}</script>'
        for name, text in blocks.items()
    ]
    figure.script.add_child(Verbatim("\n".join(inert)), name="data")
    for number, script in enumerate(scripts):
        figure.script.add_child(Verbatim(f"<script>{script}</script>"), name=f"script{number}")
    return str(figure.render())


def _policy(scripts: list[str], styles: list[str], tile_origin: str) -> str:
    def hashes(texts: list[str]) -> str:
        digests = (base64.b64encode(hashlib.sha256(text.encode()).digest()).decode() for text in texts)
        return " ".join(f"'sha256-{digest}'" for digest in digests)

    images = f"data: blob: {tile_origin}".strip()
    return (
        f"default-src 'none'; script-src {hashes(scripts)}; style-src {hashes(styles)}; "
        f"img-src {images}; base-uri 'none'; form-action 'none'"
    )


@cache
def _asset(name: str) -> str:
    text = (resources.files("geoskew.outputs.fieldmap") / "assets" / name).read_text(encoding="utf-8")
    if re.search(r"</(script|style)", text, re.IGNORECASE):
        raise OutputError(f"asset {name} holds the end of a script or style element")
    return text


@cache
def _leaflet_file(name: str) -> str:
    folder = resources.files("js_lib_leaflet") / "static" / "js_lib_leaflet"
    return (folder / name).read_text(encoding="utf-8")


@cache
def leaflet_notice() -> str:
    """Licence of Leaflet as its package carries it.

    Raises
    ------
    OutputError
        The installed package carries no licence, without which Leaflet must not be passed on.
    """
    for file in metadata.files(LEAFLET_PACKAGE) or ():
        if file.name.upper().startswith("LICEN"):
            return file.read_text(encoding="utf-8").strip()
    raise OutputError(f"the installed package {LEAFLET_PACKAGE} carries no licence; install it again")


def _leaflet_js() -> str:
    code = re.sub(r"//# sourceMappingURL=.*\s*$", "", _leaflet_file("leaflet.js"))
    if "</script" in code.lower():
        raise OutputError("the installed leaflet.js cannot be embedded: it holds the end of a script element")
    return f"/*!\nLeaflet\n\n{leaflet_notice()}\n*/\n{code}\n"


def _leaflet_css() -> str:
    """Leaflet's sheet without its pictures, of which the page uses none."""
    sheet = re.sub(r"[^\n]*url\([^)]*\)[^\n]*\n", "", _leaflet_file("leaflet.css"))
    if "url(" in sheet or "@import" in sheet or "</style" in sheet.lower():
        raise OutputError("the installed leaflet.css cannot be embedded: it still asks for a file")
    return sheet
