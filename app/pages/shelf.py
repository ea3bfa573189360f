"""Shelf: the studies on this machine, bringing a table, the samples."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, File, Form, Request, Response, UploadFile
from fastapi.responses import RedirectResponse

from app import samples
from app.pages import shelf_view
from app.reading import read_upload
from app.refusing import STATUSES
from engine.refusal import Refusal

router = APIRouter()


@router.get("/")
def show(request: Request) -> Response:
    return _page(request)


@router.get("/study/{key}")
def open_study(request: Request, key: str) -> Response:
    """Where the study's next step is taken; a step that changes something waits there for a click."""
    study = request.app.state.store.study(key)
    return RedirectResponse(shelf_view.next_page(study, request.app.state.jobs.state(key)), status_code=303)


@router.post("/bring")
def bring(
    request: Request,
    name: Annotated[str, Form()] = "",
    file: Annotated[UploadFile | None, File()] = None,
) -> Response:
    """Read the table and keep it as a study; on refusal the Shelf again, with the name as typed and nothing stored."""
    source = file.filename if file is not None and file.filename else ""
    try:
        if file is None or not source:
            raise Refusal("No file was chosen.", do="Choose the file that holds the table, then read it.")
        frame, warnings = read_upload(file.file, source, request.app.state.settings)
        study = request.app.state.store.bring(name.strip() or _plain(source), frame, source, warnings=warnings)
    except Refusal as refusal:
        status = next(status for kind, status in STATUSES if isinstance(refusal, kind))
        return _page(request, name, source, refusal, status)
    return RedirectResponse(f"/study/{study.key}/records", status_code=303)


@router.post("/sample/{name}")
def open_sample(request: Request, name: str) -> Response:
    """Open a sample as a study: its question page when it is learned, else its model being learned."""
    study = samples.open_sample(request.app.state.store, request.app.state.jobs, name)
    place = "model" if study.model == "none" else "ask"
    return RedirectResponse(f"/study/{study.key}/{place}", status_code=303)


def _plain(source: str) -> str:
    """A study's name from its file's: without the ending."""
    return source.rsplit("/", 1)[-1].rsplit("\\", 1)[-1].rsplit(".", 1)[0].replace("_", " ").strip()


def _page(
    request: Request, name: str = "", source: str = "", refusal: Refusal | None = None, status: int = 200
) -> Response:
    store, jobs = request.app.state.store, request.app.state.jobs
    studies = store.studies()
    context = {
        "page": "Shelf",
        "study": None,
        "entries": [shelf_view.entry(study, jobs.state(study.key)) for study in studies],
        "headline": shelf_view.headline(len(studies)),
        "samples": samples.samples(),
        "name": name,
        "source": source,
        "refusal": refusal,
    }
    page: Response = request.app.state.templates.TemplateResponse(request, "shelf.html", context, status)
    return page
