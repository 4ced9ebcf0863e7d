"""The web application, assembled."""

from fastapi import Depends, FastAPI
from starlette.middleware.gzip import GZipMiddleware

from app import __version__
from app.settings import Settings
from app.storage.database import Database
from app.web import api, assets, pages, problems
from app.web.access import admit
from app.web.render import make_environment
from app.web.safety import Safety


def create_app(settings: Settings, db: Database) -> FastAPI:
    """The application over a migrated database."""
    app = FastAPI(
        title="Rillbook",
        version=__version__,
        summary="Which field to water, how much, for how long and by when.",
        description=api.DESCRIPTION,
        openapi_url="/api/v1/openapi.json",
        docs_url=None,
        redoc_url=None,
        dependencies=[Depends(admit)],
    )
    app.state.settings = settings
    app.state.db = db
    app.state.assets = assets.load_assets()
    app.state.templates = make_environment()
    app.include_router(assets.router)
    app.include_router(pages.router)
    app.include_router(api.router)
    problems.install(app)
    app.add_middleware(GZipMiddleware, minimum_size=1000, compresslevel=5)
    app.add_middleware(Safety, base_url=settings.mail.base_url)
    return app
