"""`python -m planar`, the same as the `planar` command."""

from planar.cli import main

if __name__ == "__main__":  # processes that share work import this module too
    main()
