"""MkDocs events -> open_book, build_pages. The only file that imports MkDocs; errors stop the build."""

import re
from html import escape
from pathlib import Path
from typing import Any, Literal
from urllib.parse import quote, urlsplit

from markupsafe import Markup
from mkdocs.config.base import Config
from mkdocs.config.config_options import Choice
from mkdocs.config.defaults import MkDocsConfig
from mkdocs.exceptions import PluginError
from mkdocs.plugins import BasePlugin, get_plugin_logger
from mkdocs.structure.files import File, Files, InclusionLevel
from mkdocs.structure.nav import Navigation, Section
from mkdocs.structure.pages import Page as MkDocsPage
from mkdocs.structure.toc import AnchorLink, TableOfContents
from mkdocs.utils import get_theme_dir
from mkdocs.utils.templates import TemplateContext

from builder.book import Book, Memory, open_book
from builder.checks.report import render_text
from builder.finding import Level
from builder.mechanism.batch import usual_processes
from builder.publish.build import BuildReport, build_date, write_report
from builder.publish.frame import INKS_STYLE, Furniture, MenuItem, content_policy, inks_style
from builder.publish.memory import load_memory, save_memory
from builder.publish.page import Asset, Page, headings_of, menu_of
from builder.publish.pages import build_pages
from builder.publish.portrait import Portrait, portrait_of
from builder.publish.progress import watched
from builder.publish.search_index import Listed, listed_of, search_assets
from builder.records.settings import Settings

__all__ = ["HandbookConfig", "HandbookPlugin"]

_FAVICON_OF_MATERIAL = "assets/images/favicon.png"
_UNUSED_OF_MATERIAL = ("assets/javascripts/", "assets/stylesheets/palette.", "assets/images/")
"""What Material brings and no page of ours loads."""

log = get_plugin_logger("handbook")


class HandbookConfig(Config):  # type: ignore[no-untyped-call]  # MkDocs leaves __init_subclass__ untyped
    """Options under `- handbook:` in mkdocs.yml; what belongs to the book stands in its handbook.yml."""

    fail_on = Choice([str(Level.ERROR), str(Level.QUERY)], default=str(Level.ERROR))


class HandbookPlugin(BasePlugin[HandbookConfig]):  # type: ignore[no-untyped-call]  # likewise
    """Publishes the records below `docs_dir` as virtual pages."""

    book: Book[Portrait]
    pages: tuple[Page, ...] = ()
    is_live = False

    def __init__(self) -> None:
        """Start with nothing remembered of an earlier build."""
        super().__init__()
        self.memory: Memory | None = None

    def on_startup(self, *, command: Literal["build", "gh-deploy", "serve"], dirty: bool) -> None:  # noqa: ARG002
        """Note whether pages are built to be published, or served to their author; keeps the plugin between edits."""
        self.is_live = command == "serve"

    def on_pre_build(self, *, config: MkDocsConfig) -> None:
        """Read and check the book and write its pages, before MkDocs clears the site folder."""
        _refuse_a_talking_theme(config)
        _add_our_theme(config)
        folder = Path(config.docs_dir)
        self.memory = self.memory or load_memory(folder)
        self.book = open_book(
            folder,
            today=build_date(),
            keep=portrait_of,
            progress=watched,
            processes=1 if self.is_live else usual_processes(),
            memory=self.memory,
        )
        if self.memory.has_changed and not self.is_live:
            save_memory(folder, self.memory)
        least = Level(self.config.fail_on).weight
        failing = [f for f in self.book.findings if f.accepted is None and f.level.weight >= least]
        write_report(BuildReport(len(self.book.entries), len(failing)))
        if failing and not self.is_live:
            raise PluginError(f"the book cannot be published\n{render_text(failing, folder)}")
        if failing:  # a record that is being written keeps nobody from reading the others
            log.warning("left out, or not fit to be published yet:\n%s", render_text(failing, folder))
        self.pages = build_pages(self.book)
        _configure(config, self.book.settings)

    def on_files(self, files: Files, *, config: MkDocsConfig) -> Files:
        """Add the pages and their downloads, and unless mkdocs.yml has one a menu: ours, then the group's own pages."""
        for file in _unwanted(files, config):
            files.remove(file)
        own = {file.dest_uri: file.src_uri for file in files.documentation_pages()}
        instead = {}
        assets = [inks_style(self.book.settings.accent)]
        for page in self.pages:
            file = _VirtualPage(page, config).file
            if file.dest_uri in own:  # a group may write a page of its own in place of ours
                instead[page.file] = own[file.dest_uri]
            else:
                files.append(file)
                assets += page.assets
        for asset in assets:
            files.append(_published(asset, config))
        beside = sorted(uri for uri in own.values() if "/" not in uri and uri not in instead.values())
        config.nav = config.nav or [*menu_of(self.pages, instead), *beside]
        return files

    def on_page_context(
        self,
        context: TemplateContext,
        *,
        page: MkDocsPage,
        config: MkDocsConfig,  # noqa: ARG002 - MkDocs calls it so
        nav: Navigation,  # noqa: ARG002
    ) -> TemplateContext:
        """Write a page's HTML just before the frame is put around it."""
        if isinstance(page, _VirtualPage):
            page.open()
        return context

    def on_post_page(self, output: str, *, page: MkDocsPage, config: MkDocsConfig) -> str:  # noqa: ARG002
        """Let go of it again."""
        if isinstance(page, _VirtualPage):
            page.close()
        return output

    def on_env(self, env: Any, *, config: MkDocsConfig, files: Files) -> Any:
        """Give frame and search what they show: only now do the pages that a group wrote have their titles."""
        listed = filter(None, map(_listed, files.documentation_pages()))
        for asset in search_assets(self.book.entries, listed):
            files.append(_published(asset, config))
        styles = (uri for uri in files.src_uris if re.fullmatch(r"assets/stylesheets/main\.\w+\.min\.css", uri))
        settings = self.book.settings
        env.globals |= {
            "book": settings,
            "built_on": self.book.today.isoformat(),
            "furniture": Furniture(),
            "inks_style": INKS_STYLE,
            "menu": _menu,
            "notice": settings.standing_notice,
            "policy": content_policy(live=self.is_live),
            "theme_style": next(styles),
        }
        return env


