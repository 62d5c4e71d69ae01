"""MkDocs events -> open_book, build_pages. The only file that imports MkDocs; errors stop the build."""

from html import escape
from pathlib import Path
from typing import Any
from urllib.parse import quote

from mkdocs.config.base import Config
from mkdocs.config.config_options import Choice
from mkdocs.config.defaults import MkDocsConfig
from mkdocs.exceptions import PluginError
from mkdocs.plugins import BasePlugin
from mkdocs.structure.files import File, Files, InclusionLevel
from mkdocs.structure.pages import Page as MkDocsPage
from mkdocs.structure.toc import AnchorLink, TableOfContents

from builder.book import Book, open_book
from builder.checks.report import render_text
from builder.finding import Level
from builder.publish.build import BuildReport, build_date, write_report
from builder.publish.page import Page, menu_of
from builder.publish.pages import build_pages
from builder.publish.progress import watched
from builder.publish.search_index import Listed, listed_of, search_assets

__all__ = ["HandbookConfig", "HandbookPlugin"]


class HandbookConfig(Config):  # type: ignore[no-untyped-call]  # MkDocs leaves __init_subclass__ untyped
    """Options under `- handbook:` in mkdocs.yml; what belongs to the book stands in its handbook.yml."""

    fail_on = Choice([str(Level.ERROR), str(Level.QUERY)], default=str(Level.ERROR))


class HandbookPlugin(BasePlugin[HandbookConfig]):  # type: ignore[no-untyped-call]  # likewise
    """Publishes the records below `docs_dir` as virtual pages."""

    book: Book
    pages: tuple[Page, ...] = ()

    def on_pre_build(self, *, config: MkDocsConfig) -> None:
        """Read and check the book and write its pages, before MkDocs clears the site folder."""
        _refuse_a_talking_theme(config)
        folder = Path(config.docs_dir)
        self.book = open_book(folder, today=build_date(), progress=watched)
        least = Level(self.config.fail_on).weight
        failing = [f for f in self.book.findings if f.accepted is None and f.level.weight >= least]
        write_report(BuildReport(len(self.book.entries), len(failing)))
        if failing:
            raise PluginError(f"the book cannot be published\n{render_text(failing, folder)}")
        self.pages = build_pages(self.book)
        _configure(config, self.book, self.pages)

    def on_files(self, files: Files, *, config: MkDocsConfig) -> Files:
        """Add the pages and their downloads; of the book's own files only Markdown and the logo are published."""
        for file in list(files):
            is_ours = file.src_dir == config.docs_dir and file.src_uri != self.book.settings.logo
            if is_ours and not file.is_documentation_page():
                files.remove(file)
        for page in self.pages:
            if page.file not in files.src_uris:  # a group may write a page of its own in place of ours
                files.append(_VirtualPage(page, config).file)
                for asset in page.assets:
                    content, included = asset.data, InclusionLevel.INCLUDED
                    files.append(File.generated(config, asset.path, content=content, inclusion=included))
        return files

    def on_env(self, env: Any, *, config: MkDocsConfig, files: Files) -> Any:
        """Add what the search looks in: only now do the pages that a group wrote have their titles."""
        listed = filter(None, map(_listed, files.documentation_pages()))
        for asset in search_assets(self.book.entries, listed):
            files.append(File.generated(config, asset.path, content=asset.data, inclusion=InclusionLevel.INCLUDED))
        return env


class _VirtualPage(MkDocsPage):
    """A page whose HTML is ready: it never passes through Markdown. Theme templates do not escape, so we do here."""

    def __init__(self, page: Page, config: MkDocsConfig) -> None:
        place = InclusionLevel.INCLUDED if page.menu else InclusionLevel.NOT_IN_NAV
        file = File.generated(config, page.file, content="", inclusion=place)
        if page.source is not None:
            file.edit_uri = quote(page.source)
        super().__init__(escape(page.menu[-1] if page.menu else page.title), file, config)
        self._page = page

    def read_source(self, config: MkDocsConfig) -> None:  # noqa: ARG002 - MkDocs calls it so
        page = self._page
        self.markdown = ""
        self.meta = {"description": escape(page.description), "hide": ["navigation"]}
        if page.path:
            self.meta["title"] = escape(page.title)
        if len(page.headings) < 3:
            self.meta["hide"].append("toc")
        if page.template is not None:
            self.meta["template"] = page.template
        if not page.indexed:
            self.meta["robots"] = "noindex"

    def render(self, config: MkDocsConfig, files: Files) -> None:  # noqa: ARG002 - MkDocs calls it so
        self.content = self._page.body
        self.toc = TableOfContents([AnchorLink(h.title, h.anchor, level=2) for h in self._page.headings])
        self.present_anchor_ids = set(self._page.anchors)


def _listed(file: File) -> Listed | None:
    """Return a page as the search offers it; those of a group by their titles."""
    page = file.page
    if isinstance(page, _VirtualPage):
        return listed_of(page._page)
    return Listed(page.url, str(page.title), str(page.meta.get("description", ""))) if page else None


def _refuse_a_talking_theme(config: MkDocsConfig) -> None:
    """Stop where the theme would ask other hosts for fonts or scripts: what a reader looks up is nobody's business."""
    theme = config.theme
    ours = any((Path(folder) / "assets" / "handbook.css").is_file() for folder in theme.dirs)
    if theme.name != "material" or theme.get("font") is not False or not ours:
        raise PluginError(
            "this theme would call other hosts; mkdocs.yml needs theme: with name: material, font: false and"
            " custom_dir: the folder site_overrides of the handbook"
        )


def _configure(config: MkDocsConfig, book: Book, pages: tuple[Page, ...]) -> None:
    """Take title, addresses and logo from the book's settings; the menu too, unless mkdocs.yml has one."""
    settings = book.settings
    config.site_name = escape(settings.title)
    config.site_url = config.site_url or settings.site_address
    config.edit_uri = config.edit_uri or settings.edit_address
    config.nav = config.nav or menu_of(pages)
    if settings.logo:
        config.theme["logo"] = settings.logo
