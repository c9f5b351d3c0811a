#!/usr/bin/python3
"""Compute the spectral tables of inorganic gases that are published as coefficients.

Each function below holds the coefficients of one published expression with its citation and returns
one table of input/data/xs or input/data/yield. Running the script again reproduces the files byte for
byte; edit the coefficients here, never the CSV files it owns.

    scripts/make_spectra_inorganic.py [DATA_FOLDER]      default: input/data next to scripts/
"""
import math
import os
import sys

ME = "scripts/make_spectra_inorganic.py"
JPL = ("Burkholder, J. B., et al.: Chemical Kinetics and Photochemical Data for Use in Atmospheric "
       "Studies, Evaluation No. 19, JPL Publication 19-5 (2019)")
XS_UNIT = "wavelength_nm nm; sigma_* cm2 molecule-1"
PHI_UNIT = "wavelength_nm nm; phi_* 1"


# Second typing without sight of the first; DEVELOPERS.md tells what agreement is worth.
AGREE = "typed twice from memory, the two agree"


def pairs(text):
    """Rows of numbers from a block of text, one row a line."""
    return [[float(x) for x in line.split()] for line in text.strip().splitlines()]


def linear(nodes, x):
    """Piecewise linear through [(x, y)], held constant beyond the ends."""
    if x <= nodes[0][0]:
        return nodes[0][1]
    for (x0, y0), (x1, y1) in zip(nodes, nodes[1:]):
        if x <= x1:
            return y0 + (y1 - y0) * (x - x0) / (x1 - x0)
    return nodes[-1][1]


def steps(first, last, step):
    return [first + i * step for i in range(int(round((last - first) / step)) + 1)]


def sigma_columns(temperatures):
    return ["wavelength_nm"] + ["sigma_%gK" % t for t in temperatures]


def phi_columns(temperatures):
    return ["wavelength_nm"] + ["phi_%gK" % t for t in temperatures]


# --------------------------------------------------------------------------- cross sections

def nitrous_oxide():
    # Selwyn et al. 1977: ln sigma = polynomial in wavelength + (T - 300) exp(second polynomial);
    # 173 to 240 nm, 194 to 302 K. ln sigma is linear in T, so the two ends carry it exactly.
    a = (68.21023, -4.071805, 4.301146e-2, -1.777846e-4, 2.520672e-7)
    b = (123.4014, -2.116255, 1.111572e-2, -1.881058e-5)
    # Table of room-temperature values for the tail below the formula, 1e-20 cm2.
    tail = ((160, 4.30), (165, 5.61), (170, 8.30))
    ts = (194, 302)
    rows = [[w] + [s * 1e-20] * 2 for w, s in tail]
    for w in steps(173, 240, 1):
        base = sum(c * w**i for i, c in enumerate(a))
        slope = math.exp(sum(c * w**i for i, c in enumerate(b)))
        rows.append([w] + [math.exp(base + (t - 300.0) * slope) for t in ts])
    head = {
        "twice": AGREE,
        "quantity": "absorption cross section of N2O",
        "source": "Selwyn, G., Podolske, J., Johnston, H. S., Geophys. Res. Lett. 4, 427 (1977), as "
                  "recommended in " + JPL + ", Table 4C",
        "interpolation": "log",
        "uncertainty": "factor 1.2 (JPL 19-5, value from memory)",
        "note": "formula 173 to 240 nm; 160 to 170 nm room-temperature values (from memory), used at "
                "every temperature: light there is absorbed by O2 above 80 km",
    }
    return "xs/N2O.csv", head, sigma_columns(ts), rows


