"""``python -m cli`` is ``ferrule``."""

from cli.main import main

main()