def _unwanted(files: Files, config: MkDocsConfig) -> list[File]:
    """Return what is not published: of the book all but Markdown and what the frame shows, of Material what is idle."""
    theme, material = config.theme, get_theme_dir("material")
    shown = {theme["favicon"], theme.get("logo"), *config.extra_css, *map(str, config.extra_javascript)}

    def is_wanted(file: File) -> bool:
        if file.src_dir == config.docs_dir:
            return file.is_documentation_page() or file.src_uri in shown
        return file.src_dir != material or not file.src_uri.startswith(_UNUSED_OF_MATERIAL)

    return [file for file in files if not is_wanted(file)]


def _published(asset: Asset, config: MkDocsConfig) -> File:
    return File.generated(config, asset.path, content=asset.data, inclusion=InclusionLevel.INCLUDED)


def _listed(file: File) -> Listed | None:
    """Return a page as the search offers it; those of a group by their titles."""
    page = file.page
    if isinstance(page, _VirtualPage):
        return listed_of(page.page)
    return Listed(page.url, _plain(page.title), _plain(page.meta.get("description", ""))) if page else None


def _plain(title: object) -> str:
    """Return as plain text what MkDocs gives as HTML (a heading) or as typed (front matter, mkdocs.yml)."""
    return Markup(title).striptags()  # noqa: S704 - nothing of it is marked safe any more


def _menu(nav: Navigation, section: str, root: str) -> tuple[MenuItem, ...]:
    """Return the top of the menu, an item of which leads to its first page.

    section: path of the page to mark. root: from the page to the site's root.
    """
    items = []
    for item in nav.items:
        first = item
        while first.children:
            first = first.children[0]
        if not isinstance(first, Section):  # an empty one leads nowhere
            is_here = bool(item.active) or (section != "" and first.url in {section, f"{section}index.html"})
            items.append(MenuItem(_plain(item.title), _href(first.url or "", root), is_here))
    return tuple(items)


def _href(url: str, root: str) -> str:
    """Return an address below the site's root, or one elsewhere, as a link of a page."""
    return url if urlsplit(url).scheme or url.startswith("/") else root + url.removeprefix("./")


class _VirtualPage(MkDocsPage):
    """A page whose HTML is ready: it never passes through Markdown. Theme templates do not escape, so we do here."""

    def __init__(self, page: Page, config: MkDocsConfig) -> None:
        place = InclusionLevel.INCLUDED if page.menu else InclusionLevel.NOT_IN_NAV
        file = File.generated(config, page.file, content="", inclusion=place)
        if page.source is not None:
            file.edit_uri = quote(page.source)
        super().__init__(escape(page.menu or page.title), file, config)
        self.page = page

    def read_source(self, config: MkDocsConfig) -> None:  # noqa: ARG002 - MkDocs calls it so
        page = self.page
        self.markdown = ""
        self.meta = {
            "title": escape(page.title),
            "description": escape(page.description),
            "section": page.section,
            "styles": page.styles,
            "scripts": page.scripts,
        }
        if not page.indexed:
            self.meta["robots"] = "noindex"

    def render(self, config: MkDocsConfig, files: Files) -> None:  # noqa: ARG002 - MkDocs calls it so
        """Leave the HTML to `open`; without anchors, links to them from Markdown are taken on trust."""
        self.close()

    def open(self) -> None:
        """Write the HTML, for the time that the frame is put around it."""
        written = self.page.write()
        self.content, self.meta["rail"] = written.body, written.rail
        self.toc = TableOfContents([AnchorLink(h.title, h.anchor, level=2) for h in headings_of(written.body)])

    def close(self) -> None:
        """Let go of the HTML: all pages together would fill the memory."""
        self.content, self.meta["rail"] = "", ""
        self.toc = TableOfContents([])


def _refuse_a_talking_theme(config: MkDocsConfig) -> None:
    """Stop where the theme would ask other hosts for fonts or scripts: what a reader looks up is nobody's business."""
    if config.theme.name != "material" or config.theme.get("font") is not False:
        raise PluginError(
            "this theme would call other hosts; mkdocs.yml needs theme: with name: material and font: false"
        )


def _add_our_theme(config: MkDocsConfig) -> None:
    """Lay our templates and assets over the theme, below a folder of the group's own."""
    theme, ours = config.theme, _theme_folder()
    theme.dirs.insert(0 if theme.custom_dir is None else 1, str(ours))
    config.watch.append(str(ours))  # `serve` follows edits of it
    if theme["favicon"] == _FAVICON_OF_MATERIAL:
        theme["favicon"] = "assets/mark.svg"


def _theme_folder() -> Path:
    """Return the folder site_overrides: inside the package where a wheel was installed, in a checkout beside it."""
    package = Path(__file__).parent
    inside = package / "site_overrides"
    return inside if inside.is_dir() else package.with_name(inside.name)


def _configure(config: MkDocsConfig, settings: Settings) -> None:
    """Take title, addresses and logo from the book's settings."""
    config.site_name = escape(settings.title)
    config.site_url = config.site_url or settings.site_address
    config.edit_uri = config.edit_uri or settings.edit_address
    if settings.logo:
        config.theme["logo"] = settings.logo
