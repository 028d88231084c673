"""The page of a review folder: one static HTML file that shows its loops, tables and cautions.

No script, nothing fetched from elsewhere, links relative to the page: the folder can be moved, zipped, projected or
opened on a phone. Light or dark follows the reader's setting; who asked for reduced motion sees stills.
"""

from __future__ import annotations

import os
import unicodedata
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from html import escape
from pathlib import Path, PurePosixPath
from urllib.parse import quote

from viewer.errors import ExportError
from viewer.export.tables import Rows, text_table
from viewer.jobs import write_text
from viewer.scene.tokens import THEMES, Tokens

EXAGGERATED = (
    "Drawn motion is exaggerated. A mode shape has no size of its own: the note under each picture says how many "
    "times larger than real it is drawn, or that its size is arbitrary. Parts that seem to touch or to pass through "
    "one another in a loop need not do so in service."
)
DEFERENCE = (
    "Figures on this page are estimates from a linear model or from the mode sets it was given. They defer to tests "
    "of the real part, to local codes and to the judgement of licensed practice."
)


@dataclass(frozen=True)
class PageLoop:
    """One mode, or one pair of modes. ``gif``, ``still``, ``strip``, ``overlay`` and ``true_scale`` are files
    relative to the page's folder, empty where there is none; ``findings`` are further pictures as (words, file);
    ``caption`` is one or two sentences, ``sentences`` are what was found about the mode; ``alt`` says in words what
    the loop shows."""

    title: str
    gif: str = ""
    still: str = ""
    strip: str = ""
    overlay: str = ""
    true_scale: str = ""
    caption: str = ""
    alt: str = ""
    sentences: tuple[str, ...] = ()
    findings: tuple[tuple[str, str], ...] = ()

    @property
    def files(self) -> tuple[str, ...]:
        own = (self.gif, self.still, self.strip, self.overlay, self.true_scale)
        return tuple(f for f in (*own, *(file for _, file in self.findings)) if f)


@dataclass(frozen=True)
class PageTable:
    """Rows as for ``tables.text_table``; ``csv`` and ``json`` are relative files with the full figures, or empty."""

    title: str
    rows: Rows
    csv: str = ""
    json: str = ""


@dataclass(frozen=True)
class PageSection:
    """A heading with loops and tables. Sections with ``comparison`` set are shown before all others."""

    title: str
    text: tuple[str, ...] = ()
    loops: tuple[PageLoop, ...] = ()
    tables: tuple[PageTable, ...] = ()
    comparison: bool = False


def write_index(
    folder: str | os.PathLike[str],
    dossier_title: str,
    sections: Sequence[PageSection],
    *,
    condition: str = "",
    cautions: Sequence[str] = (),
    name: str = "index.html",
) -> Path:
    """Write the page into ``folder`` atomically; returns its path.

    Raises ``ExportError`` when a file to be shown is not in the folder, or its link would leave the folder.
    """
    target = Path(folder) / name
    ordered = sorted(sections, key=lambda section: not section.comparison)
    _check_links(Path(folder), ordered)
    return write_text(target, page_text(dossier_title, ordered, condition=condition, cautions=cautions))


def page_text(
    dossier_title: str, sections: Sequence[PageSection], *, condition: str = "", cautions: Sequence[str] = ()
) -> str:
    """The page as HTML, sections in the given order."""
    anchors = [f"s{number}" for number in range(1, len(sections) + 1)]
    links = [
        f'<a href="#{anchor}">{_text(section.title)}</a>' for anchor, section in zip(anchors, sections, strict=True)
    ]
    body = [
        "<header>",
        f"<h1>{_text(dossier_title)}</h1>",
        f'<p class="soft">{_text(condition)}</p>' if condition else "",
        f'<nav aria-label="Sections">{"".join(links)}</nav>' if len(links) > 1 else "",
        "</header>",
        "<main>",
        _cautions(cautions),
        f'<p class="scale">{_text(EXAGGERATED)}</p>',
        *(_section(anchor, section) for anchor, section in zip(anchors, sections, strict=True)),
        "</main>",
        f'<footer><p class="soft">{_text(DEFERENCE)}</p></footer>',
    ]
    return "\n".join(
        [
            "<!DOCTYPE html>",
            '<html lang="en">',
            "<head>",
            '<meta charset="utf-8">',
            '<meta name="viewport" content="width=device-width, initial-scale=1">',
            '<meta name="color-scheme" content="light dark">',
            "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; img-src 'self' file: data:; "
            "style-src 'unsafe-inline'\">",
            f"<title>{_text(dossier_title)}</title>",
            f"<style>{_style()}</style>",
            "</head>",
            "<body>",
            *(part for part in body if part),
            "</body>",
            "</html>",
            "",
        ]
    )


