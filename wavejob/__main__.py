"""`python -m wavejob` is the same as `wavejob`."""

from .cli import main

raise SystemExit(main())
