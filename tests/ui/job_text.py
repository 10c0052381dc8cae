"""The job file that the screens are tested on."""

JOB_TEXT = """\
fieldkit = 1
title = "Glycol booster, discharge line"

[pipe]
size = "NPS 3"
schedule = "40"
material = "carbon steel"

[contents]
name = "water"

[state.tapped]
fill = 0.0

[state.running]
fill = 1.0
temperature = "65 degC"
pressure = "6 bar"

[[leg]]
direction = "+x"
length = "4.2 m"

[[leg]]
direction = "+z"
length = "1.1 m"

[[support]]
at = "0 m"
kind = "anchor"

[[support]]
at = "3.4 m"
kind = "clamp"
vertical = "unknown"     # nobody has seen the steel behind it
lateral = "2 MN/m"

[[support]]
at = "5.3 m"
kind = "nozzle"

[[mass]]
name = "check valve"
at = "2.0 m"
mass = "24 kg"

[[excitation]]
name = "pump"
speed = ["1450 rpm", "1495 rpm"]
orders = [1, 2, 6]

[[excitation]]
name = "drive ripple"
frequency = "100 Hz"

[[recording]]
file = "tap-1.flac"
kind = "tap"
state = "tapped"
direction = "vertical"
at = "1.9 m"

[[recording]]
file = "running.flac"
kind = "running"
state = "running"
"""