def _section(anchor: str, section: PageSection) -> str:
    kind = ' class="comparison"' if section.comparison else ""
    parts = [f'<section id="{anchor}"{kind}>', f"<h2>{_text(section.title)}</h2>"]
    parts += [f"<p>{_text(line)}</p>" for line in section.text]
    if section.loops:
        parts += ['<div class="loops">', *(_loop(loop) for loop in section.loops), "</div>"]
    parts += [_table(table) for table in section.tables]
    return "\n".join([*parts, "</section>"])


def _loop(loop: PageLoop) -> str:
    shown = loop.gif or loop.still or loop.strip
    parts = ["<figure>"]
    if shown:
        image = f'<img src="{_link(shown)}" alt="{_text(loop.alt or loop.title)}" loading="lazy">'
        if loop.gif and loop.still:
            image = (
                f'<picture><source media="(prefers-reduced-motion: reduce), print" srcset="{_link(loop.still)}">'
                f"{image}</picture>"
            )
        parts.append(f'<a href="{_link(shown)}">{image}</a>')
    parts.append(f"<figcaption><strong>{_text(loop.title)}</strong>")
    if loop.caption:
        parts.append(f"<p>{_text(loop.caption)}</p>")
    if loop.sentences:
        parts += ["<ul>", *(f"<li>{_text(sentence)}</li>" for sentence in loop.sentences), "</ul>"]
    files = [
        ("still picture", loop.still),
        ("phase strip for print", loop.strip),
        ("overlay", loop.overlay),
        ("at true scale", loop.true_scale),
        *loop.findings,
    ]
    links = [f'<a href="{_link(path)}">{_text(words)}</a>' for words, path in files if path and path != shown]
    if links:
        parts.append(f'<p class="files">{" · ".join(links)}</p>')
    return "\n".join([*parts, "</figcaption></figure>"])


def _table(table: PageTable) -> str:
    text = text_table(table.rows)
    parts = [f"<h3>{_text(table.title)}</h3>"]
    if text.cells:
        side = [' class="figure"' if numeric else "" for numeric in text.numeric]
        head = "".join(
            f'<th scope="col"{kind}>{_text(title)}{f" <span>{_text(unit)}</span>" if unit else ""}</th>'
            for title, unit, kind in zip(text.titles, text.units, side, strict=True)
        )
        rows = [
            "<tr>" + "".join(f"<td{kind}>{_text(cell)}</td>" for cell, kind in zip(row, side, strict=True)) + "</tr>"
            for row in text.cells
        ]
        # the wrapper scrolls sideways on small screens, so it must take the keyboard's focus
        parts += [
            f'<div class="table" tabindex="0" role="region" aria-label="{_text(table.title)}"><table>',
            f"<thead><tr>{head}</tr></thead>",
            "<tbody>",
            *rows,
            "</tbody></table></div>",
        ]
    else:
        parts.append('<p class="soft">nothing to list</p>')
    links = [
        f'<a href="{_link(path)}">{words}</a>' for words, path in (("CSV", table.csv), ("JSON", table.json)) if path
    ]
    if links:
        parts.append(f'<p class="files">all figures in full: {" · ".join(links)}</p>')
    return "\n".join(parts)


def _cautions(cautions: Iterable[str]) -> str:
    items = [f"<li>{_text(caution)}</li>" for caution in dict.fromkeys(cautions)]
    if not items:
        return ""
    return "\n".join(
        ['<aside class="cautions" aria-label="Cautions">', "<h2>Cautions</h2>", "<ul>", *items, "</ul>", "</aside>"]
    )


def _text(words: str) -> str:
    """Escaped for text and for double-quoted attributes; control characters dropped."""
    # by category: str.isprintable would also drop the no-break spaces between figures and units
    kept = (c for c in words if c in "\n\t" or not unicodedata.category(c).startswith("C"))
    return escape("".join(kept), quote=True)


def _link(path: str) -> str:
    return escape("./" + quote(PurePosixPath(path).as_posix(), safe="/"), quote=True)


