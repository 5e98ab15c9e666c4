"""The order of the stages."""

from panelkit.workflow.check import check_study
from panelkit.workflow.draft import draft_study
from panelkit.workflow.run import Run, run_content, run_study
from panelkit.workflow.set_aside import open_set_aside

__all__ = [
    "Run",
    "check_study",
    "draft_study",
    "open_set_aside",
    "run_content",
    "run_study",
]
