#!/usr/bin/python3
"""Write the halogen absorption cross sections that are published as formulas or as table plus slope.

Every gas below is one record: a published polynomial, a published 298 K table, or both, and a
temperature dependence.  The script only evaluates them; it adjusts nothing.

    make_spectra_halogen.py [DIRECTORY]     default: input/data/xs beside this script's folder

Form of the polynomials (JPL Publication 19-5, section 4):

    log10 sigma(lambda, T) = sum_i A_i lambda^i + (T - T0) sum_i B_i lambda^i      lambda in nm

log sigma is linear in T, so two temperature columns reproduce the formula exactly at every
temperature between them; outside, the program holds the end columns, as the measured range asks.
"""
import math
import pathlib
import sys

JPL = ("Burkholder et al. 2019, Chemical Kinetics and Photochemical Data for Use in Atmospheric "
       "Studies, Evaluation 19, JPL Publication 19-5, section 4")
T_COLD, T_ROOM = 210.0, 298.0

# name: (work the fit rests on, T0 K, first nm, last nm, A, B)
POLYNOMIAL = {
    "CFC-113": ("Simon et al. 1988 (Ann. Geophys. 6, 239)", 273, 182, 230,
                [-1087.9, 20.004, -1.3920e-1, 4.2828e-4, -4.9384e-7],
                [12.493, -2.3937e-1, 1.7142e-3, -5.4393e-6, 6.4548e-9]),
    "CFC-114": ("Simon et al. 1988 (Ann. Geophys. 6, 239)", 273, 172, 220,
                [-160.50, 2.4807, -1.5202e-2, 3.8412e-5, -3.4373e-8],
                [-1.5296, 3.5248e-2, -2.9951e-4, 1.1129e-6, -1.5259e-9]),
    "CFC-115": ("Simon et al. 1988 (Ann. Geophys. 6, 239); no temperature dependence observed",
                273, 172, 204, [5.8281, -2.990e-1, 1.3525e-3, -2.6851e-6], []),
    "CCl4": ("Simon et al. 1988 (J. Atmos. Chem. 7, 107)", 273, 198, 250,
             [-37.104, -5.8218e-1, 9.9974e-3, -4.6765e-5, 6.8501e-8],
             [1.0739, -1.6275e-2, 8.8141e-5, -1.9811e-7, 1.5022e-10]),
    "CH3CCl3": ("Gillotay and Simon 1990 (Ann. Geophys. 8, 41)", 273, 182, 240,
                [341.085191, -7.273362, 5.498387e-2, -1.827552e-4, 2.238640e-7],
                [-1.660090, 3.079969e-2, -2.106719e-4, 6.264984e-7, -6.781342e-10]),
    "HCFC-22": ("Simon et al. 1988 (J. Atmos. Chem. 7, 107)", 273, 174, 204,
                [-106.029, 1.5038, -8.2476e-3, 1.4206e-5],
                [-1.3399e-1, 2.7405e-3, -1.8028e-5, 3.8504e-8]),
    "HCFC-141b": ("Gillotay and Simon 1991 (J. Atmos. Chem. 12, 269)", 273, 172, 240,
                  [-682.913042, 12.122290, -8.187699e-2, 2.437244e-4, -2.719103e-7],
                  [4.074747, -8.053899e-2, 5.946552e-4, -1.945048e-6, 2.380143e-9]),
    "HCFC-142b": ("Gillotay and Simon 1991 (J. Atmos. Chem. 12, 269)", 273, 172, 230,
                  [-328.092008, 6.342799, -4.810362e-2, 1.611991e-4, -2.042613e-7],
                  [4.289533e-1, -9.042817e-3, 7.018009e-5, -2.389064e-7, 3.039799e-10]),
    "halon-1211": ("Gillotay and Simon 1989 (J. Atmos. Chem. 8, 41); Burkholder et al. 1991 "
                   "(J. Geophys. Res. 96, 5025)", 273, 200, 304,
                   [-134.80, 1.7084, -9.1540e-3, 2.1644e-5, -1.9863e-8],
                   [3.3070e-1, -5.0957e-3, 2.9361e-5, -7.6198e-8, 7.6825e-11]),
    # Valid from 222 nm; the constant is printed to 0.1 only (up to 12 %), so where there is a
    # published table, to 280 nm, the table stands.
    "halon-1202": ("Gillotay and Simon 1989; Burkholder et al. 1991", 273, 282, 330,
                   [-206.2, 2.3726, -1.0527e-2, 1.9239e-5, -1.2242e-8], []),
    "halon-1301": ("Gillotay and Simon 1989; Burkholder et al. 1991", 273, 178, 266,
                   [62.563, -2.0068, 1.6592e-2, -5.6465e-5, 6.7459e-8],
                   [-9.1755e-1, 1.8575e-2, -1.3857e-4, 4.5066e-7, -5.3803e-10]),
    "halon-2402": ("Gillotay et al. 1988; Burkholder et al. 1991", 273, 190, 286,
                   [34.026, -1.152616, 8.959798e-3, -2.9089e-5, 3.307212e-8],
                   [4.010664e-1, -8.358968e-3, 6.415741e-5, -2.157554e-7, 2.691871e-10]),
    "CH3Br": ("Gillotay et al. 1988", 273, 200, 280,
              [46.520, -1.4580, 1.1469e-2, -3.7627e-5, 4.3264e-8],
              [9.3408e-1, -1.6887e-2, 1.1487e-4, -3.4881e-7, 3.9945e-10]),
    "CH3Cl": ("Simon et al. 1988 (J. Atmos. Chem. 7, 107)", 273, 174, 216,
              [-299.80, 5.1047, -3.3630e-2, 9.5805e-5, -1.0135e-7],
              [-7.1727, 1.4837e-1, -1.1463e-3, 3.9188e-6, -4.9994e-9]),
    "CH2Br2": ("Gillotay et al. 1988", 273, 210, 290,
               [-70.211776, 1.940326e-1, 2.726152e-3, -1.695472e-5, 2.500066e-8],
               [2.899280, -4.327724e-2, 2.391599e-4, -5.807506e-7, 5.244883e-10]),
    "CH2Cl2": ("Simon et al. 1988 (J. Atmos. Chem. 7, 107)", 273, 176, 220,
               [-1431.8, 27.395, -1.9807e-1, 6.3468e-4, -7.6298e-7],
               [-3.1171, 6.7874e-2, -5.5000e-4, 1.9649e-6, -2.6101e-9]),
    # Published with (296 - T); the signs of B are turned here to the common form.
    "CHBr3": ("Papanastasiou et al. 2014 (Atmos. Chem. Phys. 14, 3017)", 296, 260, 344,
              [-32.6067, 0.10308, 6.39e-5, -7.7392e-7, -2.2513e-9, 6.1376e-12],
              [-0.1582, 0.0014758, -3.8058e-6, -9.187e-10, 1.0772e-11]),
    "CHCl3": ("Simon et al. 1988 (J. Atmos. Chem. 7, 107)", 273, 190, 240,
              [269.80, -6.0908, 4.7830e-2, -1.6427e-4, 2.0682e-7],
              [3.7973, -7.0913e-2, 4.9397e-4, -1.5226e-6, 1.7555e-9]),
}

