"""panelkit: small, priced biomarker panels with honest accuracy."""
