"""Locked panels: freeze, cut-offs, panel file, scores, validation, recalibration."""

from panelkit.lock.cutoffs import CutOffRule, cutoff_rule
from panelkit.lock.freeze import (
    ChosenPanel,
    OutOfFoldRows,
    TaughtOn,
    freeze_panel,
    reasons_against,
    with_cutoffs,
)
from panelkit.lock.panel_file import content_of, panel_bytes, parse_panel, read_panel
from panelkit.lock.recalibration import Changed, recalibrate_panel
from panelkit.lock.scoring import Scores, score_samples
from panelkit.lock.validation import (
    NewPeople,
    refuse_other_plan,
    refuse_overlap,
    validate_panel,
)

__all__ = [
    "Changed",
    "ChosenPanel",
    "CutOffRule",
    "NewPeople",
    "OutOfFoldRows",
    "Scores",
    "TaughtOn",
    "content_of",
    "cutoff_rule",
    "freeze_panel",
    "panel_bytes",
    "parse_panel",
    "read_panel",
    "reasons_against",
    "recalibrate_panel",
    "refuse_other_plan",
    "refuse_overlap",
    "score_samples",
    "validate_panel",
    "with_cutoffs",
]