# 298 K tables, 1e-20 cm2: (first nm, step nm, values), several runs per gas.  They stand alone or
# continue a polynomial on the short side, where the fits do not reach.
TABLE = {
    "CFC-11": [(170, 2, [316, 319, 315, 311, 304, 308, 285, 260, 233, 208, 178, 149, 123, 99.0,
                         80.1, 64.7, 50.8, 38.8, 29.3, 21.2, 15.4, 10.9, 7.52, 5.28, 3.56, 2.42,
                         1.60, 1.10, 0.80, 0.55, 0.35]),
               (235, 5, [0.126, 0.0464, 0.0173, 0.00661, 0.00337, 0.00147])],
    "CFC-12": [(170, 2, [124, 151, 171, 183, 189, 173, 157, 137, 104, 84.1, 62.8, 44.5, 30.6, 20.8,
                         13.2, 8.90, 5.51, 3.27, 2.09, 1.27, 0.760, 0.450, 0.270, 0.160, 0.100,
                         0.0600, 0.0360, 0.0220, 0.0130, 0.0084, 0.0053]),
               (235, 5, [0.0016, 0.00029])],
    "CCl4": [(174, 2, [995, 1007, 976, 772, 589, 450, 318, 218, 144, 98.9, 74.4, 68.2])],
    "halon-1211": [(174, 2, [111, 99, 83, 68, 56, 49, 48, 52, 62, 73, 84, 95, 107])],
    "halon-1202": [(190, 2, [114, 109, 100, 91, 82, 75, 72, 74, 81, 93, 110, 136, 155, 180, 203, 224,
                             242, 251, 253, 250, 241, 227, 209, 189, 168, 147, 126, 106, 88, 73, 59,
                             47, 37, 29, 23, 18, 13, 10, 7.6, 5.7, 4.2, 3.1, 2.2, 1.6, 1.2, 0.89])],
    "CH3Br": [(174, 2, [44.0, 36.0, 31.0, 28.5, 28.0, 29.5, 33.0, 38.0, 44.0, 53.1, 62.5, 66.0,
                        72.0])],
    "CH2Br2": [(190, 5, [140, 185, 215, 223])],
    "CHCl3": [(175, 5, [440, 330, 210])],
    "CHBr3": [(190, 2, [399, 360, 351, 366, 393, 416, 433, 440, 445, 451, 468, 493, 524, 553, 574,
                        582, 578, 558, 527, 487, 441, 397, 362, 324, 295, 273, 253, 234, 214, 194,
                        174, 158, 136, 116, 99])],
}

