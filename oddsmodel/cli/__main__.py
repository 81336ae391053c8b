"""`python -m oddsmodel.cli` is the same as the command."""

from oddsmodel.cli import main

main()
