"""Steps that learn on training rows and apply to any rows."""

from panelkit.preparation.recipe import Recipe, default_steps
from panelkit.preparation.view import DesignView

__all__ = ["DesignView", "Recipe", "default_steps"]
