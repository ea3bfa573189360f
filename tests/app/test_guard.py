"""The guard: who may ask, what a response carries, how much a form may weigh."""

import logging

import pytest
from fastapi import Request
from fastapi.testclient import TestClient

from app.guard import FORM_LIMIT, POLICY
from app.main import create_app
from app.settings import Settings

ANSWERED = 404  # the probe below is not a page; a request that passes the guard meets "no page at this address"
PROBE = "/nowhere"


def test_only_loopback_names_with_the_port_are_answered(client):
    for host in ("127.0.0.1:8377", "localhost:8377", "LOCALHOST:8377", "[::1]:8377"):
        assert client.get(PROBE, headers={"Host": host}).status_code == ANSWERED
    for host in ("evil.example", "evil.example:8377", "127.0.0.1", "127.0.0.1:80", "localhost.evil.example:8377", ""):
        refused = client.get(PROBE, headers={"Host": host})
        assert refused.status_code == 403
        assert "is not the address of this Steelyard" in refused.text


@pytest.mark.parametrize(
    ("headers", "passes"),
    [
        ({"Sec-Fetch-Site": "same-origin"}, True),
        ({"Sec-Fetch-Site": "none"}, True),
        ({"Sec-Fetch-Site": "cross-site"}, False),
        ({"Sec-Fetch-Site": "same-site"}, False),
        ({"Sec-Fetch-Site": "cross-site", "Origin": "http://127.0.0.1:8377"}, False),
        ({"Origin": "http://127.0.0.1:8377"}, True),
        ({"Origin": "http://127.0.0.1:8378"}, False),
        ({"Origin": "https://127.0.0.1:8377"}, False),
        ({"Origin": "null"}, False),
        ({"Origin": "http://evil.example"}, False),
        ({}, False),
    ],
)
@pytest.mark.parametrize("method", ["POST", "PUT", "DELETE"])
def test_a_form_is_taken_only_from_our_own_pages(app, settings, headers, passes, method):
    with TestClient(app, base_url=settings.address) as stranger:
        answered = stranger.request(method, PROBE, headers=headers)
    assert answered.status_code == (ANSWERED if passes else 403)
    if not passes:
        assert "not sent from a page of Steelyard" in answered.text


def test_a_link_from_elsewhere_may_be_followed(client):
    assert client.get(PROBE, headers={"Sec-Fetch-Site": "cross-site"}).status_code == ANSWERED


def test_every_response_carries_the_policy(client):
    for answered in (
        client.get(PROBE),
        client.get("/static/look.css"),
        client.get(PROBE, headers={"Host": "evil.example"}),
        client.post(PROBE, content=b"x" * (FORM_LIMIT + 1)),
    ):
        assert answered.headers["content-security-policy"] == POLICY
        assert "unsafe" not in answered.headers["content-security-policy"]
        assert answered.headers["x-content-type-options"] == "nosniff"
        assert answered.headers["referrer-policy"] == "same-origin"


def test_a_form_over_the_limit_is_refused_before_it_is_read(client, app):
    @app.post("/read")
    async def read(request: Request) -> dict[str, int]:
        return {"size": len(await request.body())}

    assert client.post("/read", content=b"x" * FORM_LIMIT).json() == {"size": FORM_LIMIT}
    for content in (b"x" * (FORM_LIMIT + 1), iter([b"x" * FORM_LIMIT, b"x"])):  # the second does not announce its size
        refused = client.post("/read", content=content)
        assert refused.status_code == 413
        assert "The form is too large" in refused.text


def test_a_table_over_the_limit_is_refused_with_the_limit(tmp_path):
    settings = Settings(data=tmp_path, upload_limit=1)
    with TestClient(create_app(settings), base_url=settings.address, headers={"Sec-Fetch-Site": "none"}) as client:
        whole = client.post("/bring", files={"file": ("big.csv", b"x" * 6_000_000)})
        head = b'--part\r\nContent-Disposition: form-data; name="file"; filename="big.csv"\r\n\r\n'
        typed = {"Content-Type": "multipart/form-data; boundary=part"}
        bit_by_bit = client.post("/bring", content=iter([head, *[b"x" * 1_000_000] * 6]), headers=typed)
    for refused in (whole, bit_by_bit):  # the second does not announce its size
        assert refused.status_code == 413
        assert "The file is larger than 1 MB" in refused.text


def test_an_error_of_the_program_is_a_sentence_without_a_trace(client, app, caplog):
    @app.get("/fault")
    def fault() -> None:
        raise ZeroDivisionError("the inner words")

    with caplog.at_level(logging.CRITICAL, logger="steelyard"):
        answered = client.get("/fault")
    assert answered.status_code == 500
    assert "Steelyard met an error of its own" in answered.text
    for inner in ("ZeroDivisionError", "the inner words", "Traceback", "fault()"):
        assert inner not in answered.text
    assert answered.headers["content-security-policy"] == POLICY


@pytest.mark.parametrize(
    ("address", "status"),
    [
        ("/nowhere", 404),
        ("/study/none-such/ask", 404),
        ("/study/%00/ask", 404),
        ("/study/..%2f..%2fetc/ask", 404),
        ("/static/../pyproject.toml", 404),
        ("/static/%2e%2e/pyproject.toml", 404),
        ("/static/%00", 404),
        ("/static/" + "a" * 5000, 404),
        ("/%ff%fe?%ff=%00&&&=;", 404),
        ("/docs", 404),
        ("/openapi.json", 404),
    ],
)
def test_a_nonsense_address_gets_a_sentence(client, address, status):
    answered = client.get(address)
    assert answered.status_code == status
    assert "text/html" in answered.headers["content-type"]
    assert "There is no" in answered.text


def test_names_in_a_refusal_are_escaped(client, app):
    @app.get("/study/{key}/probe")
    def probe(key: str) -> None:
        app.state.store.study(key)

    answered = client.get("/study/%3Cscript%3Ealert(1)/probe")
    assert answered.status_code == 404
    assert "<script>alert" not in answered.text
    assert "&lt;script&gt;alert(1)" in answered.text


def test_a_static_file_is_kept_by_its_full_address_only(client, app):
    address = app.state.templates.env.globals["static"]("look.css")
    assert "immutable" in client.get(address).headers["cache-control"]
    assert client.get("/static/look.css").headers["cache-control"] == "no-cache"
    assert client.get("/static/look.css?v=000000000000").headers["cache-control"] == "no-cache"
