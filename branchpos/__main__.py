"""``python -m branchpos`` is the command line."""

from branchpos.cli import main

if __name__ == "__main__":
    main(prog_name="branchpos")
