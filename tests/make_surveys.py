"""Makes `sample_surveys/` and the truth behind them: invented sites, seeded, with faults planted on purpose.

Run as a script to write them; `tests/test_surveys.py` compares. Eh comes from written-out couples, independent of the
tool:

    Fe(OH)3 + 3 H+ + e- = Fe2+ + 3 H2O      pe = 16.54 - 3 pH - log[Fe2+]            (Kirk 2004, submerged soils)
    SO4-- + 9 H+ + 8 e- = HS- + 4 H2O       pe = (34.0 - 9 pH - log[HS-] + log[SO4--]) / 8    (same)
    oxic water                              a mixed potential, drawn near 400 mV (common practice)

Eh = pe * 2.303 RT/F, then noise of the stated standard deviation, then back to ORP with the reference electrode at the
temperature (3 M KCl: 207 - 0.7 (t - 25) mV, ISO 11271; saturated calomel: 244.4 - 0.67 (t - 25) mV, Sawyer 1995) and
the probe's own deviation, which the check readings show (ZoBell: Nordstrom 1977).
"""

import csv
import datetime as dt
from pathlib import Path

import numpy as np
import openpyxl
from openpyxl.styles import Font

TOP = Path(__file__).parents[1]
SEED = 20310428
NOISE_mV = 12.0
WELLS = 26
DAYS = ("2031-04-28", "2031-04-29", "2031-10-13", "2031-10-14")
MASS = {
    "Ca": 40.078, "Mg": 24.305, "Na": 22.990, "K": 39.098, "Cl": 35.45, "SO4": 96.06, "NO3": 14.007, "NH4": 14.007,
    "sulfide": 32.06, "Fe": 55.845, "Mn": 54.938, "As": 74.922, "O2": 31.998,
}  # fmt: skip
CHARGE = {"Ca": 2, "Mg": 2, "Na": 1, "K": 1, "NH4": 1, "Fe": 2, "Mn": 2, "Cl": -1, "SO4": -2, "NO3": -1}
# lowest and highest value per zone: O2, NO3-N, Mn, Fe, SO4, sulfide-S in mg/L, As in µg/L, pH
ZONES = {
    "oxic": {"O2": (4, 8), "NO3": (3, 9), "Mn": (0.004, 0.02), "Fe": (0.01, 0.04), "SO4": (40, 70), "sulfide": (0, 0),
             "As": (0.3, 1.5), "pH": (6.6, 7.2), "NH4": (0.01, 0.04)},
    "manganese": {"O2": (0.1, 0.4), "NO3": (0.05, 0.4), "Mn": (0.2, 1.1), "Fe": (0.02, 0.08), "SO4": (40, 80),
                  "sulfide": (0, 0), "As": (1, 8), "pH": (6.7, 7.1), "NH4": (0.05, 0.3)},
    "iron": {"O2": (0.05, 0.3), "NO3": (0.02, 0.09), "Mn": (0.6, 2.4), "Fe": (2.5, 16), "SO4": (15, 55),
             "sulfide": (0.01, 0.04), "As": (25, 260), "pH": (6.5, 7.0), "NH4": (0.4, 3)},
    "sulfate": {"O2": (0.05, 0.2), "NO3": (0.02, 0.08), "Mn": (0.2, 0.6), "Fe": (0.12, 0.4), "SO4": (4, 18),
                "sulfide": (0.8, 4), "As": (8, 45), "pH": (7.0, 7.5), "NH4": (1, 4)},
    "recovery": {"O2": (0.1, 0.4), "NO3": (0.05, 0.3), "Mn": (0.2, 0.9), "Fe": (0.3, 1.6), "SO4": (30, 60),
                 "sulfide": (0.01, 0.03), "As": (4, 22), "pH": (6.6, 7.1), "NH4": (0.1, 0.6)},
}  # fmt: skip
LIMITS = {"O2": 0.2, "NO3": 0.1, "Mn": 0.005, "Fe": 0.05, "sulfide": 0.02, "As": 0.5, "NH4": 0.05}
COLUMNS = (
    ("Sample", "-"), ("Well", "-"), ("Date", "-"), ("Time", "-"), ("Round", "-"), ("Sample type", "-"),
    ("Duplicate of", "-"), ("Probe", "-"), ("ORP", "mV"), ("pH", "-"), ("Temp", "°C"), ("SpCond", "µS/cm"),
    ("DO", "mg/L"), ("Alkalinity", "mg/L as CaCO3"), ("Ca", "mg/L"), ("Mg", "mg/L"), ("Na", "mg/L"), ("K", "mg/L"),
    ("Cl", "mg/L"), ("SO4", "mg/L"), ("NO3", "mg/L as N"), ("NH4", "mg/L as N"), ("Sulfide", "mg/L as S"),
    ("Fe", "mg/L"), ("Mn", "mg/L"), ("As", "µg/L"), ("Remarks", "-"),
)  # fmt: skip


