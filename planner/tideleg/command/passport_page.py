"""A profile's passport on the terminal."""

from __future__ import annotations

from typing import TYPE_CHECKING

from rich.table import Table
from rich.text import Text

if TYPE_CHECKING:
    from rich.console import Console

    from tideleg.mission import Passport, Profile


def print_passport(profile: Profile, found: Passport, console: Console) -> None:
    """Print what is in a profile, and how it was read."""
    table = Table("", "", title=Text(f"Profile {profile.name}"), title_justify="left", show_header=False)
    for label, text in found.rows():
        table.add_row(label, text)
    console.print(table)
    console.print("How it was read:")
    for rule in profile.rules:
        console.print(f"  {rule}", soft_wrap=True, markup=False)
