"""Tell what is in a profile: rows, steps, energies, peaks, greatest rms by window. Nothing is changed or filled."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING

HELP = "tell what is in a profile"


if TYPE_CHECKING:
    from tideleg.mission import Passport, Profile


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("file", type=Path, metavar="FILE", help="profile (CSV with time_s and a power column)")
    parser.add_argument("--plan", type=Path, metavar="PLAN", help="plan whose vehicle turns a speed profile into power")
    parser.add_argument("--terminals", choices=("link", "battery"), default="link", help="where the power is meant")
    parser.add_argument("--interpolation", choices=("hold", "linear"), default="hold", help="between two rows")
    parser.add_argument(
        "--positive", choices=("discharge", "charge"), default="discharge", help="sign rule of the file"
    )
    parser.add_argument("--time", metavar="COLUMN", help="column of time stamps, where it is not certain")
    parser.add_argument("--power", metavar="COLUMN", help="column of power, where it is not certain")
    parser.add_argument("--speed", metavar="COLUMN", help="column of speed, where it is not certain")
    parser.add_argument("--unit", choices=("W", "kW", "MW", "m/s", "km/h", "mph"), help="where the header has none")
    parser.add_argument("--encoding", default="utf-8-sig", metavar="NAME", help="of the text, such as latin-1")
    parser.add_argument(
        "--stamps",
        choices=("seconds", "minutes", "hours", "clock", "iso", "day first", "month first"),
        help="their kind",
    )
    parser.add_argument(
        "--pictures", type=Path, metavar="DIR", help="write trace, duration curve, rms and energy as PNG"
    )
    parser.add_argument("--json", action="store_true", help="print JSON for machines")


def execute(given: argparse.Namespace) -> int:
    """Read, tell; return the exit status."""
    import json

    from rich.console import Console

    from tideleg.command.passport_page import print_passport
    from tideleg.demand import vehicle_of
    from tideleg.mission import Layout, passport, read_profile
    from tideleg.plan import load_plan

    vehicle = vehicle_of(load_plan(given.plan)) if given.plan is not None else None
    named = {role: getattr(given, role) for role in ("time", "power", "speed") if getattr(given, role) is not None}
    profile = read_profile(
        given.file,
        terminals=given.terminals,
        interpolation=given.interpolation,
        positive=given.positive,
        vehicle=vehicle,
        layout=Layout(columns=named, unit=given.unit, encoding=given.encoding, stamps=given.stamps),
    )
    found = passport(profile)
    if given.pictures is not None:
        _write_pictures(profile, found, given.pictures)
    if given.json:
        print(json.dumps(found.to_dict() | {"rules": list(profile.rules), "sha256": profile.sha256}, indent=2))
    else:
        print_passport(profile, found, Console())
    return 0


def _write_pictures(profile: Profile, found: Passport, folder: Path) -> None:
    """Write every picture of the profile as PNG."""
    from tideleg.errors import InputError
    from tideleg.report.profile_pictures import draw_profile

    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, picture in draw_profile(profile, found).items():
            picture.figure.savefig(folder / f"{name}.png", dpi=150, metadata={"Software": None})
    except OSError as error:
        raise InputError(f"{folder}: the pictures cannot be written ({error.strerror})") from None
