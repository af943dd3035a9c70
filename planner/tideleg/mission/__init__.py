"""Profiles in: reading, road load, and what is in them."""

from tideleg.mission.coarsen import coarsened
from tideleg.mission.layout import ROLES, Layout
from tideleg.mission.passport import Passport, passport
from tideleg.mission.profile import Profile, SourcedProfile
from tideleg.mission.reading import read_profile
from tideleg.mission.road_load import Demanded, Vehicle, Wheel, at_wheels, stage_power

__all__ = [
    "ROLES",
    "Demanded",
    "Layout",
    "Passport",
    "Profile",
    "SourcedProfile",
    "Vehicle",
    "Wheel",
    "at_wheels",
    "coarsened",
    "passport",
    "read_profile",
    "stage_power",
]
