"""`python -m planar`, the same as the `planar` command."""

from planar.cli import main

main()
