"""The local page and its HTTP interface: `create_app` builds it, `shiftpred serve` runs it.

`requests` what may be asked, `reading` texts that never become paths, `answers` the work, `workers` the processes that do it,
`gate` who may ask, `application` the routes, `static/` the page.
"""

__all__ = ["create_app"]


def __getattr__(name: str):
    if name != "create_app":
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from shiftpred.web.application import create_app

    return create_app