# d ln(sigma)/dT in 1/K as function of wavelength for gases without a polynomial B, with words.
SLOPE = {
    "CFC-11": (lambda nm: 1.0e-4 * max(nm - 184.9, 0.0) if nm <= 230 else 1.0e-4 * 45.1,
               "sigma(T) = sigma(298 K) exp(1.0e-4 (lambda - 184.9)(T - 298)), 184.9 to 230 nm, "
               "210 to 300 K; slope of 230 nm kept beyond, none below 184.9 nm. McGillen et al. "
               "2013 found a somewhat weaker dependence"),
    "CFC-12": (lambda nm: 4.1e-4 * max(nm - 184.9, 0.0) if nm <= 230 else 4.1e-4 * 45.1,
               "sigma(T) = sigma(298 K) exp(4.1e-4 (lambda - 184.9)(T - 298)), 184.9 to 230 nm, "
               "210 to 300 K; slope of 230 nm kept beyond, none below 184.9 nm"),
    "halon-1202": (lambda nm: 0.0 if nm < 240 else 1.6e-4 * (min(nm, 330.0) - 240.0),
                   "slope rising from zero at 240 nm by 1.6e-4 per K and nm: an estimate after "
                   "halon-1211, whose band lies 20 nm shorter; the published B is not recalled, and "
                   "no slope was typed a second time"),
}

# Continuation beyond the fitted range to this wavelength, along log sigma at its last slope.
TAIL_TO = {"CFC-115": 220, "HCFC-22": 216, "CFC-114": 226, "CFC-113": 240, "CH3Cl": 226,
           "CH2Cl2": 230}

# Lyman-alpha, 121.6 nm, cm2.  The rows about 1e-30 keep interpolation from filling the gap.
LYMAN_ALPHA = {"CFC-115": 4.57e-18}

COLD_LIMIT = {"CH2Br2": 250.0, "CHBr3": 240.0}     # narrower measured temperature ranges