def nitric_acid():
    # Burkholder et al. 1993: wavelength, sigma at 298 K in 1e-20 cm2, B in 1e-3 K-1;
    # sigma(T) = sigma(298) exp(B (T - 298)), measured 240 to 360 K.
    table = pairs("""
192 1225 0
194 1095 0
196 940 1.70
198 770 1.65
200 588 1.66
202 447 1.69
204 328 1.74
206 231 1.77
208 156 1.85
210 104 1.97
212 67.5 2.08
214 43.9 2.17
216 29.2 2.17
218 20.0 2.21
220 14.9 2.15
222 11.8 2.06
224 9.61 1.96
226 8.02 1.84
228 6.82 1.78
230 5.75 1.80
232 4.87 1.86
234 4.14 1.90
236 3.36 1.97
238 2.93 1.97
240 2.58 1.97
242 2.34 1.88
244 2.16 1.75
246 2.06 1.61
248 2.00 1.44
250 1.97 1.34
252 1.96 1.23
254 1.95 1.18
256 1.95 1.14
258 1.93 1.12
260 1.91 1.14
262 1.87 1.14
264 1.83 1.18
266 1.77 1.22
268 1.70 1.25
270 1.62 1.45
272 1.53 1.49
274 1.44 1.56
276 1.33 1.64
278 1.23 1.69
280 1.12 1.78
282 1.01 1.87
284 0.909 1.94
286 0.807 2.04
288 0.709 2.15
290 0.615 2.27
292 0.532 2.38
294 0.453 2.52
296 0.381 2.70
298 0.316 2.92
300 0.263 3.10
302 0.208 3.24
304 0.167 3.52
306 0.133 3.77
308 0.105 3.91
310 0.0814 4.23
312 0.0628 4.70
314 0.0468 5.15
316 0.0362 5.25
318 0.0271 5.74
320 0.0197 6.45
322 0.0154 6.70
324 0.0108 7.16
326 0.00820 7.55
328 0.00613 8.16
330 0.00431 9.75
332 0.00319 9.93
334 0.00243 9.60
336 0.00196 10.5
338 0.00142 10.8
340 0.00103 11.8
342 0.00086 11.8
344 0.00069 9.30
346 0.00050 12.1
348 0.00042 11.9
350 0.00042 9.30
""")
    ts = (200, 298)
    rows = [[w] + [s * 1e-20 * math.exp(b * 1e-3 * (t - 298.0)) for t in ts] for w, s, b in table]
    head = {
        "twice": AGREE,
        "quantity": "absorption cross section of HNO3",
        "source": "Burkholder, J. B., Talukdar, R. K., Ravishankara, A. R., Solomon, S., J. Geophys. "
                  "Res. 98, 22937 (1993), as recommended in " + JPL + ", Table 4C",
        "interpolation": "log",
        "uncertainty": "factor 1.2 (JPL 19-5, value from memory)",
        "note": "sigma(T) = sigma(298 K) exp(B (T - 298)): both columns carry it exactly; measured 240 "
                "to 360 K, the expression is used down to 200 K",
    }
    return "xs/HNO3.csv", head, sigma_columns(ts), rows


def hydrogen_peroxide():
    # Nicovich and Wine 1988: two polynomials weighted by the population of the ground torsional
    # state; 1e-21 cm2, 260 to 350 nm, 200 to 400 K.
    a = (6.4761e4, -9.2170972e2, 4.535649, -4.4589016e-3, -4.035101e-5, 1.6878206e-7,
         -2.652014e-10, 1.5534675e-13)
    b = (6.8123e3, -5.1351e1, 1.1522e-1, -3.0493e-5, -1.0924e-7)
    # Room-temperature table below the formula, 1e-20 cm2.
    short = ((190, 67.2), (195, 56.4), (200, 47.5), (205, 40.8), (210, 35.7), (215, 30.7),
             (220, 25.8), (225, 21.7), (230, 18.2), (235, 15.0), (240, 12.4), (245, 10.2),
             (250, 8.30), (255, 6.70))
    ts = (200, 230, 260, 298)
    rows = [[w] + [s * 1e-20] * len(ts) for w, s in short]
    for w in steps(260, 350, 2):
        row = [w]
        for t in ts:
            chi = 1.0 / (1.0 + math.exp(-1265.0 / t))
            row.append(1e-21 * (chi * sum(c * w**i for i, c in enumerate(a))
                                + (1.0 - chi) * sum(c * w**i for i, c in enumerate(b))))
        rows.append(row)
    head = {
        "twice": AGREE,
        "quantity": "absorption cross section of H2O2",
        "source": "Nicovich, J. M., Wine, P. H., J. Geophys. Res. 93, 2417 (1988), 260 to 350 nm; "
                  "table 190 to 255 nm; both as recommended in " + JPL + ", Table 4B",
        "interpolation": "log",
        "uncertainty": "factor 1.15 (JPL 19-5, value from memory)",
        "note": "190 to 255 nm: 298 K values from memory, used at every temperature (no dependence "
                "recommended there)",
    }
    return "xs/H2O2.csv", head, sigma_columns(ts), rows


