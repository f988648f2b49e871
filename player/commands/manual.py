"""`drawcord manual`: the pages that travel with the packages, on the terminal or as a folder for a browser."""

import html
import sys
from importlib.resources import files
from pathlib import Path

import click

from composer.faults import fault, nearest
from composer.files import replacing

ROOMS = ("composer", "player")

ENDS = {"first-hour": -1, "changelog": 1}
"""Pages that stand before all others, or behind them."""

STYLE = """
body { font: 17px/1.5 system-ui, sans-serif; max-width: 46em; margin: 2em auto; padding: 0 1em }
body { color: #1c1d1f; background: #fbfaf7 }
pre, code { font: 15px/1.4 ui-monospace, monospace; background: #efece4 }
pre { padding: .7em; overflow-x: auto }
table { border-collapse: collapse }
td, th { border: 1px solid #cbc6b8; padding: .3em .6em; text-align: left; vertical-align: top }
img { max-width: 100% }
a { color: #0b5c8a }
@media (prefers-color-scheme: dark) {
  body { color: #e9e7e1; background: #17181a }
  pre, code { background: #26272a }
  td, th { border-color: #45464a }
  a { color: #7cc4ee }
}
"""


def pages() -> dict[str, str]:
    """The text of every page by its name: the first hour, those of composing, those of playing, what is new."""
    found = {}
    for room in ROOMS:
        for page in sorted(files(room).joinpath("manual").iterdir(), key=lambda entry: entry.name):
            if page.name.endswith(".md"):
                found[page.name.removesuffix(".md")] = page.read_text(encoding="utf-8")
    return {name: found[name] for name in sorted(found, key=lambda name: ENDS.get(name, 0))}


def title_of(text: str) -> str:
    """The first heading of a page."""
    return next(line.lstrip("# ").strip() for line in text.splitlines() if line.startswith("#"))


@click.command("manual")
@click.argument("page", required=False, shell_complete=lambda ctx, param, start: [n for n in pages() if n.startswith(start)])
@click.option("--html", "folder", metavar="DIR", help="Write all pages into a folder for a browser.")
def command(page: str | None, folder: str | None) -> int:
    """The manual: without PAGE the list of pages, with PAGE that page."""
    known = pages()
    if folder is not None:
        return _write_html(Path(folder), known)
    if page is None:
        click.echo("The pages of the manual; `drawcord manual PAGE` shows one:\n")
        wide = max(map(len, known))
        for name, text in known.items():
            click.echo(f"  {name:<{wide}}  {title_of(text)}")
        return 0
    if page not in known:
        hint = nearest(page, known) or "the pages are: " + ", ".join(known)
        raise fault("drawcord manual", f"there is no page '{page}'", "", hint)
    _show(known[page])
    return 0


def _show(text: str) -> None:
    """A page through the pager on a terminal, as it is written in a pipe."""
    if not sys.stdout.isatty():
        click.echo(text)
        return
    from rich.console import Console
    from rich.markdown import Markdown

    console = Console()
    with console.pager(styles=console.color_system is not None):
        console.print(Markdown(text), width=min(console.width, 100))


def _write_html(folder: Path, known: dict[str, str]) -> int:
    """All pages, their pictures and a list of them, each file complete or not there."""
    from markdown_it import MarkdownIt

    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise fault(str(folder), f"cannot make the folder: {error.strerror}", "a place that can be written") from None
    reader = MarkdownIt("commonmark").enable("table")
    listing = "".join(f'<li><a href="{name}.html">{html.escape(title_of(text))}</a></li>\n' for name, text in known.items())
    bodies = {name: reader.render(_linked(text)) for name, text in known.items()}
    for name, body in {"index": f"<h1>Drawcord</h1>\n<ul>\n{listing}</ul>", **bodies}.items():
        title = "Drawcord" if name == "index" else title_of(known[name])
        with replacing(str(folder / f"{name}.html")) as page:
            page.write(
                f'<!doctype html>\n<html lang="en"><meta charset="utf-8"><title>{html.escape(title)}</title>\n'
                f'<meta name="viewport" content="width=device-width">\n<style>{STYLE}</style>\n'
                f'<p><a href="index.html">All pages</a></p>\n{body}</html>\n'
            )
    for room in ROOMS:
        for picture in files(room).joinpath("manual").iterdir():
            if picture.name.endswith(".png"):
                with replacing(str(folder / picture.name), "wb") as copy:
                    copy.write(picture.read_bytes())
    click.echo(f"written: {len(known)} pages, begin with {folder / 'index.html'}")
    return 0


def _linked(text: str) -> str:
    """Links from page to page made to work in one folder: `../../player/manual/wire.md` is `wire.html` there."""
    out = []
    for part in text.split("]("):
        target, closed, after = part.partition(")")
        path, hash_mark, anchor = target.partition("#")
        if out and closed and path.endswith(".md") and "://" not in path:
            target = path.rsplit("/", 1)[-1].removesuffix(".md") + ".html" + hash_mark + anchor
        out.append(target + closed + after)
    return "](".join(out)
