"""`python -m retune`: the command line."""

from retune.cli import main

if __name__ == "__main__":
    main()
