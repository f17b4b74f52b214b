"""drystone: from an extraction sheet with gaps to a report that can be defended."""

__version__ = "0.1.0"
