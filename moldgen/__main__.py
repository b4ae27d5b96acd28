"""``python -m moldgen``: the same as the command ``moldgen``."""

from moldgen.cli import main

if __name__ == "__main__":
    main()
