"""A small loop of given dimensions, which nothing has to size, and the command line in this process."""

from pathlib import Path

from click.testing import CliRunner, Result

from planar.cli import main

BRIEF = """
name = "bench loop"
[target]
band = ["2440 MHz", "2460 MHz"]
impedance = "140 ohm"
match = "-6 dB"
[antenna]
family = "plain"
shape = "circle"
[antenna.dimensions]
loop_width = "35 mm"
trace_width = "3 mm"
gap = "1 mm"
[board]
laminate = "ptfe-glass-2-2"
thickness = "1.6 mm"
"""


def run(*arguments: str | Path) -> Result:
    """What the command of these `arguments` said and did."""
    return CliRunner().invoke(main, [str(each) for each in arguments])
