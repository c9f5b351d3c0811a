#!/usr/bin/env python3
"""Write input/data/solar-cycle-idealised.csv: half waves of a cosine between the turning points of the sun's
activity. Usage: make_solar_cycle.py > input/data/solar-cycle-idealised.csv"""
import math

# Minima and maxima of the smoothed sunspot number, decimal years, alternating (Hathaway, Living Rev. Sol. Phys.
# 12, 4, 2015; from memory, about half a year), the last two cycles after it. From 2030 on every 11 years: invented.
TURNS = [1944.2, 1947.5, 1954.3, 1958.2, 1964.9, 1968.9, 1976.5, 1979.9, 1986.8, 1989.6, 1996.6, 2001.9, 2008.9, 2014.3,
         2019.9, 2024.8]
while TURNS[-1] < 2130:
    TURNS.append(TURNS[-2] + 11.0)

print("""# title: idealised cycle of the sun
# quantity: phase of the 11-year cycle, 0 at minimum and 1 at maximum, every cycle alike
# unit: year decimal, phase 1
# source: half waves of a cosine between the minima and maxima of the smoothed sunspot number (Hathaway, Living Rev. Sol. Phys. 12, 4, 2015)
# basis: turning points from memory, about half a year; after 2025 INVENTED, a turn every 11 years
# interpolation: linear
# note: strong and weak cycles differ twofold; give an index of your own, for instance (F10.7 - 70) / 130, where that matters
# made by: scripts/make_solar_cycle.py
year,phase""")
time, i = 1945.0, 0
while time <= 2110:
    while TURNS[i + 1] < time:
        i += 1
    part = (time - TURNS[i]) / (TURNS[i + 1] - TURNS[i])
    rising = i % 2 == 0  # the list starts with a minimum
    phase = 0.5 - 0.5 * math.cos(math.pi * part)
    print(f"{time:g},{phase if rising else 1 - phase:.4f}")
    time += 0.5
