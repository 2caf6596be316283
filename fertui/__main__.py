"""``python -m fertui``."""

from fertui.cli.main import main

raise SystemExit(main())
