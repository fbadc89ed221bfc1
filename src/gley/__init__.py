"""gley: from a field survey of ORP and pH to redox evidence.

Names are loaded on first use, so that ``import gley`` costs nothing.
"""

from importlib import import_module

__version__ = "0.1.0"

_WHERE = {
    "GleyError": "gley.errors",
    "Settings": "gley.settings",
    "load_settings": "gley.settings:load",
    "read_survey": "gley.survey",
    "assign": "gley.stability",
    "assign_file": "gley.bulk",
    "chart": "gley.stability",
    "run": "gley.pipeline",
    "write": "gley.pipeline",
}

__all__ = ["__version__", *_WHERE]


def __getattr__(name: str):
    if name not in _WHERE:
        message = f"module 'gley' has no attribute '{name}'"
        raise AttributeError(message)
    module, _, attribute = _WHERE[name].partition(":")
    return getattr(import_module(module), attribute or name)


def __dir__() -> list[str]:
    return sorted(__all__)
