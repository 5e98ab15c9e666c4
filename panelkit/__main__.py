"""``python -m panelkit``."""

from panelkit.cli.app import main

if __name__ == "__main__":
    main()
