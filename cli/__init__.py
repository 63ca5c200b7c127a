"""The `upstroke` command: parse, call, render. It holds no science."""

__all__ = ["__version__"]

__version__ = "0.1.0"