def dinitrogen_pentoxide():
    # Harwood et al. 1998: log10 sigma = A + 1000 B / T, 260 to 410 nm in steps of 10 nm, 233 to 295 K;
    # continued to 225 K, where Yao et al. 1982 measured too.
    a = (-18.27, -18.42, -18.59, -18.72, -18.84, -18.90, -18.93, -18.87, -18.77, -18.71, -18.31,
         -18.14, -18.01, -18.42, -18.59, -18.13)
    b = (-0.091, -0.104, -0.112, -0.135, -0.170, -0.226, -0.294, -0.388, -0.492, -0.583, -0.770,
         -0.885, -0.992, -0.949, -0.966, -1.160)
    # Yao et al. 1982, room temperature, 1e-20 cm2
    short = ((200, 920), (205, 820), (210, 560), (215, 370), (220, 220), (225, 144), (230, 99),
             (235, 77), (240, 62), (245, 52), (250, 40), (255, 32))
    ts = (225, 250, 275, 295)
    rows = [[w] + [s * 1e-20] * len(ts) for w, s in short]
    for i, w in enumerate(steps(260, 410, 10)):
        rows.append([w] + [10.0 ** (a[i] + 1000.0 * b[i] / t) for t in ts])
    head = {
        "quantity": "absorption cross section of N2O5",
        "source": "Harwood, M. H., et al., J. Phys. Chem. A 102, 1309 (1998): log10 sigma = A + 1000 B/T "
                  "from 260 nm, as recommended in " + JPL + ", Table 4C; below, Yao, F., Wilson, I., "
                  "Johnston, H., J. Phys. Chem. 86, 3611 (1982)",
        "twice": "to 255 nm typed twice from memory, the two agree; A and B typed once, but at 298 K "
                 "they are within 4 % of the formula of Yao et al. from 290 to 360 nm, which both "
                 "typings have",
        "interpolation": "log",
        "uncertainty": "factor 1.3 (JPL 19-5, value from memory)",
        "note": "200 to 255 nm: room-temperature values, used at every temperature; zero beyond 410 nm. A "
                "and B hold for 233 to 295 K and are continued to 225 K, to where the formula of Yao et "
                "al. holds, within 11 % of it from 290 to 350 nm. That formula, used before, does not "
                "meet its own table at 280 nm",
    }
    return "xs/N2O5.csv", head, sigma_columns(ts), rows


def hydroperoxyl():
    # Tyndall et al. 2001 critical fit: sigma = A / (1 - b/v) exp(-a ln((v - b)/(vm - b))^2),
    # v wavenumber in cm-1; room temperature, 190 to 260 nm.
    top, a, b, middle = 1.64e-18, 4.91, 30612.0, 50260.0
    rows = []
    for w in steps(190, 260, 2.5):
        v = 1e7 / w
        x = math.log((v - b) / (middle - b))
        rows.append([w, top / (1.0 - b / v) * math.exp(-a * x * x)])
    head = {
        "twice": "typed twice from memory; the second set, distrusted when typed, is too "
                 "narrow: 0.6 of this at 230 nm, 0.04 at 260 nm",
        "quantity": "absorption cross section of HO2",
        "source": "Tyndall, G. S., et al., J. Geophys. Res. 106, 12157 (2001), fit to the critically "
                  "evaluated spectra, as recommended in " + JPL + ", Table 4B",
        "interpolation": "log",
        "uncertainty": "15 % at 190 to 250 nm (estimate); coefficients from memory, checked against "
                       "the published 3.4e-18 cm2 at 220 nm and about 4.5e-19 cm2 at 250 nm",
        "note": "room temperature",
    }
    return "xs/HO2.csv", head, sigma_columns((298,)), rows


