"""The one Jinja environment: every value is escaped, an unknown name is an error; two functions for words."""

from collections.abc import Callable
from functools import cache

from jinja2 import Environment, PackageLoader, StrictUndefined

from builder.publish.figures import capital, how_many
from builder.publish.page import Written

__all__ = ["deferred", "render"]


def render(template: str, /, **values: object) -> str:
    """Return the HTML of a template beside this module.

    Raises jinja2.UndefinedError for a name the caller did not give: our fault, never the record's.
    """
    return _environment().get_template(template).render(**values)


def deferred(template: str, /, **values: object) -> Callable[[], Written]:
    """Return a function that renders a template beside this module as the body of a page."""
    return lambda: Written(render(template, **values))


@cache
def _environment() -> Environment:
    environment = Environment(
        loader=PackageLoader("builder.publish"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.globals["how_many"] = how_many
    environment.filters["capital"] = capital
    return environment
