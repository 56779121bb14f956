"""The equations behind every computed number of the dataset, with their source and range, as a table."""

from calc.reaeration import FORMULAS
from webapp.dataset.fields import DataTable, text

# Changes when an equation or a coefficient does.
EQUATION_SET = "Bankside equations 1"

_WRITTEN = {
    "oconnor_dobbins": "ka20 = 3.93 U^0.5 / H^1.5",
    "churchill": "ka20 = 5.026 U / H^1.67",
    "owens_gibbs": "ka20 = 5.32 U^0.67 / H^1.85",
    "covar": "H < 0.61 m: Owens; else H > 3.45 U^2.5: O'Connor; else Churchill",
    "tsivoglou_neal": "ka20 = 31183 S U in small streams, 15308 S U in large ones",
    "melching_flores_pool_riffle": "ka20 = 517 (U S)^0.524 Q^-0.242 up to 0.556 m3/s, else 596 (U S)^0.528 Q^-0.136",
    "melching_flores_channel_control": (
        "ka20 = 88 (U S)^0.313 H^-0.353 up to 0.556 m3/s, else 142 (U S)^0.333 H^-0.66 W^-0.243"
    ),
}
_BENSON_KRAUSE = "Benson & Krause 1980, 1984; USGS Office of Water Quality Technical Memorandum 2011.03"
_OTHERS = (
    (
        "saturation",
        "Oxygen saturation of fresh water at 1 atm",
        "ln C0 = -139.34411 + 1.575701e5/T - 6.642308e7/T^2 + 1.243800e10/T^3 - 8.621949e11/T^4, T in kelvin",
        "0 to 40 °C",
        _BENSON_KRAUSE,
    ),
    (
        "saturation",
        "Salinity factor",
        "Fs = exp(-S (0.017674 - 10.754/T + 2140.7/T^2))",
        "practical salinity 0 to 40",
        _BENSON_KRAUSE,
    ),
    (
        "saturation",
        "Pressure factor",
        "Fp = (P - u)(1 - theta P) / ((1 - u)(1 - theta)), P and vapour pressure u in atm",
        "0.5 to 1.1 atm",
        _BENSON_KRAUSE,
    ),
    (
        "saturation",
        "Salinity from specific conductance at 25 °C",
        "S = 5.572e-4 SC + 2.02e-9 SC^2",
        "0 to 59000 µS/cm",
        "USGS Office of Water Quality Technical Memorandum 2011.03",
    ),
    (
        "pressure",
        "Station pressure from elevation; weather pressure un-reduced from sea level",
        "P = P0 (1 - 2.25577e-5 h)^5.25588, h in m",
        "-500 to 11000 m",
        "US Standard Atmosphere 1976 (ISO 2533:1975)",
    ),
    ("deficit", "Deficit", "D = Cs - C, negative when supersaturated", "", "definition"),
    ("deficit", "Percent saturation", "100 C / Cs, at the station's pressure", "", "definition"),
    (
        "difference",
        "Predicted oxygen at the temperature measured",
        "C = Cs (measured temperature, pressure, salinity) - D (predicted)",
        "",
        "definition",
    ),
    (
        "sag",
        "Deficit along a uniform stretch",
        "D(t) = D0 e^(-ka t) + kd L0 f(kr) + kn N0 f(kn) + (SOD/H + R - P)/ka (1 - e^(-ka t)), "
        "f(k) = (e^(-k t) - e^(-ka t)) / (ka - k)",
        "",
        "Streeter & Phelps 1925, US Public Health Bulletin 146, extended for settling, nitrogen, bed and plants",
    ),
    (
        "sag",
        "Where oxygen runs out",
        "decay is limited by reaeration: demand falls at ka Cs per day",
        "",
        "Gundelach & Castillo 1976, J. Water Pollut. Control Fed. 48(7)",
    ),
    ("demand", "Ultimate demand from BOD5", "L0 = BOD5 / (1 - e^(-5 k))", "", "Streeter & Phelps 1925"),
    (
        "demand",
        "Decomposition by depth",
        "kd20 = 0.3 (H/8)^-0.434, H in ft; 0.3 at 8 ft and deeper",
        "",
        "Hydroscience 1971",
    ),
    ("demand", "Nitrogenous demand", "4.57 g of oxygen for each g of nitrogen", "", "stoichiometry"),
    (
        "temperature",
        "Rates at the water's temperature",
        "k = k20 theta^(t - 20); theta 1.047 (kd), 1.024 (ka, ks), 1.085 (kn), 1.065 (SOD)",
        "kn: 10 to 30 °C",
        "Elmore & West 1961 for reaeration; common practice",
    ),
    ("mixing", "Waters that meet", "flow-weighted mean", "", "mass balance"),
    (
        "mixing",
        "Distance to complete mixing",
        "L = k U W^2 / Ey, k 0.1 in the centre and 0.4 at a bank; Ey = 0.6 H sqrt(g H S)",
        "within 50 %",
        "Fischer et al. 1979, Mixing in Inland and Coastal Waters",
    ),
    (
        "weirs",
        "Deficit ratio over a weir",
        "r = 1 + 0.38 a b h (1 - 0.11 h)(1 + 0.046 t)",
        "drop up to 4.5 m",
        "UK Water Research Laboratory 1973; Butts & Evans 1983",
    ),
    ("travel", "Travel time", "dt = dx / U, reach by reach", "", "definition"),
)
_SPOKEN = {"velocity_m_s": "U {:g} to {:g} m/s", "depth_m": "H {:g} to {:g} m", "flow_m3_s": "Q {:.3g} to {:.3g} m3/s"}


def equations_table():
    """Return the equations as a table of the dataset."""
    rows = [_row(*equation) for equation in _OTHERS]
    for key, formula in FORMULAS.items():
        ranges = ", ".join(_SPOKEN[name].format(*ends) for name, ends in formula.valid.items())
        rows.append(_row("reaeration", formula.label, _WRITTEN[key], ranges, formula.label))
    return DataTable(
        "equations",
        "Equations",
        "Every equation behind the computed numbers. Rates are base e, per day, at 20 °C; SI units.",
        (
            text("topic", "Topic"),
            text("name", "What it gives", constraints={"required": True}),
            text("equation", "Equation"),
            text("valid", "Range it was published for"),
            text("source", "Source"),
            text("equation_set", "Set of equations", "Changes when an equation or a coefficient does."),
        ),
        ("name",),
        rows,
    )


def _row(topic, name, equation, valid, source):
    return {
        "topic": topic,
        "name": name,
        "equation": equation,
        "valid": valid,
        "source": source,
        "equation_set": EQUATION_SET,
    }
