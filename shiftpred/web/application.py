"""The routes."""

from __future__ import annotations

from contextlib import asynccontextmanager
from importlib.resources import files

from fastapi import FastAPI, Request
from fastapi.exceptions import RequestValidationError
from fastapi.responses import FileResponse, JSONResponse, PlainTextResponse
from fastapi.staticfiles import StaticFiles

from shiftpred import __version__
from shiftpred.web.gate import LOCAL_HOSTS, Gate, build_refusal_body
from shiftpred.web.requests import (
    CompareRequest,
    ExplainRequest,
    PeaksRequest,
    PredictRequest,
    RankRequest,
    ReportRequest,
    StructureRequest,
)
from shiftpred.web.workers import Busy, Fault, OutOfTime, Refused, WorkerPool

__all__ = ["create_app"]

_REFUSALS = {
    422: {"description": "Refused: where, what came, what would do, what to try."},
    503: {"description": "Too long or too busy."},
}


def create_app(workers=None, hosts: tuple[str, ...] = LOCAL_HOSTS) -> FastAPI:
    """Build the application.

    Parameters
    ----------
    workers : WorkerPool or InlineWorkers, optional
        What does the work; default two processes with 20 s an answer.
    hosts : tuple of str
        Names under which the page may be asked for.

    Returns
    -------
    FastAPI
    """
    workers = workers or WorkerPool()

    @asynccontextmanager
    async def lifespan(_app):
        workers.start()
        yield
        workers.stop()

    app = FastAPI(
        title="shiftpred",
        version=__version__,
        lifespan=lifespan,
        docs_url=None,
        redoc_url=None,
        openapi_url="/api/openapi.json",
        description="Do these 1H and 13C peaks bear this structure out? A prediction is evidence, not proof of identity; release "
        "testing, forensic and clinical use follow local rules and a qualified person's judgement.",
        responses=_REFUSALS,
    )
    app.add_middleware(Gate, hosts=hosts)
    _add_refusals(app)
    _add_routes(app, workers)
    static = str(files("shiftpred.web") / "static")

    @app.get("/", include_in_schema=False)
    async def page():
        return FileResponse(f"{static}/page.html", media_type="text/html; charset=utf-8")

    @app.get("/triage", include_in_schema=False)
    async def triage_page():
        return FileResponse(f"{static}/triage.html", media_type="text/html; charset=utf-8")

    app.mount("/static", StaticFiles(directory=static), name="static")
    return app


def _add_routes(app: FastAPI, workers) -> None:
    @app.post("/api/structure", summary="Read and draw a structure")
    async def structure(asked: StructureRequest) -> dict:
        return await workers.answer("structure", asked.model_dump())

    @app.post("/api/peaks", summary="Say how a peak list is understood")
    async def peaks(asked: PeaksRequest) -> dict:
        return await workers.answer("peaks", asked.model_dump())

    @app.post("/api/predict", summary="Predict the shifts of every nucleus")
    async def predict(asked: PredictRequest) -> dict:
        return await workers.answer("predict", asked.model_dump())

    @app.post("/api/compare", summary="Judge whether peaks bear a structure out")
    async def compare(asked: CompareRequest) -> dict:
        return await workers.answer("compare", asked.model_dump())

    @app.post("/api/rank", summary="Put candidate structures in order of fit")
    async def rank(asked: RankRequest) -> dict:
        return await workers.answer("rank", asked.model_dump())

    @app.post("/api/explain", summary="Say why a shift lies where it lies")
    async def explain(asked: ExplainRequest) -> dict:
        return await workers.answer("explain", asked.model_dump())

    @app.post(
        "/api/report",
        summary="The comparison as a file: HTML report, or predicted shifts as CSV",
        response_class=PlainTextResponse,
    )
    async def report(asked: ReportRequest) -> PlainTextResponse:
        found = await workers.answer("report", asked.model_dump())
        # Never as text/html: a report is a file to keep, not a page of this server.
        name = f"shiftpred-{'report.html' if asked.format == 'html' else 'shifts.csv'}"
        return PlainTextResponse(found["text"], headers={"content-disposition": f'attachment; filename="{name}"'})


def _add_refusals(app: FastAPI) -> None:
    @app.exception_handler(Refused)
    async def refused(_request: Request, error: Refused):
        return JSONResponse({"error": error.args[0]}, 422)

    @app.exception_handler(RequestValidationError)
    async def invalid(_request: Request, error: RequestValidationError):
        first = error.errors()[0]
        where = ".".join(str(part) for part in first["loc"][1:]) or "request"
        came = repr(first.get("input"))[:80]
        return JSONResponse(
            build_refusal_body(where, came, first["msg"], "see /api/openapi.json for what each field takes"), 422
        )

    @app.exception_handler(OutOfTime)
    async def out_of_time(_request: Request, _error: OutOfTime):
        return JSONResponse(
            build_refusal_body(
                "request", "work that takes too long", "a smaller question", "fewer rivals, or `shiftpred compare`"
            ),
            503,
        )

    @app.exception_handler(Busy)
    async def busy(_request: Request, _error: Busy):
        return JSONResponse(
            build_refusal_body("server", "more questions than it can take", "a free moment", "ask again soon"), 503
        )

    @app.exception_handler(Fault)
    async def fault(_request: Request, error: Fault):
        return JSONResponse(
            build_refusal_body("server", str(error)[:200], "an answer; this is a fault of ours", "report it"), 500
        )
