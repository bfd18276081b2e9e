"""One file, one URL: a question schema, a table of figures, one function that calls the core. No Flask here."""

from importlib import import_module
from pkgutil import iter_modules

for _module in iter_modules(__path__):
    import_module(f"{__name__}.{_module.name}")
