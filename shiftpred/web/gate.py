"""Who may ask and how much: host, origin and size are checked before anything is read."""

from __future__ import annotations

import json

__all__ = ["Gate", "LARGEST_BODY", "LOCAL_HOSTS", "SECURITY_HEADERS", "build_refusal_body"]

LARGEST_BODY = 2 * 1024 * 1024
"""Bytes."""
LOCAL_HOSTS = ("127.0.0.1", "localhost", "[::1]")

SECURITY_HEADERS = {
    # RDKit's drawings carry style attributes; scripts and style sheets come from this server alone.
    "content-security-policy": "default-src 'none'; script-src 'self'; style-src 'self'; style-src-attr 'unsafe-inline'; "
    "img-src 'self' data: blob:; font-src 'self'; connect-src 'self'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'",
    "x-content-type-options": "nosniff",
    "referrer-policy": "no-referrer",
    "cross-origin-opener-policy": "same-origin",
    "cross-origin-resource-policy": "same-origin",
    "cache-control": "no-store",
}


def build_refusal_body(where: str, came: str, would_do: str, try_next: str) -> dict:
    """Return a message in its four parts as the body of an answer."""
    message = f"{where}: got {came}; expected {would_do}. Try: {try_next}"
    return {
        "error": {"where": where, "came": came, "would_do": would_do, "try_next": try_next, "message": message, "problems": []}
    }


class Gate:
    """ASGI middleware in front of everything."""

    def __init__(self, app, hosts: tuple[str, ...] = LOCAL_HOSTS, largest_body: int = LARGEST_BODY):
        self.app, self.hosts, self.largest_body = app, {h.lower() for h in hosts}, largest_body

    async def __call__(self, scope, receive, send):
        if scope["type"] == "websocket":
            await send({"type": "websocket.close", "code": 1008})
            return
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return

        async def send_guarded(message):
            if message["type"] == "http.response.start":
                ours = [(k.encode(), v.encode()) for k, v in SECURITY_HEADERS.items()]
                message = {**message, "headers": [*message.get("headers", []), *ours]}
            await send(message)

        headers = {k.decode("latin-1").lower(): v.decode("latin-1") for k, v in scope["headers"]}
        refusal = self._find_refusal(scope, headers)
        if refusal:
            await _refuse(send_guarded, *refusal)
            return
        if scope["method"] not in ("POST", "PUT", "PATCH"):
            await self.app(scope, receive, send_guarded)
            return
        body = b""
        while True:
            message = await receive()
            if message["type"] == "http.disconnect":
                return
            body += message.get("body", b"")
            if len(body) > self.largest_body:
                await _refuse(send_guarded, *self._build_size_refusal(len(body)))
                return
            if not message.get("more_body"):
                break
        handed = False

        async def receive_body():
            nonlocal handed
            if handed:
                return await receive()
            handed = True
            return {"type": "http.request", "body": body, "more_body": False}

        await self.app(scope, receive_body, send_guarded)

    def _find_refusal(self, scope, headers):
        host = headers.get("host", "")
        name = host.rsplit(":", 1)[0] if not host.endswith("]") and ":" in host else host
        if name.lower() not in self.hosts:
            return 400, "Host header", repr(host[:80]), "the address that `shiftpred serve` printed", "open that address"
        origin = headers.get("origin")
        if (
            (origin is not None and origin.lower() not in (f"http://{host.lower()}", f"https://{host.lower()}"))
            or headers.get("sec-fetch-site") in ("cross-site", "same-site")
            and scope["method"] != "GET"
        ):
            return (
                403,
                "Origin header",
                repr((origin or "another site")[:80]),
                "this page itself",
                "open the page and ask from there",
            )
        if scope["method"] == "POST":
            kind = headers.get("content-type", "").split(";")[0].strip().lower()
            if kind != "application/json":
                return 415, "Content-Type header", repr(kind[:80]), "application/json", "send the fields as JSON"
            length = headers.get("content-length", "0")
            if not length.isdigit():
                return 400, "Content-Length header", repr(length[:80]), "a number of bytes", "leave it to the client"
            if int(length) > self.largest_body:
                return self._build_size_refusal(int(length))
        return None

    def _build_size_refusal(self, size: int):
        return (
            413,
            "request",
            f"{size:,} bytes or more",
            f"at most {self.largest_body:,}",
            "give one structure and its peak lists",
        )


async def _refuse(send, status: int, *parts: str) -> None:
    body = json.dumps(build_refusal_body(*parts)).encode()
    headers = [(b"content-type", b"application/json"), (b"content-length", str(len(body)).encode()), (b"connection", b"close")]
    await send({"type": "http.response.start", "status": status, "headers": headers})
    await send({"type": "http.response.body", "body": body})
