"""A rope footbridge of the Orrin Quay works (invented data): what the full static side has, once each.

It is to be read, not to be solved: stages that would fall down are as good as others here.
"""

FOOTBRIDGE = """\
title = "Rope footbridge"
plane = "xz"
temperature = "10 degC"

[units]
force = "kN"

[sections.rope]
axial_stiffness = "20 MN"
mass_per_length = "2.5 kg/m"
expansion = "12e-6 / K"
breaking_force = "400 kN"
wind_width = "20 mm"

[sections.post]
axial_stiffness = "900 MN"
mass_per_length = "30 kg/m"
expansion = "12e-6 / K"
wind_width = "150 mm"

[joints]
anchor-1 = [-6, 0]
foot-1 = [0, 0]
top-1 = [0, 4]
low = [9, "1 m"]
top-2 = [21, 4]
foot-2 = [21, 0]
anchor-2 = [27, 0]

[[members]]
name = "post"
pairs = [["foot-1", "top-1"], ["foot-2", "top-2"]]
section = "post"

[[members]]
name = "back"
pairs = [["anchor-1", "top-1"], ["top-2", "anchor-2"]]
kind = "tension-only"
section = "rope"
pretension = 20

[[members]]
name = "carrier"
chain = ["top-1", "low", "top-2"]
kind = "tension-only"
section = "rope"
rope = true
slack = "24 mm"

[[members]]
name = "handrail"
from = "top-1"
to = "top-2"
kind = "hanging"
section = "rope"
sag = "1.2 m"

[[members]]
name = "hoist-line"
from = "top-1"
to = "low"
kind = "hanging"
section = "rope"
slack = "0.2 m"
absent = true

[[members]]
name = "stern-line"
from = "anchor-1"
to = "top-1"
kind = "hanging"
section = "rope"
unstressed_length = "7.25 m"
pieces = 4

[[supports]]
name = "anchors"
joints = ["anchor-1", "anchor-2"]
fixed = ["x", "z"]

[[supports]]
name = "feet"
joints = ["foot-1", "foot-2"]
fixed = ["x"]
only_pushes = "z"

[[supports]]
name = "prop"
joints = ["low"]
fixed = ["z"]
absent = true

[[masses]]
name = "deck"
joints = ["low"]
mass = "300 kg"

[[masses]]
members = ["carrier"]
per_length = "10 kg/m"
absent = true

[load_cases.dead]
self_weight = 1

[load_cases.crowd]
forces = [ { joints = ["low"], force = [0, -8] } ]

[load_cases.gale]
wind = [
    { members = ["post", "handrail"], toward = [3, 0], pressure = [["0 m", "0.5 kPa"], ["4 m", "0.8 kPa"]] },
    { members = ["carrier"], toward = [0, -2], pressure = "0.3 kPa" },
]

[load_cases.frost]
temperature = "-25 degC"
ice = [ { members = ["carrier", "handrail"], thickness = "20 mm", density = "900 kg/m^3" } ]

[load_cases.tightening]
take_up = [ { members = ["carrier", "handrail"], length = "30 mm" } ]

[combinations]
service = { dead = 1, crowd = 1 }
[combinations.weather]
always = { dead = 1 }
in_turn = [ { gale = 1.0, frost = 1.0 } ]

[[analyses]]
name = "shape"
kind = "form-finding"
loads = "dead"
without = ["handrail"]
force_densities = [
    { members = ["carrier"], value = "4 kN/m" }, { members = ["back", "stern-line"], value = 3 },
    { members = ["post"], value = -5 },
]

[[analyses]]
name = "bare"
kind = "static"
loads = "dead"
with = ["prop"]
without = ["back.2"]

[[analyses]]
name = "built"
kind = "static"
from = "bare"
loads = ["service", "weather"]
with = ["hoist-*", "back.2", "mass 2"]
without = ["prop", "deck"]

[[analyses]]
name = "one rope lost"
kind = "static"
from = { analysis = "built", loads = "each" }
lose_in_turn = ["back", "handrail"]
pieces = 8

[[analyses]]
name = "tensions"
kind = "tune"
loads = ["dead", "service"]
adjust = ["back", "carrier", "stern-line", "handrail"]
together = [["back"]]
targets = [
    { members = ["back.1"], tension = 25 },
    { members = ["handrail"], tension = 9, at = "to end", loads = "service" },
    { members = ["stern-line"], tension = 3 },
    { joint = "low", direction = "z", position = "0.9 m" },
]
cut_list = { marking_tension = 2, temperature = "15 degC", end_allowance = "60 mm" }

[[analyses]]
name = "least"
kind = "tune"
loads = ["service", "weather"]
adjust = ["back"]
keep_taut = ["back", "carrier"]
margin = "500 N"

[[analyses]]
name = "collapse"
kind = "equilibrium-path"
from = { analysis = "built", loads = "service" }
loads = "crowd"
constant = "dead"
stop_at = { joint = "low", direction = "z", displacement = "-0.4 m" }

[[analyses]]
name = "critical"
kind = "buckling"
loads = { crowd = 2 }
count = 3

[[analyses]]
name = "after"
kind = "static"
from = { analysis = "collapse", at = "limit point 1" }
loads = { dead = 1, tightening = 1 }

[[analyses]]
name = "swing"
kind = "modes"
from = { analysis = "tensions", loads = "dead" }
pieces = 8
"""