SHARE = {"CFC-11": "10 %", "CFC-12": "10 %", "CFC-113": "15 %", "CCl4": "10 %", "HCFC-22": "15 %",
         "CHBr3": "15 %", "halon-1202": "15 % (30 % from 282 nm)",
         "CHCl3": "20 % (40 % below 190 nm)"}    # others 20 %

NOTE = {
    "CFC-113": "the published B give a small maximum of sigma(210 K)/sigma(298 K) near 190 nm",
    "halon-1211": "174 to 198 nm is a 298 K table recalled to about 20 %",
    "halon-1202": "190 to 280 nm is the published 298 K table; below, no value is recalled and it counts "
                  "as zero: such light reaches no height where the gas survives",
    "CH3Br": "174 to 198 nm is a 298 K table recalled to about 20 %",
    "CH2Br2": "190 to 205 nm is a 298 K table recalled to about 20 %",
    "CHCl3": "175 to 185 nm is an estimate at 298 K. OH, not light, removes nearly all CHCl3",
    "CCl4": "174 to 196 nm is the 298 K table: near 194 nm the fit runs 15 % below it",
    "CFC-11": "the updated parameterization of McGillen et al. 2013 is not recalled; the earlier "
              "recommended table and slope stand here",
}


# Second typing from memory, without sight of the first; DEVELOPERS.md tells what agreement is worth.
AGREE = "typed twice from memory, the two agree"
TWICE = {
    "CCl4": AGREE + ", but at 298 K the fit used here and the printed table, which the second typed, "
            "part by -10 % at 226 nm and +16 % at 250 nm",
    "CFC-11": "typed twice from memory, 298 K table against the older one of Simon et al.: within "
              "10 % but for 14 % at 222 and 224 nm; 235 to 260 nm typed once",
    "CFC-12": "typed twice from memory, 298 K table against the older one of Simon et al.: within "
              "8 %; 235 and 240 nm typed once",
    "CFC-115": AGREE + " from 172 to 204 nm",
    "CH2Cl2": AGREE + " from 176 nm on",
    "CH3Br": AGREE + " from 190 nm on",
    "CH3Cl": AGREE + " to 220 nm; beyond, the second follows the polynomial, 12 % lower at 226 nm",
    "CHBr3": AGREE + " at 190 to 256 nm; the fit beyond was typed once (the older Moortgat formula "
             "is within 5 % at 290 to 310 nm, 45 % higher at 340 nm and 298 K)",
    "CHCl3": "fit from 190 nm taken from the second typing; the first had only an estimate, up to a "
             "factor 2.3 below",
    "HCFC-22": AGREE + " from 174 to 204 nm",
    "halon-1202": "table taken from the second typing; the first, recalled to 30 %, was twice as "
                  "high at 190 to 200 nm and 11 to 17 % higher at 222 to 238 nm; from 282 nm typed "
                  "once",
    "halon-1211": AGREE + " from 200 nm on",
    "OClO": "typed once",
    "Cl2O2": "typed twice from memory: the older shape to 308 nm agrees at every wavelength; of the "
             "newer spectrum the second knew 308 nm (5.1e-19) and 352 nm (9.0e-20, here 14 % lower)",
}


def polynomial(coefficients, nm):
    return sum(c * nm**i for i, c in enumerate(coefficients))


def slope_ln(gas, nm):
    """d ln(sigma)/dT; beyond the fit the slope is held on the red side, where it keeps its sense,
    and fades over 15 nm on the blue side, where another band takes over."""
    if gas in SLOPE:
        return SLOPE[gas][0](nm)
    _, _, first, last, _, b = POLYNOMIAL[gas]
    fade = max(0.0, 1.0 - (first - nm) / 15.0) if nm < first else 1.0
    return fade * math.log(10.0) * polynomial(b, min(max(nm, first), last))


