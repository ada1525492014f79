"""Where the files shipped with the program lie."""

from pathlib import Path


def assets_folder() -> Path:
    """Return the folder of shipped TOML files, inside the package (a wheel) or beside it (an editable install)."""
    package = Path(__file__).parents[1]
    inside = package / "assets"
    return inside if inside.is_dir() else package.parent / "assets"
