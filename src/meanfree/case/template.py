"""The commented case that `meanfree start` writes: it passes `check` as it stands."""

from __future__ import annotations

_TEMPLATE = """\
# A case file: what is in the vessel, how warm it is, how it reacts. Everything after a "#" is a
# comment. Quantities stand in quotes with their unit; meanfree check says what was understood.
# For an editor that completes keys: meanfree schema --out case.schema.json, and as first line
#   #:schema ./case.schema.json
title = "@TITLE@"
# purpose = "What the run is to tell"
# labels = ["A", "lump1"]              # names that are no real gas: no mass, no elements

[vessel]
holds = "volume"                       # "volume": rigid; "pressure": a piston or a bag
volume = "1.8 L"                       # of a piston: at filling
# rated_pressure = "2 bar"
# gauge_resolution = "0.2 torr"        # smallest change of pressure that its gauge shows
# shape = { form = "sphere" }          # or "cylinder" with diameter and length
# dead_space = { volume = "25 mL", temperature = "296 K" }   # gauge and lines

[temperature]
mode = "isothermal"                    # or "adiabatic", "exchange", "program"
value = "480 K"
# exchange: surroundings = "480 K", conductance = "0.09 W/K", wall_heat_capacity = "40 J/K"
# program:  points = [["0 s", "296 K"], ["4 min", "480 K"]]  instead of value

[fill]
gases = { NOCl = "50 torr", Ar = "135 torr" }   # or amounts, concentrations, number densities
at = "296 K"                           # temperature at which these were read
# or: total = "185 torr", gases = { NOCl = 0.27, Ar = "balance" }

# [run]
# until = "auto"                       # or a time, such as "2 h"
# watch = "NOCl"
# report_at = ["10 min", "1 h"]

# [gases.NOCl]                         # where a gas is not known, or a value is to be replaced
# formula = "NOCl"
# cas = "2696-92-6"
# diameter = "4.1 angstrom"

[[steps]]
name = "decomposition"
reaction = "2 NOCl -> 2 NO + Cl2"      # one way; a bath partner is written + M on both sides
law = "collision"                      # or "arrhenius" (A, Ea, n, T_ref), "fixed" (k)
Ea = "102 kJ/mol"                      # an estimate to be replaced by yours
A_over_Z = 0.106                       # or steric = 0.064
reverse = "thermochemistry"            # or { Kp = "0.12 bar", at = "480 K" }, with enthalpy
# k_counts = "loss of NOCl"            # what a quoted k counts, where it is not events
# uncertainty = { factor = 1.5 }
# source = "where the numbers come from"

# [plan]                               # for limits, size, window and schedule
# warm_up = "3 min"
# patience = "8 h"
# detection = { NOCl = "0.5 torr" }
# tolerances = { "temperature.value" = "2 K", "fill.gases.NOCl" = "1 %" }
# [plan.samples]
# count = 6
# signal = "total pressure"            # or "concentration of NO", "partial pressure of NO"
# sd = "0.5 torr"
# dead_time = "3 min"
# takes = 0.01                         # share of the contents that a sample takes out

# [sweep]                              # for sweep: a grid; with samples = 1024 quasi-random
# observables = ["reaction time of NOCl to 10 %", "conversion of NOCl"]
# [sweep.vary]
# "temperature.value" = { between = ["440 K", "520 K"], points = 9 }
"""


def template_text(title: str) -> str:
    """The template with a title put in."""
    safe = title.replace("\\", " ").replace('"', "'")
    return _TEMPLATE.replace("@TITLE@", safe)