def nitrogen_dioxide():
    # Davidson et al. 1988 and Schneider et al. 1987 as means over the WMO intervals: upper edge of
    # the interval in nm, sigma at 0 C in 1e-20 cm2, slope in 1e-22 cm2 per degree.
    first = 202.02
    table = pairs("""
204.08 41.45 0
206.19 44.78 0
208.33 44.54 0
210.53 46.41 0
212.77 48.66 0
215.06 48.18 0
217.39 50.22 0
219.78 44.41 0
222.22 47.13 0
224.72 37.72 0
227.27 39.29 0
229.89 27.40 0
232.56 27.78 0
235.29 16.89 0
238.09 16.18 0
240.96 8.812 0
243.90 7.472 0
246.91 3.909 0
250.00 2.753 0
253.17 2.007 0
256.41 1.973 0
259.74 2.111 0
263.16 2.357 0
266.67 2.698 0
270.27 3.247 0
273.97 3.785 0
277.78 5.030 0.075
281.69 5.880 0.082
285.71 7.000 -0.053
289.85 8.150 -0.043
294.12 9.720 -0.031
298.51 11.54 -0.162
303.03 13.44 -0.284
307.69 15.89 -0.357
312.50 18.67 -0.536
317.5 21.53 -0.686
322.5 24.77 -0.786
327.5 28.07 -1.105
332.5 31.33 -1.355
337.5 34.25 -1.277
342.5 37.98 -1.612
347.5 40.65 -1.890
352.5 43.13 -1.219
357.5 47.17 -1.921
362.5 48.33 -1.095
367.5 51.66 -1.322
372.5 53.15 -1.102
377.5 55.08 -0.806
382.5 56.44 -0.867
387.5 57.57 -0.945
392.5 59.27 -0.923
397.5 58.45 -0.738
402.5 60.21 -0.599
407.5 57.81 -0.545
412.5 59.99 -1.129
417.5 56.51 0.001
422.5 58.12 -1.208
""")
    # Absorption only (nothing dissociates there): rounded means of the visible spectrum, 1e-20 cm2.
    visible = ((430, 57), (440, 54), (450, 48), (460, 42), (470, 36), (480, 32), (490, 25),
               (500, 21), (510, 17.5), (520, 14.5), (530, 11.5), (540, 9.3), (550, 7.3), (560, 5.8),
               (580, 3.3), (600, 1.8), (620, 1.0), (650, 0.5))
    ts = (220, 250, 273.15, 298)
    rows, low = [], first
    for high, s, a in table:
        rows.append([0.5 * (low + high)] + [s * 1e-20 + a * 1e-22 * (t - 273.15) for t in ts])
        low = high
    rows += [[w] + [s * 1e-20] * len(ts) for w, s in visible]
    head = {
        "twice": "typed twice from memory: the same to 237 nm, and within 9 % from 288 to 415 nm "
                 "once a shift of one row in the second was undone; between, the second has a newer, "
                 "lower table (0.5 to 0.9 of this, near 250 nm 0.1 to 0.5); other wavelengths and "
                 "temperatures typed once",
        "quantity": "absorption cross section of NO2",
        "source": "means over the WMO intervals as evaluated by NASA/JPL (Publications 94-26 and "
                  "97-4: Schneider et al. 1987; Davidson et al., J. Geophys. Res. 93, 7105 (1988)); "
                  "Vandaele et al. (1998), recommended in JPL 19-5, differ by 2 to 3 %",
        "interpolation": "log",
        "uncertainty": "factor 1.1 (estimate for the interval means)",
        "note": "sigma(T) = sigma(0 C) + a (T - 273.15); rows at the middle of each interval; beyond 424 "
                "nm, where nothing dissociates, rounded values without temperature dependence",
    }
    return "xs/NO2.csv", head, sigma_columns(ts), rows


