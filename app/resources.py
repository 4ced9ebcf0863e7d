"""Where the files that travel with the program lie: in the wheel, else beside `app/` in a clone."""

from pathlib import Path

_PACKAGED = Path(__file__).parent / "_packaged"
_CLONE = Path(__file__).parent.parent


def resource(name: str) -> Path:
    """Folder of `name` (templates, static, migrations, demo_data)."""
    packaged = _PACKAGED / name
    return packaged if packaged.exists() else _CLONE / name
