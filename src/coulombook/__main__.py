"""`python -m coulombook` and the console command."""

import sys

from coulombook.cli import main

if __name__ == "__main__":
    sys.exit(main())
