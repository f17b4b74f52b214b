"""``python -m drystone`` is the same as ``drystone``."""

from drystone.cli import main

main()
