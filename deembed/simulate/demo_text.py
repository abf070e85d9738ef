"""Texts of the demonstration folder."""

from __future__ import annotations

__all__ = ["JOB", "NOTES"]

NOTES = """River-level radar gauge, splitter board B: a demonstration job. Everything here is invented.

A gauge on a bridge measures the level of a river with radar near 6 GHz. One transceiver feeds two antennas through a
splitter on a small board; three edge-launch connectors and the board's own lines (the arms) lead to it. The question
is what the splitter itself does, from readings taken at the connectors.

job.toml              says what each file is; run it with  python -m deembed run job.toml --out out/
raw/open_1.s1p ...    raw readings of open, short and load at analyzer ports 1 and 2
raw/thru_12.s2p       raw reading of the thru between them
raw/part_12.s2p ...   raw readings of the board, two ports at a time: part ports 1 and 2, 2 and 3, 3 and 1
raw/termination_N     reflection of what closed part port N while the other two were read
fixture/arm_N.s2p     the arm of part port N, port 1 of the file toward the analyzer
truth/part.s3p        what the simulation started from. A real job has no such file.
"""

JOB = """# River-level radar gauge, splitter board B: a demonstration, everything in it is invented.
# Paths are relative to this file.

[job]
title = "River-gauge splitter, board B"
part_ports = 3
reference_impedance_ohm = 50.0
operator = "demonstration"
instrument = "simulated two-port analyzer"
note = "Splitter of a river-level radar gauge, 6 GHz, between three edge-launch arms"

[analyzer]
ports = 2
drive = "every-port"

[calibration]
method = "solt"
kit = "generic-coax-3p5mm"
isolation = false

[[calibration.readings]]
standard = "open"
ports = [1]
file = "raw/open_1.s1p"

[[calibration.readings]]
standard = "short"
ports = [1]
file = "raw/short_1.s1p"

[[calibration.readings]]
standard = "load"
ports = [1]
file = "raw/load_1.s1p"

[[calibration.readings]]
standard = "open"
ports = [2]
file = "raw/open_2.s1p"

[[calibration.readings]]
standard = "short"
ports = [2]
file = "raw/short_2.s1p"

[[calibration.readings]]
standard = "load"
ports = [2]
file = "raw/load_2.s1p"

[[calibration.readings]]
standard = "thru"
ports = [1, 2]
file = "raw/thru_12.s2p"

# Three cyclic rounds: every part port is read by both analyzer ports.
[[rounds]]
file = "raw/part_12.s2p"
analyzer_ports = [1, 2]
part_ports = [1, 2]

[[rounds]]
file = "raw/part_23.s2p"
analyzer_ports = [1, 2]
part_ports = [2, 3]

[[rounds]]
file = "raw/part_31.s2p"
analyzer_ports = [1, 2]
part_ports = [3, 1]

# What closed each part port while the other two were read: reflections at the cable plane.
[terminations]
1 = "raw/termination_1.s1p"
2 = "raw/termination_2.s1p"
3 = "raw/termination_3.s1p"

[[fixture.arms]]
part_port = 1
file = "fixture/arm_1.s2p"
analyzer_side = 1

[[fixture.arms]]
part_port = 2
file = "fixture/arm_2.s2p"
analyzer_side = 1

[[fixture.arms]]
part_port = 3
file = "fixture/arm_3.s2p"
analyzer_side = 1

[expect]
passive = true
reciprocal = true
"""
