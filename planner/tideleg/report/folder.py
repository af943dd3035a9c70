"""The folder of results: written beside, then renamed, so that earlier results stay whole if anything fails.

Only files that an earlier run wrote are ever removed: summary.json lists them. What a person put beside them is kept.
"""

from __future__ import annotations

import io
import json
import shutil
import tempfile
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

from tideleg.errors import InputError
from tideleg.outcome import Outcome
from tideleg.report.words import all_rules

if TYPE_CHECKING:
    from matplotlib.figure import Figure

DIGITS = "%.9g"
"""Numbers in steps.csv: nine digits, more than any input here carries."""

DPI = 150


def write_results(outcome: Outcome, folder: Path, extra: Mapping[str, str] | None = None) -> list[Path]:
    """Write report.html, summary.json, steps.csv, caution.txt, the figures, and extra text files by name.

    Returns
    -------
    list of Path
        Every file written, in order of their names.

    Raises
    ------
    InputError
        If the folder is no folder, or holds something and no earlier results: it is left alone.
    """
    target = folder.resolve()
    earlier = _earlier_files(target, folder)
    scratch = _scratch_beside(target, folder)
    new, old = scratch / "new", scratch / "old"
    try:
        names = _write_all(outcome, new, extra or {})
        _keep_foreign(target, earlier, new)
        _swap(new, target, old)
    finally:
        # If both renames failed the earlier results still lie in the scratch folder: then it must stay.
        if target.exists() or not old.exists():
            shutil.rmtree(scratch, ignore_errors=True)
    return [folder / name for name in names]


def _scratch_beside(target: Path, given: Path) -> Path:
    """Return a new empty folder on the same file system, so that a rename puts the results in place at once."""
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        return Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))
    except OSError as error:
        raise InputError(f"{given} cannot be written: {error.strerror}; give another folder") from error


def _write_all(outcome: Outcome, folder: Path, extra: Mapping[str, str]) -> list[str]:
    """Write everything into a new folder and return the names, summary.json last: it lists all others."""
    from tideleg.report.figures import draw_all
    from tideleg.report.html import render_html

    pictures = {name: (_png(picture.figure), picture) for name, picture in draw_all(outcome).items()}
    (folder / "figures").mkdir(parents=True)
    texts = {"report.html": render_html(outcome, pictures), "caution.txt": caution_text(outcome)}
    names = sorted({*texts, "steps.csv", "summary.json", *(f"figures/{name}.png" for name in pictures)})
    for name, content in extra.items():
        if name in names or Path(name).name != name:
            raise ValueError(f"extra file {name!r}: give a plain name that no other result has")
        texts[name] = content
    names = sorted({*names, *extra})
    for name, content in texts.items():
        (folder / name).write_text(content, encoding="utf-8", newline="\n")
    for name, (png, _) in pictures.items():
        (folder / "figures" / f"{name}.png").write_bytes(png)
    outcome.steps.to_csv(folder / "steps.csv", index=False, float_format=DIGITS, lineterminator="\n")
    summary = {**outcome.summary(), "files": names}
    text = json.dumps(summary, indent=2, allow_nan=False, ensure_ascii=False)
    (folder / "summary.json").write_text(text + "\n", encoding="utf-8", newline="\n")
    return names


def caution_text(outcome: Outcome) -> str:
    """Return the caution and the rules of the table as plain text; steps.csv itself stays plain for machines."""
    lines = [outcome.title, "", "CAUTION", *(f"- {s}" for s in outcome.safety.sentences)]
    lines += ["", "How the numbers are found", *(f"- {note}" for note in outcome.safety.notes)]
    lines += ["", "How to read steps.csv", *(f"- {rule}" for rule in all_rules(outcome))]
    return "\n".join(lines) + "\n"


def _png(figure: Figure) -> bytes:
    buffer = io.BytesIO()
    # No version of the drawing library in the file: the same outcome gives the same bytes.
    figure.savefig(buffer, format="png", dpi=DPI, metadata={"Software": None})
    return buffer.getvalue()


def _earlier_files(target: Path, given: Path) -> frozenset[str]:
    """Return the files of earlier results in the folder; refuse a folder that holds anything but results."""
    if target.exists() and not target.is_dir():
        raise InputError(f"{given} is a file; give a folder for the results")
    if not target.is_dir() or not any(target.iterdir()):
        return frozenset()
    try:
        summary = json.loads((target / "summary.json").read_text(encoding="utf-8"))
        return frozenset(summary["files"]) if "schema_version" in summary and "safety" in summary else _refuse(given)
    except (OSError, ValueError, KeyError, TypeError):
        return _refuse(given)


def _refuse(given: Path) -> frozenset[str]:
    raise InputError(
        f"{given} is not empty and holds no earlier results (no summary.json that lists its files); nothing in it was"
        " touched. Give another folder, or empty this one"
    ) from None


def _keep_foreign(target: Path, earlier: frozenset[str], new: Path) -> None:
    """Copy what a person put beside the earlier results into the new folder."""
    if not target.is_dir():
        return
    for path in sorted(target.rglob("*")):
        name = path.relative_to(target)
        if (path.is_dir() and not path.is_symlink()) or name.as_posix() in earlier:
            continue
        if (new / name).exists():
            raise InputError(f"{path} was not written by an earlier run and would be lost; move it away and run again")
        (new / name).parent.mkdir(parents=True, exist_ok=True)
        shutil.copy2(path, new / name, follow_symlinks=False)


def _swap(new: Path, target: Path, old: Path) -> None:
    """Put the new folder in the place of the earlier one; if that fails, put the earlier one back."""
    if target.exists():
        target.rename(old)
    try:
        new.rename(target)
    except OSError:
        if old.exists():
            old.rename(target)
        raise
