"""`python -m fbexpand`: the main job on a table, by default an invented one."""

import sys

from fbexpand.command.main import main

if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
