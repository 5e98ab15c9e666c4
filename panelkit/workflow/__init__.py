"""The order of the stages."""

from panelkit.workflow.check import check_study
from panelkit.workflow.draft import draft_study
from panelkit.workflow.run import Run, run_content, run_study

__all__ = ["Run", "check_study", "draft_study", "run_content", "run_study"]