def slope(t):
    """2.303 RT/F in mV."""
    return 0.198416 * (t + 273.15)


def zobell(t):
    return 430.28 - 2.5157 * (t - 25) - 0.0037 * (t - 25) ** 2


def silver_chloride(t):
    return 207.0 - 0.70 * (t - 25)


def calomel(t):
    return 244.4 - 0.67 * (t - 25)


def zone_of(x, y):
    """Zones along the flow, from the fields in the west to the brook in the east; a sulfidic patch in the plume."""
    if x < 190 or abs(y) > 190:
        return "oxic"
    if x < 320:
        return "manganese"
    if 430 < x < 600 and y > -60:
        return "sulfate"
    return "iron" if x < 690 else "recovery"


def wells(rng):
    """Positions in metres along and across the flow, with ground level, screen and unit."""
    made = []
    lines = [(60, 3), (170, 3), (260, 4), (370, 4), (470, 3), (550, 3), (640, 2), (740, 2), (850, 2)]
    number = 0
    for x, count in lines:
        for k in range(count):
            number += 1
            y = (k - (count - 1) / 2) * (360 / max(count, 2)) + rng.normal(0, 12)
            top = float(np.round(rng.uniform(3.0, 5.5) + (6 if number % 5 == 0 else 0), 1))
            made.append({
                "name": f"EW-{number:02d}", "x": round(x + rng.normal(0, 10), 1), "y": round(y, 1),
                "ground": round(8.4 - 0.0021 * x + rng.normal(0, 0.1), 2), "top": top, "bottom": top + 2.0,
                "unit": "lower gravel" if number % 5 == 0 else "upper sand",
            })  # fmt: skip
    assert len(made) == WELLS
    return made


def chemistry(zone, rng):
    """Concentrations in mol/L (alkalinity eq/L) of one sample; calcium closes the charge balance within 3 %."""
    draw = {key: rng.uniform(*span) for key, span in ZONES[zone].items()}
    for key in ("Fe", "Mn", "As"):
        low, high = ZONES[zone][key]
        draw[key] = float(np.exp(rng.uniform(np.log(low), np.log(high))))
    mol = {key: draw[key] / MASS[key] / (1e6 if key == "As" else 1e3) for key in draw if key != "pH"}
    mol |= {"Na": rng.uniform(18, 34) / 22990, "K": rng.uniform(2, 5) / 39098, "Mg": rng.uniform(8, 14) / 24305}
    mol["Cl"] = rng.uniform(28, 52) / 35450
    alkalinity = rng.uniform(2.6, 3.6) + (1.6 if zone in ("iron", "sulfate") else 0.4)
    mol["alkalinity"] = alkalinity / 1000
    rest = sum(CHARGE[key] * mol[key] for key in CHARGE if key != "Ca") - mol["alkalinity"]
    mol["Ca"] = max(-rest / 2, 4e-4) * (1 + rng.normal(0, 0.012))
    return mol, float(np.round(draw["pH"], 2))


def eh_of(zone, mol, pH, t, rng):
    """Eh in mV of the stated process, before noise."""
    if zone == "oxic":
        return rng.uniform(370, 430)
    if zone == "sulfate":
        pe = (34.0 - 9 * pH - np.log10(mol["sulfide"]) + np.log10(mol["SO4"])) / 8
    else:
        pe = 16.54 - 3 * pH - np.log10(mol["Fe"])
    return float(pe * slope(t))


def balance_percent(mol):
    """Charge balance error in percent of the sum."""
    positive = sum(CHARGE[key] * mol[key] for key in CHARGE if CHARGE[key] > 0)
    negative = sum(-CHARGE[key] * mol[key] for key in CHARGE if CHARGE[key] < 0) + mol["alkalinity"]
    return 100 * (positive - negative) / (positive + negative)


