"""The folder of results: written beside, then renamed, so that earlier results stay whole if anything fails."""

from __future__ import annotations

import io
import json
import shutil
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

from tideleg.errors import InputError
from tideleg.outcome import Outcome

if TYPE_CHECKING:
    from matplotlib.figure import Figure

DIGITS = "%.9g"
"""Numbers in steps.csv: nine digits, more than any input here carries."""


def write_results(outcome: Outcome, folder: Path, extra: Mapping[str, str] | None = None) -> list[Path]:
    """Write report.html, summary.json, steps.csv, caution.txt, the figures, and extra text files by name.

    Raises
    ------
    InputError
        If the folder holds something that is no earlier result: it is left alone.
    """
    _refuse_foreign(folder)
    beside = folder.with_name(f".{folder.name}.new")
    shutil.rmtree(beside, ignore_errors=True)
    (beside / "figures").mkdir(parents=True)
    try:
        _write_all(outcome, beside, extra or {})
        names = sorted(path.relative_to(beside) for path in beside.rglob("*") if path.is_file())
        _swap(beside, folder)
    except BaseException:
        shutil.rmtree(beside, ignore_errors=True)
        raise
    return [folder / name for name in names]


def _write_all(outcome: Outcome, folder: Path, extra: Mapping[str, str]) -> None:
    from tideleg.report.figures import draw_all
    from tideleg.report.html import render_html

    pictures = {name: (_png(figure), caption) for name, (figure, caption) in draw_all(outcome).items()}
    for name, (png, _) in pictures.items():
        (folder / "figures" / f"{name}.png").write_bytes(png)
    (folder / "report.html").write_text(render_html(outcome, pictures), encoding="utf-8")
    text = json.dumps(outcome.summary(), indent=2, allow_nan=False, ensure_ascii=False)
    (folder / "summary.json").write_text(text + "\n", encoding="utf-8")
    outcome.steps.to_csv(folder / "steps.csv", index=False, float_format=DIGITS, lineterminator="\n")
    rules = [*outcome.rules, *(f"{m.name}: {rule}" for m in outcome.missions for rule in m.rules)]
    lines = ["CAUTION", "", *outcome.safety.sentences, "", "How to read steps.csv", "", *rules]
    (folder / "caution.txt").write_text("\n".join(lines) + "\n", encoding="utf-8")
    for name, content in extra.items():
        (folder / name).write_text(content, encoding="utf-8")


def _png(figure: Figure) -> bytes:
    buffer = io.BytesIO()
    figure.savefig(buffer, format="png", dpi=130)
    return buffer.getvalue()


def _refuse_foreign(folder: Path) -> None:
    if folder.exists() and not folder.is_dir():
        raise InputError(f"{folder} is a file; give a folder for the results")
    if folder.is_dir() and any(folder.iterdir()) and not (folder / "summary.json").is_file():
        raise InputError(f"{folder} holds other files and no earlier results; give another folder, nothing is removed")


def _swap(beside: Path, folder: Path) -> None:
    """Put the new folder in the place of the old one; the old one goes only when the new one stands."""
    folder.parent.mkdir(parents=True, exist_ok=True)
    old = folder.with_name(f".{folder.name}.old")
    shutil.rmtree(old, ignore_errors=True)
    if folder.exists():
        folder.rename(old)
    beside.rename(folder)
    shutil.rmtree(old, ignore_errors=True)
