"""The one Jinja environment: every value is escaped, an unknown name is an error."""

from functools import cache

from jinja2 import Environment, PackageLoader, StrictUndefined

__all__ = ["render"]


def render(template: str, /, **values: object) -> str:
    """Return the HTML of a template beside this module.

    Raises jinja2.UndefinedError for a name the caller did not give: our fault, never the record's.
    """
    return _environment().get_template(template).render(**values)


@cache
def _environment() -> Environment:
    return Environment(
        loader=PackageLoader("builder.publish"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
