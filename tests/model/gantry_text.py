"""A small model of the Orrin Quay works (invented data) that has a bit of everything."""

GANTRY = """\
format = 1
title = "Lantern gantry, bay 3"
plane = "xz"
temperature = "10 degC"
note = "invented data"

[units]
length = "m"
force = "kN"

[materials.steel]
modulus = "210 GPa"
density = "7850 kg/m^3"
expansion = "12e-6 / K"
yield_strength = "355 MPa"

[sections.chord]
material = "steel"
area = "12.0 cm^2"
radius_of_gyration = "2.4 cm"
source = "maker's sheet"

[sections.stay]
axial_stiffness = "18 MN"
mass_per_length = "1.1 kg/m"
expansion = "12e-6 / K"
breaking_force = "190 kN"
end_factor = 0.9

[joints]
A = [0, 0]
B = ["4 m", 0]
C = ["4 m", "2 m"]
D = [0, "6 m"]

[[members]]
name = "stay-1"
from = "A"
to = "C"
kind = "tension-only"
section = "stay"
pretension = "15 kN"

[[members]]
name = "bottom"
chain = ["A", "B", "C"]
section = "chord"

[[members]]
name = "top"
pairs = [["D", "C"]]
section = "chord"

[[members]]
name = "main-rope"
from = "D"
to = "B"
kind = "hanging"
section = "stay"
unstressed_length = "7.3 m"
pieces = 4

[[supports]]
name = "feet"
joints = ["A"]
fixed = ["x", "y", "z"]

[[supports]]
joints = ["D"]
along = [3, 4]

[[supports]]
joints = ["B"]
springs = { z = "5 kN/mm" }

[[masses]]
joints = ["C"]
mass = "120 kg"

[load_cases.dead]
self_weight = 1.0

[load_cases.lanterns]
masses = [ { joints = ["B", "C"], mass = "120 kg" } ]
forces = [ { joints = ["C"], force = ["0.4 kN", 0] } ]
line_loads = [ { members = ["bottom"], per_length = [0, "-0.02 kN/m"] } ]

[load_cases.cold]
temperature = "-25 degC"

[load_cases.settlement]
movements = [ { joints = ["A"], move = [0, "-12 mm"] }, { joints = ["D"], move = ["3 mm", "4 mm"] } ]

[load_cases.tightening]
take_up = [ { members = ["main-rope", "stay-*"], length = "8 mm" } ]

[load_cases.gale-east]
forces = [ { joints = ["C"], force = [1, 0] } ]

[load_cases.gale-west]
forces = [ { joints = ["C"], force = [-1, 0] } ]

[combinations]
service = { dead = 1.0, lanterns = 1.0 }

[combinations.strength]
always = { dead = 1.35 }
in_turn = [ { lanterns = [0.0, 1.5] }, { "gale*" = 1.5, cold = 0.9 } ]

[events.drop]
kind = "pulse"
shape = "half-sine"
duration = "11 ms"
start = "0.05 s"
forces = [ { joints = ["C"], force = [0, "-40 kN"] } ]

[[analyses]]
name = "in service"
kind = "static"
loads = "service"

[[analyses]]
name = "strength"
kind = "static"
loads = ["strength", { dead = 1, settlement = 1, tightening = 1 }]

[[analyses]]
name = "modes in service"
kind = "modes"
from = "in service"
count = 12

[[analyses]]
name = "lantern dropped"
kind = "history"
from = "in service"
events = ["drop"]
duration = "3 s"
time_step = "1 ms"
damping = { ratio = "1 %", at = ["2 Hz", "20 Hz"] }
"""
