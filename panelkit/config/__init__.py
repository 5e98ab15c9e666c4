"""The study file and every default."""

from panelkit.config.defaults import (
    ACCURACY,
    CHOICE,
    COHORT,
    ENGINE,
    PANELS,
    PLATFORM,
    PREPARATION,
    PROGRAMME,
    SEED,
    SHORTLIST,
)
from panelkit.config.programme import (
    FAMILY_PRESETS,
    MINOR_DIGITS,
    USUAL_REFERENCES,
    PlatformSection,
    ProgrammeSection,
    platform_section,
    programme_section,
    read_platform_file,
    read_programme_file,
)

__all__ = [
    "ACCURACY",
    "CHOICE",
    "COHORT",
    "ENGINE",
    "FAMILY_PRESETS",
    "MINOR_DIGITS",
    "PANELS",
    "PLATFORM",
    "PREPARATION",
    "PROGRAMME",
    "SEED",
    "SHORTLIST",
    "USUAL_REFERENCES",
    "PlatformSection",
    "ProgrammeSection",
    "platform_section",
    "programme_section",
    "read_platform_file",
    "read_programme_file",
]