def ozone():
    # 298 K. Far ultraviolet rounded; 175.4 to 290 nm WMO interval means at interval middles (Molina
    # and Molina); 1 nm values 290 to 347 nm; WMO 5 nm means of the Chappuis bands. 1e-20 cm2.
    far = ((120, 2100), (121.567, 2270), (123, 2000), (125, 1600), (127.5, 1050), (130, 850),
           (132.5, 1150), (135, 1650), (137.5, 1450), (140, 1000), (145, 480), (150, 290), (155, 180),
           (160, 115), (165, 85), (170, 80), (172.5, 81))
    wmo_edges = [1e7 / (57000 - 500 * i) for i in range(47)]
    wmo = pairs("""
81.1 79.9 78.6 76.3 72.9 68.8 62.2 57.6 52.6 47.6 42.8 38.3 34.7 32.3 31.4 32.6 36.4 43.4 54.2 69.9
92.1 119 155 199 256 323 400 483 579 686 797 900 1000 1080 1130 1150 1120 1060 965 834 692 542 402
277 179
""")
    wmo = [s for line in wmo for s in line]
    fine = (290, (142, 125, 109, 97, 86, 75.5, 66.0, 57.5, 50.5, 44.4,
                  39.2, 34.3, 30.3, 26.2, 23.4, 20.1, 17.9, 15.5, 13.5, 12.2,
                  10.2, 9.24, 7.95, 6.91, 6.25, 5.19, 4.77, 4.02, 3.72, 2.89,
                  2.99, 2.10, 2.05, 1.55, 1.05, 1.30, 1.14, 0.93, 0.86, 0.60,
                  0.55, 0.61, 0.47, 0.33, 0.37, 0.25, 0.20, 0.22, 0.17, 0.12,
                  0.112, 0.112, 0.072, 0.065, 0.072, 0.062, 0.051, 0.044))
    visible = ((350, 0.0266), (355, 0.0109), (360, 0.00549), (365, 0.0027), (370, 0.0016),
               (375, 0.0011), (380, 0.0009), (385, 0.0008), (390, 0.0009), (395, 0.0010),
               (400, 0.0012), (405, 0.0018))
    chappuis = (410, 5, (
        .00291, .00314, .00399, .00654, .00683, .00866, .0125, .0149, .0171, .0212, .0357, .0368,
        .0406, .0489, .0711, .0843, .0828, .0909, .122, .162, .158, .160, .178, .207, .255, .274,
        .288, .307, .317, .336, .388, .431, .467, .475, .455, .435, .442, .461, .489, .484, .454,
        .424, .390, .360, .343, .317, .274, .261, .242, .220, .202, .185, .167, .154, .142, .125,
        .112, .102, .092, .084, .077, .069, .063, .057, .0525, .0475, .0447, .042, .0375, .0325,
        .0292, .0276, .027, .028, .0285, .0252, .022, .0182, .0163, .0175, .019, .0185, .0167,
        .014, .0125, .0115, .0108, .0105, .010))
    # ln of the ratio 218 K : 298 K, and the share of it that 243 K and 273 K reach (the quadratic
    # temperature form of Bass and Paur 1985 / Malicet et al. 1995).
    ratio = ((230, 1.0), (240, 0.99), (247, 1.005), (254, 1.010), (260, 1.008), (265, 1.0),
             (270, 0.995), (275, 0.99), (280, 0.982), (285, 0.975), (290, 0.962), (295, 0.948),
             (300, 0.925), (305, 0.90), (310, 0.872), (315, 0.842), (320, 0.815), (325, 0.735),
             (330, 0.65), (335, 0.57), (340, 0.48), (345, 0.42), (350, 0.42), (360, 0.55),
             (370, 0.8), (380, 1.0))
    share = {218: 1.0, 243: 0.77, 273: 0.385, 298: 0.0}
    points = list(far)
    points += [(0.5 * (lo + hi), s) for lo, hi, s in zip(wmo_edges, wmo_edges[1:], wmo)]
    points = [p for p in points if p[0] < 289.0]
    points += [(fine[0] + i, s) for i, s in enumerate(fine[1])]
    points += list(visible)
    points += [(chappuis[0] + chappuis[1] * i, s) for i, s in enumerate(chappuis[2])]
    ts = (218, 243, 273, 298)
    rows = [[w] + [s * 1e-20 * math.exp(share[t] * math.log(linear(ratio, w))) for t in ts]
            for w, s in points]
    head = {
        "twice": AGREE + " at the 153 wavelengths of the second (176 to 288 nm, some from 300 nm on) "
                 "but one: 334 nm, 16 % higher there, a value for a line and no mean",
        "quantity": "absorption cross section of O3",
        "source": JPL + ", Table 4A (Molina and Molina 1986 and Malicet et al. 1995 for the Hartley "
                  "and Huggins bands; WMO 1985 interval means for the Chappuis bands); below 175 nm "
                  "rounded after Tanaka et al. (1953) and Mason et al. (1996)",
        "interpolation": "log",
        "uncertainty": "factor 1.1 (JPL 19-5); about 5 % 200 to 320 nm; Huggins structure beyond 322 nm "
                       "10 to 20 % at a single nanometre, 5 % in 5 nm means",
        "note": "298 K values from memory: interval means at interval middles to 289 nm and from 350 nm on, "
                "1 nm values between. 323 to 347 nm: the band structure was drawn so that 5 nm means meet "
                "the published ones (1.20, 0.617, 0.274, 0.117, 0.0588e-20 cm2). 218 K column: 298 K times "
                "a ratio smooth in wavelength; agrees within 5 % with the Dobson and Brewer absorption "
                "coefficients. Temperature dependence beyond 345 nm is an extrapolation",
    }
    return "xs/O3.csv", head, sigma_columns(ts), rows