def written(key, mol):
    """A laboratory's number: three digits, or the limit."""
    value = mol[key] * MASS[key] * (1e6 if key == "As" else 1e3)
    limit = LIMITS.get(key)
    if limit is not None and value < limit:
        return f"<{limit:g}"
    return float(f"{value:.3g}")


def alluvial():
    """The workbook's rows by sheet, and the truth."""
    rng = np.random.default_rng(SEED)
    sites = wells(rng)
    # the probe's deviation in the morning and the evening of each day, in mV
    drift = {day: (rng.uniform(1, 4), rng.uniform(4, 8)) for day in DAYS}
    samples, truth = [], []
    for turn in (1, 2):
        for index, site in enumerate(sites):
            day = DAYS[2 * (turn - 1) + index // (WELLS // 2)]
            hour = 8.5 + 8.0 * (index % (WELLS // 2)) / (WELLS // 2)
            zone = zone_of(site["x"], site["y"])
            t = float(np.round(rng.normal(10.4 if turn == 1 else 12.1, 0.4), 1))
            mol, pH = chemistry(zone, rng)
            Eh = eh_of(zone, mol, pH, t, rng)
            early, late = drift[day]
            delta = early + (late - early) * (hour - 8.0) / 10.0
            ORP = round(Eh + rng.normal(0, NOISE_mV) - silver_chloride(t) - delta)
            row = sample_row(f"{site['name']}-{turn}", site["name"], day, hour, turn, ORP, pH, t, mol)
            samples.append(row)
            truth.append((row["Sample"], zone, round(Eh, 1), round(balance_percent(mol), 2)))
    stations = [
        (s["name"], 565000 + s["x"], 5934000 + s["y"], s["ground"], s["top"], s["bottom"], s["unit"]) for s in sites
    ]
    checks = check_rows(drift, rng)
    plant_faults(samples, checks)
    return samples, stations, checks, truth


def sample_row(name, well, day, hour, turn, ORP, pH, t, mol):
    clock = f"{int(hour):02d}:{int(hour % 1 * 60):02d}"
    strength = 0.5 * (sum(CHARGE[key] ** 2 * mol[key] for key in CHARGE) + mol["alkalinity"])
    row = {
        "Sample": name, "Well": well, "Date": dt.date.fromisoformat(day), "Time": clock, "Round": str(turn),
        "Sample type": "normal", "Probe": "P-1", "ORP": ORP, "pH": pH, "Temp": t,
        "SpCond": round(strength / 1.6e-5), "Alkalinity": round(mol["alkalinity"] * 50043),
        "DO": written("O2", mol), "Sulfide": written("sulfide", mol),
    }  # fmt: skip
    return row | {
        key: written(key, mol) for key in ("Ca", "Mg", "Na", "K", "Cl", "SO4", "NO3", "NH4", "Fe", "Mn", "As")
    }


def check_rows(drift, rng):
    """ZoBell readings at the start and the end of each day."""
    rows = []
    for day, deltas in drift.items():
        for clock, delta in zip(("08:00", "18:00"), deltas, strict=True):
            t = float(np.round(rng.uniform(11, 16), 1))
            reading = round(zobell(t) - silver_chloride(t) - delta, 1)
            rows.append([dt.date.fromisoformat(day), clock, "P-1", "ZoBell", t, reading])
    return rows


def plant_faults(samples, checks):
    """What real workbooks have: each of these must come back as a finding."""
    by_name = {row["Sample"]: row for row in samples}
    by_name["EW-17-2"]["pH"] = None
    by_name["EW-03-1"]["ORP"] = 1140
    by_name["EW-03-1"]["Remarks"] = "meter jumped"
    by_name["EW-21-1"]["Temp"] = None
    by_name["EW-24-2"]["Mn"] = "see report"
    by_name["EW-06-2"]["Sulfide"] = "n.d."
    twin = dict(by_name["EW-13-1"])
    twin |= {"Sample": "EW-13-1-DUP", "Sample type": "duplicate", "Duplicate of": "EW-13-1", "ORP": twin["ORP"] + 4}
    twin["Fe"], twin["As"] = round(twin["Fe"] * 1.03, 2), round(twin["As"] * 0.97, 1)
    samples.insert(samples.index(by_name["EW-13-1"]) + 1, twin)
    checks.insert(3, [checks[2][0], "12:30", "P-1", "ZoBell", None, 251.0])


def workbook(path):
    samples, stations, checks, truth = alluvial()
    book = openpyxl.Workbook()
    book.properties.creator = "gley"
    book.properties.created = book.properties.modified = dt.datetime(2031, 11, 3)
    sheet = book.active
    sheet.title = "Samples"
    sheet.append(["Erlenwiek tannery meadow: groundwater monitoring (invented)"])
    sheet.append(["field readings and laboratory results, filtered samples"])
    sheet.append([])
    sheet.append([name for name, _ in COLUMNS])
    sheet.append([unit for _, unit in COLUMNS])
    for row in samples:
        sheet.append([row.get(name) for name, _ in COLUMNS])
    fill(book.create_sheet("Wells"), ["Well", "Easting (m)", "Northing (m)", "Ground elevation (m)", "Screen top (m)",
         "Screen bottom (m)", "Aquifer"], stations)  # fmt: skip
    fill(
        book.create_sheet("Probe checks"),
        ["Date", "Time", "Probe", "Solution", "Temperature (°C)", "Reading (mV)"],
        checks,
    )
    facts = book.create_sheet("Facts")
    for line in (
        ("Project", "Erlenwiek tannery meadow, monitoring 2031"),
        ("Reference electrode", "Ag/AgCl, 3 M KCl"),
        ("CRS", "EPSG:25832"),
        ("Remarks", "Invented site; any likeness to a real one is chance."),
    ):
        facts.append(line)
    for page in book:
        page.column_dimensions["A"].width = 16
    for cell in sheet[4]:
        cell.font = Font(bold=True)
    sheet.freeze_panes = "B6"
    book.save(path)
    return truth


def fill(sheet, head, rows):
    sheet.append(head)
    for row in rows:
        sheet.append(list(row))


def wetland():
    """Lines of the soil transect's text file, and the truth."""
    rng = np.random.default_rng(SEED + 1)
    lines = [
        "# Nebelbruch, transect from the hay meadow into the alder carr (invented)",
        "# electrode: calomel, saturated KCl",
        "# crs: EPSG:25832",
        "Plot;Date;Time;Easting (m);Northing (m);Depth (cm);Pt 1 (mV);Pt 2 (mV);Pt 3 (mV);pH;Soil temp (°C)",
    ]
    truth = []
    for plot in range(7):
        wet = plot / 6
        table = 70 - 65 * wet  # water table, cm below ground
        for k, depth in enumerate((5, 15, 30, 50, 80)):
            t = round(13.5 - 0.03 * depth + rng.normal(0, 0.2), 1)
            pH = round(5.0 + 1.1 * wet + 0.008 * depth + rng.normal(0, 0.1), 1)
            below = 1 / (1 + np.exp(-(depth - table) / 8))
            iron = 10 ** (-5.2 + 1.4 * below)
            reduced = (16.54 - 3 * pH - np.log10(iron)) * slope(t) - 60 * below * wet
            Eh = (1 - below) * rng.uniform(480, 540) + below * reduced
            read = [Eh + rng.normal(0, 22) - calomel(t) for _ in range(3)]
            cells = [comma(f"{value:.0f}") for value in read]
            if (plot, k) == (2, 3):
                cells[1] = "nm"
            name = f"T{plot + 1}"
            lines.append(";".join([
                name, "14.05.2031", f"{9 + plot}:{10 + 8 * k:02d}", comma(f"{548210.5 + 18 * plot:.1f}"),
                comma(f"{5921004.0 + 4 * plot:.1f}"), str(depth), *cells, comma(f"{pH:.1f}"), comma(f"{t:.1f}"),
            ]))  # fmt: skip
            truth.append((f"{name} {depth} cm", "below" if below > 0.5 else "above", round(float(Eh), 1), ""))
    return lines, truth


def comma(text):
    return text.replace(".", ",")


def write(folder, truth_folder):
    """All files into two folders."""
    folder.mkdir(exist_ok=True)
    truth_folder.mkdir(exist_ok=True)
    made = {"erlenwiek": workbook(folder / "erlenwiek.xlsx")}
    lines, made["nebelbruch"] = wetland()
    (folder / "nebelbruch.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    for name, rows in made.items():
        with (truth_folder / f"{name}.csv").open("w", newline="", encoding="utf-8") as file:
            out = csv.writer(file, lineterminator="\n")
            out.writerow(["sample", "process", "Eh_mV", "charge_balance_percent"])
            out.writerows(rows)


if __name__ == "__main__":
    write(TOP / "sample_surveys", TOP / "tests" / "truth")
