"""Static files: their address carries the hash of their content, so they may be kept for a year."""

import hashlib
from pathlib import Path

from fastapi import APIRouter, HTTPException, Request
from fastapi.responses import FileResponse, Response

from app.resources import resource

router = APIRouter()
TYPES = {
    ".css": "text/css",
    ".js": "text/javascript",
    ".svg": "image/svg+xml",
    ".txt": "text/plain",
}
FOR_A_YEAR = "public, max-age=31536000, immutable"


class Assets:
    """The files of static/, read once: name -> file and hash."""

    def __init__(self, folder: Path) -> None:
        self.files = {
            path.relative_to(folder).as_posix(): path
            for path in sorted(folder.rglob("*"))
            if path.suffix in TYPES
        }
        self.hashes = {
            name: hashlib.sha256(path.read_bytes()).hexdigest()[:12]
            for name, path in self.files.items()
        }

    def address(self, name: str) -> str:
        """Where a page finds a file; raises KeyError for a file that is not there."""
        return f"/static/{name}?{self.hashes[name]}"


def load_assets() -> Assets:
    """The program's own static files."""
    return Assets(resource("static"))


@router.get("/static/{path:path}", include_in_schema=False)
def static_file(request: Request, path: str) -> Response:
    """One static file."""
    assets: Assets = request.app.state.assets
    if path not in assets.files:
        raise HTTPException(404, "There is no such file.")
    current = request.url.query == assets.hashes[path]
    file = assets.files[path]
    return FileResponse(
        file,
        media_type=TYPES[file.suffix],
        headers={"Cache-Control": FOR_A_YEAR if current else "no-cache"},
    )
