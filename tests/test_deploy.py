"""What is deployed: a locked list that is complete, by hash, and names no place; a wheel that holds the templates."""

from __future__ import annotations

import re
import tomllib
from importlib.metadata import distribution
from pathlib import Path

from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

ROOT = Path(__file__).parents[1]
LOCK = (ROOT / ".deploy/requirements.lock").read_text("utf-8")
SETTINGS = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))
PROJECT = SETTINGS["project"]


def locked() -> dict[str, str]:
    """Package -> version."""
    return dict(re.findall(r"^([a-z0-9-]+)==([^ ]+)", LOCK, re.MULTILINE))


def needed(requirement: Requirement) -> set[str]:
    """The package, and all that it needs in turn where the locked version is the one installed here."""
    name, installed = canonicalize_name(requirement.name), distribution(requirement.name)
    below = map(Requirement, installed.requires or []) if installed.version == locked().get(name) else ()
    wanted = [one for one in below if one.marker is None or one.marker.evaluate({"extra": ""})]
    return {name}.union(*map(needed, wanted))


def test_lock_satisfies_every_lower_bound():
    versions = locked()
    for requirement in map(Requirement, PROJECT["dependencies"]):
        assert requirement.specifier, f"{requirement} has no lower bound"
        assert requirement.specifier.contains(versions[canonicalize_name(requirement.name)]), requirement


def test_lock_holds_all_that_is_needed():
    everything = set().union(*(needed(Requirement(line)) for line in PROJECT["dependencies"]))
    assert everything <= locked().keys()


def test_every_locked_package_has_hashes():
    for entry in re.split(r"^(?=[a-z])", LOCK, flags=re.MULTILINE)[1:]:
        assert re.search(r"--hash=sha256:[0-9a-f]{64}", entry), entry


def test_lock_names_no_place_to_download_from():
    assert not re.search(r"://|--(extra-)?index|--find-links|--trusted", LOCK)


def test_wheel_holds_every_template():
    included = SETTINGS["tool"]["hatch"]["build"]["targets"]["wheel"]["force-include"]
    assert set(included) == {str(path.relative_to(ROOT).as_posix()) for path in (ROOT / "templates").glob("*.xl*")}
    assert all(target == f"sheetfuncs/_{source}" for source, target in included.items())