def room_spectrum(gas):
    """[(nm, sigma at 298 K)], ascending."""
    rows = []
    for first, step, values in TABLE.get(gas, []):
        rows += [(first + step * i, v * 1e-20) for i, v in enumerate(values)]
    if gas in POLYNOMIAL:
        _, t0, first, last, a, b = POLYNOMIAL[gas]
        for nm in range(first, last + 1, 2):
            rows.append((nm, 10.0**(polynomial(a, nm) + (T_ROOM - t0) * polynomial(b, nm))))
    if gas in TAIL_TO:
        (nm0, s0), (nm1, s1) = rows[-3], rows[-1]
        rate = math.log(s1 / s0) / (nm1 - nm0)
        rows += [(nm, s1 * math.exp(rate * (nm - nm1)))
                 for nm in range(nm1 + 2, TAIL_TO[gas] + 1, 2)]
    if any(b[0] <= a[0] for a, b in zip(rows, rows[1:])):
        raise ValueError(f"{gas}: wavelengths do not ascend")
    return rows


def has_slope(gas):
    return gas in SLOPE or bool(POLYNOMIAL[gas][5])


def header(gas):
    yield f"# quantity: absorption cross section of {gas}"
    yield "# unit: wavelength_nm nm; sigma_* cm2 molecule-1"
    work = f"; {POLYNOMIAL[gas][0]}" if gas in POLYNOMIAL else ""
    yield f"# source: {JPL}{work}"
    yield ("# basis: from memory; computed from the published formula or table by "
           "scripts/make_spectra_halogen.py; " + TWICE.get(gas, AGREE))
    yield "# interpolation: log"
    yield f"# uncertainty: about {SHARE.get(gas, '20 %')} (rounded, from memory)"
    notes = []
    if gas in POLYNOMIAL:
        notes.append(f"polynomial in wavelength and T from {POLYNOMIAL[gas][2]} to "
                     f"{POLYNOMIAL[gas][3]} nm, log sigma linear in T, so two columns are exact")
    if gas in SLOPE:
        notes.append(SLOPE[gas][1])
    if gas in TAIL_TO:
        notes.append(f"beyond the fit, to {TAIL_TO[gas]} nm, log sigma continued at its last slope")
    if gas in LYMAN_ALPHA:
        notes.append(f"121 to 122 nm: Lyman-alpha. Between 122 and {POLYNOMIAL[gas][2]} nm no value "
                     "is recalled; 1e-30 marks the gap and keeps interpolation from filling it")
    if gas in NOTE:
        notes.append(NOTE[gas])
    if gas in TABLE and gas in POLYNOMIAL and gas not in SLOPE:
        notes.append("below the fit: 298 K table, temperature slope fading to zero within 15 nm")
    for text in notes:
        yield f"# note: {text}"


def write(gas, folder):
    rows = room_spectrum(gas)
    cold = COLD_LIMIT.get(gas, T_COLD)
    lines = list(header(gas))
    two = has_slope(gas)
    lines.append("wavelength_nm," + (f"sigma_{cold:.0f}K," if two else "")
                 + f"sigma_{T_ROOM:.0f}K")
    if gas in LYMAN_ALPHA:
        value = LYMAN_ALPHA[gas]
        for nm, s in ((121.0, value), (122.0, value), (122.1, 1e-30), (rows[0][0] - 0.1, 1e-30)):
            lines.append(f"{nm:g},{s:.4e}")
    for nm, s in rows:
        at_cold = s * math.exp(slope_ln(gas, nm) * (cold - T_ROOM)) if two else None
        lines.append(f"{nm:g}," + (f"{at_cold:.4e}," if two else "") + f"{s:.4e}")
    (folder / f"{gas}.csv").write_text("\n".join(lines) + "\n")


