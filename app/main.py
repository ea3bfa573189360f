"""The wiring: what a request passes, in the order in which it passes it."""

from __future__ import annotations

from collections.abc import AsyncIterator
from contextlib import asynccontextmanager

from fastapi import FastAPI
from fastapi.exceptions import RequestValidationError
from fastapi.routing import APIRoute
from starlette.exceptions import HTTPException

from app import assets
from app.guard import Guard
from app.jobs import Jobs
from app.judging import JudgingJobs
from app.pages import answer, ask, model, order, records, shelf, trust
from app.refusing import refuse, refuse_address, refuse_values
from app.settings import Settings
from app.store import Store
from engine.refusal import Refusal


def create_app(settings: Settings) -> FastAPI:
    """The app over the studies in `settings.data`. Raises Refusal when that folder cannot be used."""
    app = FastAPI(title="Steelyard", docs_url=None, redoc_url=None, openapi_url=None, lifespan=_running)
    app.state.settings = settings
    app.state.store = Store(settings.data)
    app.state.jobs = Jobs(app.state.store)
    app.state.judging = JudgingJobs(app.state.store)
    app.state.templates = assets.templates()

    app.add_middleware(Guard, settings=settings)
    for page in (shelf, records, order, model, trust, ask, answer):
        for route in page.router.routes:
            if isinstance(route, APIRoute) and route.methods and "GET" in route.methods:
                route.methods.add("HEAD")  # as every other route answers it
        app.include_router(page.router)
    app.mount("/static", assets.Static(), name="static")

    app.add_exception_handler(Refusal, refuse)
    app.add_exception_handler(HTTPException, refuse_address)
    app.add_exception_handler(RequestValidationError, refuse_values)
    return app


@asynccontextmanager
async def _running(app: FastAPI) -> AsyncIterator[None]:
    app.state.jobs.warm()
    yield
    app.state.jobs.close()
    app.state.judging.close()
    app.state.store.close()
