#!/usr/bin/env python3
"""Write input/data/air-45N-by-month.csv and air-45N.csv (its annual mean) from the mid-latitude summer and winter
atmospheres, taken as mid-July and mid-January, with one harmonic between. Usage: make_air_by_month.py FOLDER"""
import math
import pathlib
import sys

# altitude km; summer hPa, K; winter hPa, K. Anderson et al., AFGL Atmospheric Constituent Profiles (AFGL-TR-86-0110,
# 1986), after McClatchey et al. (1972); from memory, about 2 K and 2 %, above 70 km 5 K
ROWS = """
0 1013 294.2 1018 272.2
1 902 289.7 897.3 268.7
2 802 285.2 789.7 265.2
3 710 279.2 693.8 261.7
4 628 273.2 608.1 255.7
5 554 267.2 531.3 249.7
6 487 261.2 462.7 243.7
7 426 254.7 401.6 237.7
8 372 248.2 347.3 231.7
9 324 241.7 299.3 225.7
10 281 235.3 256.8 219.7
11 243 228.8 219.9 219.2
12 209 222.3 188.2 218.7
13 179 215.8 161.1 218.2
14 153 215.7 137.8 217.7
15 130 215.7 117.8 217.2
16 111 215.7 100.7 216.7
17 95.0 215.7 86.1 216.2
18 81.2 216.8 73.6 215.7
19 69.5 217.9 62.8 215.2
20 59.5 219.2 53.7 215.2
22 43.7 221.6 39.1 215.2
24 32.2 223.9 28.6 215.2
25 27.7 225.1 24.4 215.2
27.5 19.07 228.45 16.46 215.5
30 13.2 233.7 11.1 217.4
32.5 9.30 239.0 7.56 220.4
35 6.52 245.2 5.18 227.9
37.5 4.64 251.3 3.60 235.5
40 3.33 257.5 2.53 243.2
42.5 2.41 263.7 1.80 250.8
45 1.76 269.9 1.29 258.5
47.5 1.29 275.2 0.940 265.1
50 0.951 275.7 0.683 265.7
55 0.515 269.3 0.362 260.6
60 0.272 257.1 0.188 250.8
65 0.139 240.1 0.0950 240.9
70 0.0670 218.1 0.0470 230.7
75 0.0300 196.1 0.0222 220.4
80 0.0120 174.1 0.0103 210.1
85 0.00448 165.1 0.00456 199.8
90 0.00164 165.0 0.00198 189.0
"""
HEADER = """# title: air of 45 degrees north{what}
# quantity: temperature and pressure against geometric altitude{by}
# unit: altitude_km in km, temperature_K in K, pressure_Pa in Pa
# source: mid-latitude summer and winter atmospheres of Anderson et al. (AFGL-TR-86-0110, 1986) after McClatchey et al. (1972), as mid-July and mid-January, with one harmonic between
# basis: from memory, about 2 K and 2 %, above 70 km 5 K; the months between are the harmonic, about 3 K
# interpolation: temperature linear, pressure linear in its logarithm
# made by: scripts/make_air_by_month.py
"""

folder = pathlib.Path(sys.argv[1])
rows = [[float(cell) for cell in line.split()] for line in ROWS.split("\n") if line]
with open(folder / "air-45N.csv", "w") as out:
    out.write(HEADER.format(what=", annual mean", by="") + "altitude_km,temperature_K,pressure_Pa\n")
    for z, p1, t1, p2, t2 in rows:
        out.write(f"{z:g},{0.5 * (t1 + t2):.2f},{100 * math.sqrt(p1 * p2):.5g}\n")
with open(folder / "air-45N-by-month.csv", "w") as out:
    out.write(HEADER.format(what=", by month", by=", by month (values at mid-month)"))
    out.write("month,altitude_km,temperature_K,pressure_Pa\n")
    for month in range(1, 13):
        winter = 0.5 + 0.5 * math.cos(2 * math.pi * (month - 1) / 12)
        for z, p1, t1, p2, t2 in rows:
            p = math.exp(winter * math.log(p2) + (1 - winter) * math.log(p1))
            out.write(f"{month},{z:g},{winter * t2 + (1 - winter) * t1:.2f},{100 * p:.5g}\n")