# Reservoirs and halogen molecules published in closed form.  Each is a sum of bell curves in the
# logarithm of the wavelength, sigma in 1e-20 cm2: (height, width, centre nm).  Where a vibrational
# temperature is given (half of h nu / k), alpha = tanh(theta/T) scales heights by sqrt(alpha) and
# widths by alpha: the thermal population of a harmonic oscillator.
BELLS = {
    "Cl2": ("Maric et al. 1993 (J. Photochem. Photobiol. A 70, 205)", 402.7, (250, 550), "5 %",
            [(27.3, 99.0, 329.5), (0.932, 91.5, 406.5)]),
    "BrCl": ("Maric et al. 1994 (J. Photochem. Photobiol. A 83, 179)", 318.8, (190, 600), "10 %",
             [(7.34, 68.6, 227.6), (43.5, 123.6, 372.5), (11.2, 101.5, 442.4)]),
    "HOBr": ("Ingham et al. 1998 (J. Phys. Chem. A 102, 8001)", None, (250, 550), "15 %",
             [(24.77, 109.80, 284.01), (12.22, 93.63, 350.57), (2.283, 242.40, 457.38)]),
}
BELL_COLUMNS = (210.0, 240.0, 270.0, 298.0)     # alpha is not quite log-linear in T


def bells(gas, nm, temperature):
    _, theta, _, _, terms = BELLS[gas]
    alpha = 1.0 if theta is None else math.tanh(theta / temperature)
    return 1e-20 * math.sqrt(alpha) * sum(
        height * math.exp(-width * alpha * math.log(centre / nm)**2)
        for height, width, centre in terms)


def write_bells(gas, folder):
    work, theta, (first, last), share, _ = BELLS[gas]
    columns = (T_ROOM,) if theta is None else BELL_COLUMNS
    lines = [f"# quantity: absorption cross section of {gas}",
             "# unit: wavelength_nm nm; sigma_* cm2 molecule-1",
             f"# source: {JPL}; {work}",
             "# basis: from memory; computed from the published formula by "
             "scripts/make_spectra_halogen.py; " + TWICE.get(gas, AGREE),
             "# interpolation: log",
             f"# uncertainty: about {share} (rounded, from memory)",
             "wavelength_nm," + ",".join(f"sigma_{t:.0f}K" for t in columns)]
    for nm in range(first, last + 1, 2 if last - first <= 300 else 5):
        lines.append(f"{nm}," + ",".join(f"{bells(gas, nm, t):.4e}" for t in columns))
    (folder / f"{gas}.csv").write_text("\n".join(lines) + "\n")


# Band heads of OClO at 204 K, nm and 1e-20 cm2 (Wahner et al. 1987), and the ratio of the mean over
# a band to its head, read from the shape of the measured spectrum: bands part toward the red.
OCLO_HEADS = [(272.93, 33), (275.74, 53), (279.64, 59), (283.51, 73), (287.80, 89), (291.77, 105),
              (296.42, 138), (300.87, 190), (305.99, 256), (311.53, 393), (317.21, 542),
              (322.78, 771), (329.22, 1009), (336.08, 1243), (343.44, 1441), (351.30, 1507),
              (359.73, 1531), (368.30, 1454), (377.44, 1365), (387.37, 1212), (397.76, 1046),
              (408.83, 821), (420.93, 578), (433.8, 393), (446.41, 220), (461.15, 94),
              (475.53, 17)]
OCLO_MEAN_TO_HEAD = [(300, 0.42), (350, 0.37), (400, 0.31), (440, 0.26)]

# Cl2O2: shape of the earlier recommended spectrum, 200 to 308 nm in steps of 2 nm, 1e-20 cm2.
CL2O2_SHAPE = [383.5, 352.9, 325.3, 298.6, 274.6, 251.3, 231.7, 217.0, 207.6, 206.1, 212.1, 227.1,
               249.4, 280.2, 319.5, 365.0, 415.4, 467.5, 517.5, 563.0, 600.3, 625.7, 639.4, 642.6,
               631.5, 609.3, 580.1, 544.5, 505.4, 463.1, 422.0, 381.4, 344.6, 311.6, 283.3, 258.4,
               237.3, 218.3, 201.6, 186.4, 172.5, 159.6, 147.3, 136.1, 125.2, 114.6, 104.6, 95.4,
               87.1, 79.0, 72.2, 65.8, 59.9, 54.1, 48.6]