# --------------------------------------------------------------------------- quantum yields

def ozone_singlet():
    # Matsumi et al. 2002, 306 to 328 nm, 200 to 320 K.
    x1, x2, x3 = 304.225, 314.957, 310.737
    w1, w2, w3 = 5.576, 6.601, 2.187
    a1, a2, a3 = 0.8036, 8.9061, 0.1192
    v2, c, gas = 825.518, 0.0765, 0.695
    ts = steps(180, 320, 20)

    def yield_at(w, t):
        q2 = math.exp(-v2 / (gas * t))
        return (a1 * math.exp(-((x1 - w) / w1)**4) / (1.0 + q2)
                + q2 / (1.0 + q2) * a2 * (t / 300.0)**2 * math.exp(-((x2 - w) / w2)**2)
                + a3 * (t / 300.0)**1.5 * math.exp(-((x3 - w) / w3)**2) + c)

    # Below 220 nm the evaluation gives phi = 1.37e-2 w - 2.16 (193 to 225 nm), 0.90 up to 305 nm.
    rows = [[w] + [min(0.90, 1.37e-2 * w - 2.16)] * len(ts) for w in (193, 200, 205, 210, 215, 220)]
    rows += [[w] + [0.90] * len(ts) for w in (223.4, 305)]
    rows += [[w] + [yield_at(w, t) for t in ts] for w in steps(306, 328, 0.5)]
    rows += [[329] + [0.08] * len(ts), [340] + [0.08] * len(ts), [341] + [0.0] * len(ts)]
    head = {
        "twice": AGREE,
        "quantity": "quantum yield of O(1D) in the photolysis of O3",
        "source": "Matsumi, Y., et al., J. Geophys. Res. 107 (D3), 4024 (2002), equation and Table of "
                  "parameters, as recommended in " + JPL + ", Section 4",
        "uncertainty": "10 % where above 0.4, 0.04 absolute beyond 328 nm (JPL 19-5)",
        "note": "formula 306 to 328 nm (given for 200 to 320 K; the 180 K column extrapolates); 0.90 up to "
                "305 nm; 1.37e-2 w - 2.16 from 193 nm up to where that reaches 0.90; 0.08 from 329 to 340 "
                "nm, zero beyond; held at 0.484 below 193 nm",
    }
    return "yield/O3-O1D.csv", head, phi_columns(ts), rows


