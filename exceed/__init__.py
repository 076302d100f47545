"""exceed: decide from flight recorder logs whether an aeroplane left its limits.

`exceed.scan(paths, aircraft=..., rules=...)` gives a `Result`; `exceed.trace(path)` the frame of every quantity. Both
are imported when first asked for, so that `import exceed` costs nothing.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"
__all__ = ["ExceedError", "Result", "__version__", "scan", "trace"]

if TYPE_CHECKING:
    from exceed.api import Result, scan, trace
    from exceed.errors import ExceedError


def __getattr__(name: str) -> Any:
    if name in ("Result", "scan", "trace"):
        from exceed import api

        return getattr(api, name)
    if name == "ExceedError":
        from exceed.errors import ExceedError

        return ExceedError
    raise AttributeError(f"module 'exceed' has no attribute {name!r}")
