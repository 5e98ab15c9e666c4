"""The study file and every default."""

from panelkit.config.currency import MINOR_DIGITS
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
    STEPS,
)
from panelkit.config.presets import FAMILY_PRESETS, USUAL_REFERENCES
from panelkit.config.programme import (
    PlatformSection,
    ProgrammeSection,
    platform_section,
    programme_section,
    read_platform_file,
    read_programme_file,
)
from panelkit.config.study import (
    AccuracySection,
    ChoiceSection,
    CohortSection,
    PanelsSection,
    PreparationSection,
    ShortlistSection,
    StatementSection,
    Study,
    read_study,
)
from panelkit.config.template import TEMPLATE_SECTIONS, study_text

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
    "STEPS",
    "TEMPLATE_SECTIONS",
    "USUAL_REFERENCES",
    "AccuracySection",
    "ChoiceSection",
    "CohortSection",
    "PanelsSection",
    "PlatformSection",
    "PreparationSection",
    "ProgrammeSection",
    "ShortlistSection",
    "StatementSection",
    "Study",
    "platform_section",
    "programme_section",
    "read_platform_file",
    "read_programme_file",
    "read_study",
    "study_text",
]