# JPL 97-4 / Moortgat et al. 1983 (300 K, one atmosphere): wavelength, H + HCO, H2 + CO.
FORMALDEHYDE = pairs("""
240 0.27 0.49
250 0.29 0.49
260 0.30 0.49
270 0.38 0.43
280 0.57 0.32
290 0.73 0.24
301.25 0.749 0.251
303.75 0.753 0.247
306.25 0.753 0.247
308.75 0.748 0.252
311.25 0.739 0.261
313.75 0.724 0.276
316.25 0.684 0.316
318.75 0.623 0.368
321.25 0.559 0.423
323.75 0.492 0.480
326.25 0.420 0.550
328.75 0.343 0.634
331.25 0.259 0.697
333.75 0.168 0.739
336.25 0.093 0.728
338.75 0.033 0.667
341.25 0.003 0.602
343.75 0.001 0.535
346.25 0 0.469
348.75 0 0.405
351.25 0 0.337
353.75 0 0.265
356.25 0 0.197
""")
FORMALDEHYDE_SOURCE = ("Moortgat, G. K., Seiler, W., Warneck, P., J. Chem. Phys. 78, 1185 (1983), as "
                       "evaluated in JPL Publication 97-4; JPL 19-5 agrees within about 5 %")


def formaldehyde_radical():
    rows = [[w, radical] for w, radical, _ in FORMALDEHYDE]
    head = {
        "twice": AGREE,
        "quantity": "quantum yield of H + HCO in the photolysis of CH2O",
        "source": FORMALDEHYDE_SOURCE,
        "uncertainty": "factor 1.4 for cross section times yield (JPL 19-5, value from memory)",
        "note": "yields of the source from memory, 300 K, no pressure dependence",
    }
    return "yield/CH2O-H.csv", head, ["wavelength_nm", "phi_300K"], rows


def formaldehyde_molecular():
    # Beyond 329 nm the molecular channel is quenched: 1/phi = 1/(1 - phi_radical) + sv M with sv from
    # the yields at one atmosphere and 300 K, M = 2.465e19 cm-3 (Moortgat et al. 1983).
    one_atmosphere = 2.465e19
    rows = []
    for w, radical, molecular in FORMALDEHYDE:
        if w < 329.0:
            rows.append([w, molecular, 0.0])
        else:
            free = 1.0 - radical
            rows.append([w, free, (1.0 / molecular - 1.0 / free) / one_atmosphere])
    head = {
        "twice": AGREE,
        "quantity": "quantum yield of H2 + CO in the photolysis of CH2O",
        "source": FORMALDEHYDE_SOURCE,
        "uncertainty": "factor 1.4 for cross section times yield (JPL 19-5, value from memory)",
        "note": "phi = 1/(1/phi + sv M): phi is the yield without quenching; yields of the source from "
                "memory; quenching for 300 K (at 220 K it is up to twice as strong at the red end)",
    }
    return "yield/CH2O-H2.csv", head, ["wavelength_nm", "phi_300K", "stern_volmer_cm3"], rows


TABLES = (nitrous_oxide, nitric_acid, hydrogen_peroxide, dinitrogen_pentoxide, hydroperoxyl,
          nitrogen_dioxide, ozone, ozone_singlet, formaldehyde_radical, formaldehyde_molecular)


def write(folder, name, head, columns, rows):
    is_yield = name.startswith("yield/")
    unit = PHI_UNIT if is_yield else XS_UNIT
    if "stern_volmer_cm3" in columns:
        unit += "; stern_volmer_cm3 cm3"
    lines = ["# quantity: " + head["quantity"], "# unit: " + unit, "# source: " + head["source"],
             "# basis: computed by " + ME + " (coefficients and tables there from memory); "
             + head["twice"],
             "# interpolation: " + head.get("interpolation", "linear"),
             "# uncertainty: " + head["uncertainty"], "# note: " + head["note"], ",".join(columns)]
    previous = -math.inf
    for row in rows:
        if row[0] <= previous or any(x < 0.0 for x in row):
            raise ValueError("%s: row at %g nm is out of order or negative" % (name, row[0]))
        previous = row[0]
        lines.append(",".join(["%.6g" % row[0]] + ["%.4g" % x for x in row[1:]]))
    with open(os.path.join(folder, name), "w", encoding="ascii", newline="\n") as out:
        out.write("\n".join(lines) + "\n")


def main():
    here = os.path.dirname(os.path.abspath(__file__))
    folder = sys.argv[1] if len(sys.argv) > 1 else os.path.join(here, "..", "input", "data")
    for table in TABLES:
        write(folder, *table())


if __name__ == "__main__":
    main()
