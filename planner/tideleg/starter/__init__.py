"""A first plugin for a stranger: a small installable project with its test, which passes as written."""

from __future__ import annotations

import keyword
import re
from pathlib import Path

from tideleg.errors import InputError

KINDS = ("topology", "loss", "cooling", "life")
_HERE = Path(__file__).resolve().parent


def new_plugin(kind: str, name: str, folder: Path) -> list[Path]:
    """Write a plugin project into a new folder and return its files.

    Parameters
    ----------
    kind : "topology", "loss", "cooling" or "life"
    name : of the plugin, lower-case words joined by hyphens
    folder : new, or empty

    Raises
    ------
    InputError
        If the kind or the name cannot be used, or the folder holds anything.
    """
    if kind not in KINDS:
        raise InputError(f"found the kind {kind!r}; a plugin is one of {', '.join(KINDS)}")
    module = name.replace("-", "_")
    if not re.fullmatch(r"[a-z][a-z0-9]*(-[a-z0-9]+)*", name) or keyword.iskeyword(module):
        raise InputError(f"found the name {name!r}; give lower-case words joined by hyphens, such as 'flat-loss'")
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise InputError(f"{folder} exists and is not empty; give a new folder, nothing is overwritten")
    package = f"tideleg_{module}"
    files = {
        Path("pyproject.toml"): _HERE / "pyproject.toml.txt",
        Path("src") / package / "__init__.py": _HERE / f"{kind}.py.txt",
        Path("tests") / "test_contract.py": _HERE / f"test_{kind}.py.txt",
    }
    for target, source in files.items():
        text = source.read_text(encoding="utf-8").replace("PLUGIN_NAME", name).replace("PLUGIN_PACKAGE", package)
        (folder / target).parent.mkdir(parents=True, exist_ok=True)
        (folder / target).write_text(text, encoding="utf-8")
    return [folder / target for target in files]
