"""A live preview on this machine alone: saving a table, a page or a template updates what is open.

The handbook is built into a folder of the cache, never into the published site. Each build runs
in a copy of this process, which has everything loaded already. While the tables are broken, every
page shows what is wrong with them in place of itself, and comes back when they are mended.
"""

from __future__ import annotations

import contextlib
import html
import threading
import time
from collections.abc import Callable, Iterable, Iterator
from http.server import SimpleHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path
from urllib.parse import parse_qs, urlsplit

from generator import plugin
from generator.errors import DatasetError, Problem
from generator.parallel import Begun
from generator.plotting import preload
from generator.publish import PublishError
from generator.ready import Refused
from generator.update import update

_OFTEN = 0.1  # s between two looks at the files
_PATIENCE = 25.0  # s that a page waits for news before it asks again
_NEWS = "/-/news"
_HERE = "127.0.0.1"
_TEMPLATES = Path(__file__).parent / "templates"
# Asks whether there is something newer than what it came with, and is answered when there is.
_SCRIPT = """<script>
(() => {
  const ask = () => fetch("%s?after=%d").then(answer => answer.text())
    .then(news => news === "%d" ? ask() : location.reload())
    .catch(() => setTimeout(ask, 1000));
  ask();
})();
</script>
"""
_BROKEN = """<!doctype html>
<html lang="en"><head><meta charset="utf-8"><title>Not built</title>
<style>
body { font: 16px/1.5 sans-serif; max-width: 50rem; margin: 3rem auto; padding: 0 1rem; }
h1 { font-family: serif; } dt { font-weight: 600; margin-top: 1.4rem; } dd { margin: 0; }
code { font-size: .95em; }
</style></head>
<body><h1>%s</h1><p>The preview comes back when this is mended.</p><dl>%s</dl></body></html>
"""


class Preview:
    """The handbook as the files have it now.

    ``version`` counts builds; ``trouble`` says why there is no handbook, "" where there is one.
    """

    def __init__(self, config_file: Path, say: Callable[[str], None]) -> None:
        self.config_file, self._say = config_file.resolve(), say
        self.site = self.config_file.parent / ".cache" / "preview" / "site"
        self.version = 0
        self.trouble = ""
        self.problems: tuple[Problem, ...] = ()
        self._settings_of: tuple[int, int] | None = None
        self._watched: tuple[Path, ...] = (self.config_file,)
        self._news = threading.Condition()

    def build(self) -> None:
        """Bring the preview up to date, or find out why it cannot be."""
        start = time.monotonic()
        trouble, problems = Begun(self._attempt).result()
        with self._news:
            self.trouble, self.problems = trouble, problems
            self.version += 1
            self._news.notify_all()
        self._say(f"{time.monotonic() - start:.1f} s  {trouble or 'up to date'}")

    def _attempt(self) -> tuple[str, tuple[Problem, ...]]:
        self.site.parent.mkdir(parents=True, exist_ok=True)
        try:
            update(self.config_file, self.site, lambda stage: None)
        except DatasetError as error:
            errors = tuple(p for p in error.problems if p.severity == "error")
            return f"{len(errors)} error{'s' * (len(errors) != 1)} in the tables", errors
        except (PublishError, Refused, OSError) as error:
            return str(error), ()
        return "", ()

    def wait(self, after: int) -> int:
        """The number of the newest build; waits for one newer than ``after``, but not for long."""
        with self._news:
            self._news.wait_for(lambda: self.version != after, _PATIENCE)
            return self.version

    def watch(self, ended: threading.Event) -> None:
        """Build, and build again whenever a watched file changes, until ``ended`` is set."""
        seen = self._state()
        self.build()
        preload()
        while not ended.wait(_OFTEN):
            now = self._state()
            if now != seen:
                seen = now
                self.build()

    def _state(self) -> dict[str, tuple[int, int]]:
        """Time and size of every watched file."""
        settings = _stamp(self.config_file)
        if settings != self._settings_of:
            self._settings_of = settings
            with contextlib.suppress(Refused):  # the build will say what is wrong with them
                found = plugin.configured(self.config_file)
                sources = map(Path, found.sources)
                self._watched = (self.config_file, *sources, found.data, _TEMPLATES)
        stamps = {str(path): _stamp(path) for path in _files(self._watched)}
        # A file that is missing is just being replaced.
        return {path: stamp for path, stamp in stamps.items() if stamp is not None}

    def page(self, content: bytes) -> bytes:
        """An HTML page with the script that waits for news, or what is wrong in its place."""
        version = self.version
        if self.trouble:
            content = _told(self.trouble, self.problems).encode()
        script = (_SCRIPT % (_NEWS, version, version)).encode()
        return content.replace(b"</body>", script + b"</body>", 1)


