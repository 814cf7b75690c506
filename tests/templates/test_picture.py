"""The picture in README.md can be made anew, and is there."""

import shutil
import struct
import sys
from pathlib import Path

import pytest

TEMPLATES = Path(__file__).parents[2] / "templates"
sys.path.insert(0, str(TEMPLATES))

import build_picture  # noqa: E402


def size(picture: Path) -> tuple[int, int]:
    """Width and height in pixels, from the header that every PNG file begins with."""
    signature, _, kind, width, height = struct.unpack(">8sI4sII", picture.read_bytes()[:24])
    assert (signature, kind) == (b"\x89PNG\r\n\x1a\n", b"IHDR")
    return width, height


def test_readme_shows_the_picture_that_is_there() -> None:
    readme = (TEMPLATES.parent / "README.md").read_text(encoding="utf-8")
    assert f"](templates/{build_picture.PICTURE.name})" in readme
    assert size(build_picture.PICTURE) == (1194, 556)


@pytest.mark.slow
@pytest.mark.libreoffice
@pytest.mark.skipif(not (shutil.which("soffice") and shutil.which("pdftoppm")), reason="needs soffice and pdftoppm")
def test_a_new_picture_has_the_same_frame(tmp_path: Path) -> None:
    assert size(build_picture.build(tmp_path / "new.png")) == size(build_picture.PICTURE)
