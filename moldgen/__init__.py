"""moldgen: from a plastic part and its pull to a proved first-pass injection-mold layout."""

__version__ = "0.2.0"
