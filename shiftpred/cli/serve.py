"""`shiftpred serve`: the local page."""

from __future__ import annotations

import click

from shiftpred.cli.options import traceback_option


@click.command("serve", short_help="Open the local page: draw or paste, see the answer while you type.")
@click.option("--port", type=click.IntRange(0, 65535), default=8317, show_default=True, metavar="N", help="0: any free one.")
@click.option(
    "--host",
    default="127.0.0.1",
    show_default=True,
    metavar="ADDRESS",
    help="Other than loopback only behind your own access control.",
)
@click.option("--no-browser", is_flag=True, help="Print the address only.")
@click.option(
    "--workers", type=click.IntRange(1, 32), default=2, show_default=True, metavar="N", help="Processes that do the work."
)
@traceback_option
def command(port, host, no_browser, workers) -> int:
    """Serve the page on this computer until Ctrl-C.

    Nothing is sent anywhere; the page, the editor and the model are parts of the installation. There is no login: whoever
    reaches the address may ask.
    """
    from shiftpred.cli.extras import require_extra

    require_extra("web", "fastapi", "uvicorn")
    import socket
    import threading
    import webbrowser

    import uvicorn

    from shiftpred.cli.boundary import print_message
    from shiftpred.errors import SettingError
    from shiftpred.web import create_app
    from shiftpred.web.gate import LOCAL_HOSTS
    from shiftpred.web.workers import WorkerPool

    family = socket.AF_INET6 if ":" in host else socket.AF_INET
    listener = socket.socket(family, socket.SOCK_STREAM)
    listener.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
    try:
        listener.bind((host, port))
        listener.listen(64)  # from now on whoever asks is kept waiting, not turned away
    except (OSError, OverflowError) as error:
        listener.close()
        reason = getattr(error, "strerror", None) or str(error)
        raise SettingError("--port, --host", f"{host}:{port} ({reason})", "an address that is free", "--port 0") from None
    named = f"[{host}]" if ":" in host else host
    address = f"http://{named}:{listener.getsockname()[1]}/"
    if host not in ("127.0.0.1", "localhost", "::1"):
        print_message("others can reach this address; there is no login")
    # Flushed: whoever starts this in the background waits for the line.
    click.echo(address)
    app = create_app(WorkerPool(workers), tuple(dict.fromkeys((*LOCAL_HOSTS, named))))
    if not no_browser:
        threading.Timer(0.8, webbrowser.open, (address,)).start()
    uvicorn.Server(uvicorn.Config(app, log_level="warning", access_log=False, server_header=False)).run(sockets=[listener])
    return 0