def _stamp(path: Path) -> tuple[int, int] | None:
    try:
        status = path.stat()
    except OSError:
        return None
    return status.st_mtime_ns, status.st_size


def _files(places: Iterable[Path]) -> Iterator[Path]:
    for place in places:
        if place.is_dir():
            yield from (path for path in sorted(place.rglob("*")) if path.is_file())
        else:
            yield place


def _told(trouble: str, problems: Iterable[Problem]) -> str:
    """What is wrong, as a page."""
    entries = (
        f"<dt>{html.escape(p.place)}</dt><dd>found: <code>{html.escape(p.found)}</code></dd>"
        f"<dd>expected: {html.escape(p.expected)}</dd><dd>instead: {html.escape(p.hint)}</dd>"
        for p in problems
    )
    return _BROKEN % (html.escape(trouble), "".join(entries))


def server(preview: Preview, port: int) -> ThreadingHTTPServer:
    """A server of the preview that only this machine reaches.

    Raises ``OSError`` for a port that is taken.
    """

    class Handler(SimpleHTTPRequestHandler):
        def do_GET(self) -> None:
            address = urlsplit(self.path)
            if address.path == _NEWS:
                after = parse_qs(address.query).get("after", ["0"])[0]
                number = preview.wait(int(after) if after.isdigit() else 0)
                self._answer(200, "text/plain", str(number).encode())
            elif address.path.endswith(("/", ".html")):
                self._page(Path(self.translate_path(self.path)))
            else:
                super().do_GET()

        def _page(self, path: Path) -> None:
            path = path / "index.html" if path.is_dir() else path
            missing = preview.site / "404.html"
            for place, status in ((path, 200), (missing, 404)):
                if place.is_file():
                    content = preview.page(place.read_bytes())
                    self._answer(status, "text/html; charset=utf-8", content)
                    return
            self._answer(200, "text/html; charset=utf-8", preview.page(b"<body></body>"))

        def _answer(self, status: int, kind: str, content: bytes) -> None:
            self.send_response(status)
            self.send_header("Content-Type", kind)
            self.send_header("Content-Length", str(len(content)))
            self.send_header("Cache-Control", "no-store")
            self.end_headers()
            self.wfile.write(content)

        def log_message(self, format: str, *args: object) -> None:  # noqa: A002
            pass

    return ThreadingHTTPServer(
        (_HERE, port), lambda *given: Handler(*given, directory=str(preview.site))
    )


def serve(config_file: Path, port: int, say: Callable[[str], None]) -> None:
    """Serve the preview until it is interrupted. Raises ``OSError`` when the port is taken."""
    preview, ended = Preview(config_file, say), threading.Event()
    with server(preview, port) as http:
        say(f"http://{_HERE}:{http.server_port}/  (Ctrl-C ends it)")
        threading.Thread(target=http.serve_forever, daemon=True).start()
        try:
            preview.watch(ended)
        except KeyboardInterrupt:
            say("ended")
        finally:
            http.shutdown()
