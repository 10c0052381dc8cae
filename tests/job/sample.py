"""A job that uses every key, for the tests."""

FULL = """\
fieldkit = 1  # format version
title = "Glycol booster, discharge line"
units = "SI"

[pipe]
size = "NPS 3"
schedule = "40"  # stamped on the pipe
material = "carbon steel"
insulation = { thickness = "50 mm", density = "130 kg/m^3" }

[contents]
name = "water"

[state.tapped]
fill = 0.0
temperature = "20 degC"
[state.running]
fill = 1.0
temperature = "65 degC"
pressure = "6 bar"

# walked from the pump to the rack
[[leg]]
direction = "+x"
length = "4.2 m"
[[leg]]
direction = "+z"
length = "1.1 m"
bend_radius = "114 mm"

# the supports
[[support]]
at = "0 m"
kind = "anchor"
[[support]]
at = "4.0 m"
kind = "clamp"
vertical = "unknown"
lateral = "2 MN/m"
axial = "free"
rotation = "rigid"

[[mass]]
name = "check valve"
at = "2.6 m"
mass = "24 kg"
tolerance = 0.15
offset = ["0 m", "0 m", "0.18 m"]

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
channel = 1
quantity = "acceleration"
sensitivity = "100 mV/g"
full_scale = "1.4 V"
direction = "vertical"
at = "1.9 m"

[[measured]]
frequency = "23.4 Hz"
sd = "0.1 Hz"
damping = 0.011
direction = "vertical"
state = "tapped"

[goal]
margin = 0.2
margin_measured = 0.1
chance = 0.9
up_to = "200 Hz"
allow = ["support", "mass"]
keep_out = [["1.0 m", "1.6 m"]]
steel = [["2 m", "3 m"]]
"""

SMALL = """\
fieldkit = 1
[pipe]
size = "NPS 3"
schedule = "40"
material = "carbon steel"
[[leg]]
direction = "+x"
length = "4.2 m"
[[support]]
at = "0 m"
kind = "anchor"
"""
