"""One file a return model. Importing this package registers them all; nothing else imports a model by its name."""

from importlib import import_module
from pkgutil import iter_modules

for _module in iter_modules(__path__):
    import_module(f"{__name__}.{_module.name}")
