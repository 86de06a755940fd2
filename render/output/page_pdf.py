"""The page on paper: the same HTML and print style, set to A4 by WeasyPrint; no browser and no script."""

from __future__ import annotations

import logging
from collections.abc import Iterator
from contextlib import contextmanager
from importlib.util import find_spec
from pathlib import Path
from urllib.parse import unquote, urlparse

from render.errors import LatepullError, MachineError
from render.files import whole_file

FONTS = (("DejaVuSans.ttf", "normal"), ("DejaVuSans-Bold.ttf", "bold"))


def require_paper() -> None:
    """Raise MachineError, with what to install, where a page can't be set on paper."""
    try:
        import weasyprint  # noqa: F401
    except (ImportError, OSError) as exc:
        raise MachineError("the PDF needs Pango (on a Debian or Ubuntu server: apt-get install libpango-1.0-0 "
                           "libpangoft2-1.0-0 libharfbuzz-subset0); or print the page from a browser") from exc


def write_pdf(page: str | Path, path: str | Path, *, force: bool = False) -> Path:
    """Set a written page (its index.html or single file) as PDF; returns the path.

    Only files beside the page are read. Raises LatepullError (a file of the page is missing), OutputExists,
    MachineError (WeasyPrint's system libraries are missing, full disk).
    """
    page = Path(page)
    require_paper()
    from weasyprint import CSS, HTML
    from weasyprint.text.fonts import FontConfiguration
    from weasyprint.urls import URLFetcher

    missing: list[str] = []
    root = page.resolve().parent

    class Beside(URLFetcher):
        """Files under the page's folder and data inside the page; nothing else, and no network."""

        def fetch(self, url: str, headers: dict[str, str] | None = None) -> object:
            if not url.startswith("data:"):
                parts = urlparse(url)
                file = Path(unquote(parts.path)).resolve()
                if parts.scheme != "file" or not (file in fonts or file.is_relative_to(root)) or not file.is_file():
                    missing.append(url)
                    raise ValueError(f"not a file of this page: {url}")
            return super().fetch(url, headers)

    fonts = [font_path(name) for name, _ in FONTS]
    fetcher = Beside()
    faces = "".join(f'@font-face {{ font-family: "DejaVu Sans"; font-weight: {weight}; src: url("{font.as_uri()}") }}'
                    for font, (_, weight) in zip(fonts, FONTS, strict=True))
    configuration = FontConfiguration()
    sheet = CSS(string=faces, font_config=configuration, url_fetcher=fetcher)
    with whole_file(path, force=force) as part, _quiet():
        HTML(filename=str(page), url_fetcher=fetcher).write_pdf(str(part), stylesheets=[sheet],
                                                                 font_config=configuration)
        if missing:
            names = ", ".join(sorted({unquote(urlparse(url).path).rsplit("/", 1)[-1] for url in missing}))
            raise LatepullError(f"{page.parent} is not whole: {names} missing; make the page again with --force")
    return Path(path)


@contextmanager
def _quiet() -> Iterator[None]:
    """WeasyPrint tells on stderr of every property meant for browsers only; for the while, errors alone."""
    logger = logging.getLogger("weasyprint")
    before = logger.level
    logger.setLevel(logging.CRITICAL)
    try:
        yield
    finally:
        logger.setLevel(before)


def font_path(name: str) -> Path:
    """A font that matplotlib ships, so that a bare server has one; raises MachineError if it isn't there."""
    spec = find_spec("matplotlib")
    path = Path(spec.origin or "").parent / "mpl-data" / "fonts" / "ttf" / name if spec else Path(name)
    if not path.is_file():
        raise MachineError(f"the font {name} of matplotlib is missing; install matplotlib again")
    return path.resolve()