def _check_links(folder: Path, sections: Sequence[PageSection]) -> None:
    for section in sections:
        files = [(loop.title, f) for loop in section.loops for f in loop.files]
        files += [(table.title, f) for table in section.tables for f in (table.csv, table.json) if f]
        for owner, path in files:
            pure = PurePosixPath(path)
            if pure.is_absolute() or ".." in pure.parts or "\\" in path or ":" in path:
                raise ExportError(
                    "the page can only show files inside its own folder",
                    file=folder,
                    place=owner,
                    found=path,
                    do="give the path relative to the folder, with forward slashes",
                )
            if not (folder / path).is_file():
                raise ExportError("a file that the page shows is not there", file=folder, place=owner, found=path)


def _style() -> str:
    return (
        f":root{{{_variables(THEMES['light'])}}}"
        f"@media (prefers-color-scheme: dark){{:root{{{_variables(THEMES['dark'])}}}}}" + _RULES
    )


def _variables(tokens: Tokens) -> str:
    return "".join(f"--{name}:{getattr(tokens, name)};" for name in _COLOURS)


_COLOURS = ("background", "band", "rule", "ink", "soft", "accent")

# rem follows the window: about 16 px on a phone, 20 px on a projector
_RULES = """
html{font-size:clamp(16px,.72rem + .45vw,21px);-webkit-text-size-adjust:100%}
*{box-sizing:border-box}
body{margin:0;background:var(--background);color:var(--ink);line-height:1.5;
font-family:"DejaVu Sans",Verdana,system-ui,sans-serif}
header,main,footer{max-width:88rem;margin:0 auto;padding:0 clamp(1rem,3vw,2.5rem)}
header{padding-top:2rem}
h1{font-size:1.9rem;line-height:1.2;margin:0 0 .3rem;overflow-wrap:anywhere}
h2{font-size:1.35rem;line-height:1.25;margin:0 0 .8rem;overflow-wrap:anywhere}
h3{font-size:1.05rem;margin:1.8rem 0 .5rem}
p{margin:.4rem 0;max-width:70ch}
a{color:var(--accent);text-underline-offset:.15em}
a:focus-visible,.table:focus-visible{outline:3px solid var(--accent);outline-offset:2px}
nav{display:flex;flex-wrap:wrap;gap:.3rem 1.2rem;margin:.9rem 0 0}
section{margin:2.6rem 0 0;padding-top:1.4rem;border-top:1px solid var(--rule)}
.soft,.files{color:var(--soft)}
.scale{margin:1.4rem 0 0;padding:.8rem 1.1rem;max-width:none;
background:var(--band);border-left:4px solid var(--accent)}
.cautions{margin:1.4rem 0 0;padding:.8rem 1.1rem;background:var(--band);border-left:4px solid var(--ink)}
.cautions h2{font-size:1.05rem;margin:0}
.cautions ul{margin:.3rem 0 0;padding-left:1.2rem;overflow-wrap:anywhere}
.loops{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(100%,26rem),1fr));gap:1.4rem}
.comparison .loops{grid-template-columns:repeat(auto-fit,minmax(min(100%,38rem),1fr))}
figure{margin:0;border:1px solid var(--rule);background:var(--band);max-width:960px}
img{display:block;width:100%;height:auto}
figcaption{padding:.8rem 1.1rem 1rem;overflow-wrap:anywhere}
figcaption ul{margin:.4rem 0;padding-left:1.2rem;max-width:70ch}
figcaption li{margin:.25rem 0}
.files{font-size:.9rem}
.table{overflow-x:auto;border-top:1px solid var(--rule);border-bottom:1px solid var(--rule)}
table{border-collapse:collapse;font-size:.92rem;font-variant-numeric:tabular-nums}
th,td{padding:.4rem .9rem;text-align:left;vertical-align:top}
th{vertical-align:bottom;font-weight:bold;border-bottom:1px solid var(--rule);min-width:5.5rem}
th span{color:var(--soft);font-weight:normal}
td{border-bottom:1px solid var(--rule);white-space:nowrap}
tr:last-child td{border-bottom:0}
.figure{text-align:right}
footer{margin-top:3rem;padding-bottom:3rem}
footer p{border-top:1px solid var(--rule);padding-top:1rem;max-width:none}
@media print{nav{display:none}figure,tr{break-inside:avoid}.table{overflow:visible}}
"""
