"""The study file and every default."""

from panelkit.config.currency import MINOR_DIGITS
from panelkit.config.defaults import (
    ACCURACY,
    CHOICE,
    COHORT,
    DESIGN,
    ENGINE,
    KIT,
    LOCK,
    PANELS,
    PLATFORM,
    PREPARATION,
    PRICING,
    PROGRAMME,
    SEED,
    SHORTLIST,
    STEPS,
    DesignKind,
)
from panelkit.config.design import DesignSection, check_design, outcome_kind
from panelkit.config.kits import KitSection, kit_sections, read_kits
from panelkit.config.presets import FAMILY_PRESETS, USUAL_REFERENCES
from panelkit.config.programme import (
    PlatformSection,
    ProgrammeSection,
    platform_section,
    programme_section,
    read_platform_file,
    read_programme_file,
)
from panelkit.config.sections import read_toml
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
from panelkit.config.validation_plan import ValidationPlan, read_validation_plan

__all__ = [
    "ACCURACY",
    "CHOICE",
    "COHORT",
    "DESIGN",
    "ENGINE",
    "FAMILY_PRESETS",
    "KIT",
    "LOCK",
    "MINOR_DIGITS",
    "PANELS",
    "PLATFORM",
    "PREPARATION",
    "PRICING",
    "PROGRAMME",
    "SEED",
    "SHORTLIST",
    "STEPS",
    "TEMPLATE_SECTIONS",
    "USUAL_REFERENCES",
    "AccuracySection",
    "ChoiceSection",
    "CohortSection",
    "DesignKind",
    "DesignSection",
    "KitSection",
    "PanelsSection",
    "PlatformSection",
    "PreparationSection",
    "ProgrammeSection",
    "ShortlistSection",
    "StatementSection",
    "Study",
    "ValidationPlan",
    "check_design",
    "kit_sections",
    "outcome_kind",
    "platform_section",
    "programme_section",
    "read_kits",
    "read_platform_file",
    "read_programme_file",
    "read_study",
    "read_toml",
    "read_validation_plan",
    "study_text",
]
