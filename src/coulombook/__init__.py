"""Keeps the book of the coulombs: every coulomb passed is charged to a product, or shown as missing.

    import coulombook

    book = coulombook.tally("2043-05-18 mesh")
    book.summary  # a pandas frame; likewise book.ledger, book.series, ...
    book.findings  # what the reader of the numbers should know

Every public name is listed here, once, and loaded when it is first used: importing the package costs nothing.
"""

import sys

TYPE_CHECKING = False  # type-checkers take it for true; importing `typing` for it would slow every start
if TYPE_CHECKING:
    from coulombook import figures as figures
    from coulombook.book import Book as Book
    from coulombook.book import Table as Table
    from coulombook.cell.charge import charge_coulomb as charge_coulomb
    from coulombook.cell.potential import ReferenceElectrode as ReferenceElectrode
    from coulombook.cell.potential import find_reference as find_reference
    from coulombook.cell.potential import reference_names as reference_names
    from coulombook.comparison.order import Comparison as Comparison
    from coulombook.comparison.order import compare_days as compare_days
    from coulombook.curves.fit import Curve as Curve
    from coulombook.curves.fit import fit_curve as fit_curve
    from coulombook.curves.inverse import invert as invert
    from coulombook.findings import DayFaults as DayFaults
    from coulombook.findings import Finding as Finding
    from coulombook.species import Species as Species
    from coulombook.species import electrons_of as electrons_of
    from coulombook.species import load_species as load_species
    from coulombook.species import parse_formula as parse_formula
    from coulombook.tally import check as check
    from coulombook.tally import tally as tally

__version__ = "0.1.0"

_MODULE_OF = {
    "Book": "book",
    "Comparison": "comparison.order",
    "Curve": "curves.fit",
    "DayFaults": "findings",
    "Finding": "findings",
    "ReferenceElectrode": "cell.potential",
    "Species": "species",
    "Table": "book",
    "charge_coulomb": "cell.charge",
    "check": "tally",
    "compare_days": "comparison.order",
    "find_reference": "cell.potential",
    "electrons_of": "species",
    "figures": "",  # a room of functions, public as a whole
    "fit_curve": "curves.fit",
    "invert": "curves.inverse",
    "load_species": "species",
    "parse_formula": "species",
    "reference_names": "cell.potential",
    "tally": "tally",
}

__all__ = ["__version__", *_MODULE_OF]


def __getattr__(name: str) -> object:
    module = _MODULE_OF.get(name)
    if module is None:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from importlib import import_module

    found = import_module(f"{__name__}.{module or name}")
    value: object = getattr(found, name) if module else found
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})


class _Package(type(sys)):  # type: ignore[misc] # the class of modules, without importing `types` for its name
    """The package as a module in which ``tally`` is the function, whatever was imported first.

    Loading the submodule ``coulombook.tally`` would otherwise put the module under that name.
    """

    def __setattr__(self, name: str, value: object) -> None:
        if name in _MODULE_OF and isinstance(value, type(sys)):
            return
        super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Package
