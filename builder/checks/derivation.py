"""How the products of a case follow from what was charged; asked once, for the checks and for the drawing."""

from builder.checks.case import Case
from builder.mechanism.products import Route, Search, search_routes
from builder.records.vocabulary import ProductUse
from builder.rule import Path

__all__ = ["SOUGHT", "expected_product", "is_desired", "main_route", "product_paths", "routes_by_product", "search"]

SOUGHT: Path = ("outcome", "sought")


def product_paths(case: Case) -> tuple[Path, ...]:
    """Return the paths of products and of what was sought, where their structure could be read."""
    paths: list[Path] = [("outcome", "products", index) for index in range(len(case.record.outcome.products))]
    return tuple(path for path in (*paths, SOUGHT) if path in case.structures)


def routes_by_product(case: Case) -> dict[Path, tuple[Route, ...]]:
    """Return the routes to each product and to what was sought; empty where none is found."""
    return dict(zip(product_paths(case), search(case).routes, strict=True))


def search(case: Case) -> Search:
    """Return the search for every product of the case; asked again, it is remembered."""
    return search_routes(tuple(case.structures[path] for path in product_paths(case)), case.sites, case.flask)


def is_desired(case: Case, path: Path) -> bool:
    """Say whether the product at `path` was wanted: marked so, sought, or one of several none of which is marked."""
    if path == SOUGHT:
        return True
    products = case.record.outcome.products
    marked = any(product.use is ProductUse.DESIRED for product in products)
    return not marked or products[int(path[-1])].use is ProductUse.DESIRED


def main_route(case: Case) -> Route | None:
    """Return the shortest route to the first wanted product that has one."""
    routes = (each[0] for path, each in routes_by_product(case).items() if each and is_desired(case, path))
    return next(routes, None)


def expected_product(case: Case) -> str:
    """Return the SMILES of the main product that the engine forecasts; empty where it forecasts none."""
    forecast = case.forecast
    return forecast.products[0].structure.smiles if forecast is not None and forecast.products else ""