CL2O2_PEAK = 760.0      # recommended value at 245 nm
CL2O2_TAIL = 1.10       # factor on the log-linear tail log10 = 7.589 - 0.01915 lambda


def between(points, x):
    """Linear between the points, held beyond them."""
    if x <= points[0][0]:
        return points[0][1]
    for (x0, y0), (x1, y1) in zip(points, points[1:]):
        if x <= x1:
            return y0 + (y1 - y0) * (x - x0) / (x1 - x0)
    return points[-1][1]


def oclo_rows():
    heads = [(nm, math.log(s)) for nm, s in OCLO_HEADS]
    for low in range(270, 480, 5):
        inside = [low + 0.25 * i for i in range(21)]
        yield low, 1e-20 * sum(between(OCLO_MEAN_TO_HEAD, nm) * math.exp(between(heads, nm))
                               for nm in inside) / len(inside)
    yield 480, 0.0


def cl2o2_rows():
    scale = [(270, CL2O2_PEAK / max(CL2O2_SHAPE)), (310, CL2O2_TAIL)]
    for i, s in enumerate(CL2O2_SHAPE):
        yield 200 + 2 * i, 1e-20 * s * between(scale, 200 + 2 * i)
    for nm in range(310, 421, 2):
        yield nm, 1e-20 * CL2O2_TAIL * 10.0**(7.589 - 0.01915 * nm)


BUILT = {
    "OClO": (oclo_rows, "204", "step", "25 % (the means are built from band heads)",
             "Wahner et al. 1987 (J. Phys. Chem. 91, 2734); Kromminga et al. 2003",
             ["5 nm means of a banded spectrum: published band heads at 204 K (peak 1.5e-17 near "
              "351 nm), interpolated between heads, times the ratio of band mean to band head "
              "(0.42 at 300 nm, 0.37 at 350, 0.31 at 400, 0.26 at 440 nm)",
              "the area under the bands hardly changes with temperature; the last row closes the "
              "last interval"]),
    "Cl2O2": (cl2o2_rows, "200", "log", "10 % near 245 nm, 35 % beyond 320 nm",
              "Papanastasiou et al. 2009 (J. Phys. Chem. A 113, 13711)",
              ["valid 190 to 250 K; one column, used at all temperatures",
               "peak 7.6e-18 at 245 nm as recommended; the shape to 308 nm is recalled from the "
               "earlier recommended spectrum and brought to that peak",
               "310 to 420 nm: log10(sigma/1e-20) = 7.589 - 0.01915 lambda, raised by 10 %: 8.1e-20 "
               "at 351 nm, where Chen et al. 2009 measured 8.7e-20 at 200 K"]),
}


def write_built(gas, folder):
    rows, kelvin, interpolation, share, work, notes = BUILT[gas]
    lines = [f"# quantity: absorption cross section of {gas}",
             "# unit: wavelength_nm nm; sigma_* cm2 molecule-1",
             f"# source: {JPL}; {work}",
             "# basis: from memory; computed by scripts/make_spectra_halogen.py; " + TWICE[gas],
             f"# interpolation: {interpolation}",
             f"# uncertainty: about {share} (rounded, from memory)"]
    lines += [f"# note: {text}" for text in notes]
    lines.append(f"wavelength_nm,sigma_{kelvin}K")
    lines += [f"{nm},{s:.4e}" for nm, s in rows()]
    (folder / f"{gas}.csv").write_text("\n".join(lines) + "\n")


def main():
    here = pathlib.Path(__file__).resolve().parent.parent
    folder = pathlib.Path(sys.argv[1]) if len(sys.argv) > 1 else here / "input/data/xs"
    for gas in sorted(set(TABLE) | set(POLYNOMIAL)):
        write(gas, folder)
    for gas in BELLS:
        write_bells(gas, folder)
    for gas in BUILT:
        write_built(gas, folder)


if __name__ == "__main__":
    main()
