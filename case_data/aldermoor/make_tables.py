"""Make the survey tables of Aldermoor Bridge, a fictional structure. All data are invented.

Run it with a folder to write into (its own, if left out):

    python case_data/aldermoor/make_tables.py [FOLDER]

The same seed gives the same tables. Measurements are simulated from the hidden values in `TRUTH`
with the errors that surveys have, then given the blemishes that real tables have.
"""

import sys
import zipfile
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date, datetime
from pathlib import Path

import numpy as np
from openpyxl import Workbook

from assess.mechanics.core_corrections import correction
from assess.mechanics.corrosion import penetration_depth

Row = list[str]

SEED = 19710604
BUILT = date(1971, 1, 1)
VISITS = {2018: date(2018, 9, 11), 2025: date(2025, 5, 20)}
BAR = 32.0  # [mm] sound diameter of all main bars
DETECTABLE = 0.1  # [mm] smallest loss of radius that the inspectors notice
LOSS_ERROR = 0.15  # scatter of ln of a measured loss
WITHIN_LOCATION = 0.05  # scatter of ln strength between cores of one place
CORE_DIAMETER = 94.0  # [mm]


@dataclass(frozen=True)
class Truth:
    """What the surveyors do not know: the values behind the measurements of one zone."""

    strength: float  # median in the structure [MPa]
    strength_scatter: float  # standard deviation of ln strength
    cover: float  # mean [mm]
    cover_scatter: float  # standard deviation [mm]
    onset: float  # median [yr after construction]
    onset_scatter: float  # standard deviation of ln onset
    current: float  # median [µA/cm²]
    current_scatter: float  # standard deviation of ln current


@dataclass(frozen=True)
class Meter:
    """Cover meter: constant bias, scatter of a reading and reach, all in mm."""

    bias: float
    scatter: float
    reach: float


@dataclass(frozen=True)
class Section:
    """True local values at a section that the second survey measures."""

    strength: float  # [MPa]
    cover: float  # [mm]
    onset: float  # [yr after construction]
    current: float  # [µA/cm²]


TRUTH = {
    "inner girders": Truth(34.0, 0.11, 41.0, 6.0, 75.0, 0.30, 0.5, 0.40),
    "edge girders": Truth(33.0, 0.12, 36.0, 7.0, 28.0, 0.25, 1.1, 0.40),
    "cross beams": Truth(31.0, 0.14, 34.0, 7.5, 22.0, 0.25, 1.5, 0.40),
}
METERS = {2018: Meter(bias=0.6, scatter=2.5, reach=80.0), 2025: Meter(-0.4, 2.0, 60.0)}
SECTIONS = {
    "G1 midspan": ("edge girders", Section(33.0, 38.0, 28.0, 1.35)),
    "G2 midspan": ("inner girders", Section(35.0, 42.0, 70.0, 0.5)),
    "B1 column face": ("cross beams", Section(30.0, 31.0, 24.0, 1.1)),
}
CODES = {"inner girders": "I", "edge girders": "E", "cross beams": "C"}
CORES = {2018: (4, 3, 3), 2025: (3, 3, 3)}  # by zone, beside those at sections
SCANNED = {  # readings by member, one at each link
    2018: {"G1": 384, "G2": 384, "G3": 384, "G4": 384, "G5": 384, "B1": 192, "B2": 192},
    2025: {"G1": 128, "G2": 128, "G5": 64, "B1": 96, "B2": 96},
}
AT_SECTION = 6  # cover readings at each section of the second survey
OPENED_TWICE = ("G1 midspan", "B1 column face")  # sections that both surveys broke out
SEEN_AGAIN = ("E18-2", "C18-1")  # places of 2018 that were opened again in 2025
BREAK_OUTS = {2018: (3, 4, 4), 2025: (2, 4, 3)}  # by zone, beside sections and places seen before


def zone_of(member: str) -> str:
    """Name the zone that a member lies in."""
    if member.startswith("B"):
        return "cross beams"
    return "edge girders" if member in ("G1", "G5") else "inner girders"


def age_at(year: int) -> float:
    """Age of the bridge at a visit [yr]."""
    return (VISITS[year] - BUILT).days / 365.25


def tested_strength(strength: float, length: float, moisture: str) -> float:
    """Strength that the testing machine shows for a strength in the structure [MPa]."""
    tested = strength
    for _ in range(30):  # the factor for length depends on the tested strength
        tested = strength / float(correction(tested, CORE_DIAMETER, length, moisture).factor)
    return tested


def simulate_cores(rng: np.random.Generator, year: int) -> list[Row]:
    """Cores: location, zone, section, strength, diameter, length, moisture, note."""
    wanted = []
    for (zone, truth), count in zip(TRUTH.items(), CORES[year], strict=True):
        scatter = truth.strength_scatter * rng.standard_normal(count)
        wanted += [
            (f"K{year % 100}-{CODES[zone]}{k + 1}", zone, "", truth.strength * np.exp(scatter[k]))
            for k in range(count)
        ]
    if year == 2025:
        wanted += [
            (f"{name} K{k + 1}", zone, name, here.strength)
            for name, (zone, here) in SECTIONS.items()
            for k in range(2)
        ]
    rows = []
    for location, zone, section, local in wanted:
        length = CORE_DIAMETER * float(rng.choice([1.0, 1.5, 1.9]))
        moisture = str(rng.choice(["as received", "soaked"]))
        strength = local * np.exp(WITHIN_LOCATION * rng.standard_normal())
        tested = tested_strength(float(strength), length, moisture)
        rows.append([location, zone, section, f"{tested:.1f}", "94", f"{length:.0f}", moisture, ""])
    return rows


def simulate_covers(rng: np.random.Generator, year: int) -> list[Row]:
    """Cover readings: location, zone, section, cover, note."""
    meter = METERS[year]
    rows = []

    def read(location: str, zone: str, section: str, cover: float) -> None:
        reading = cover + meter.bias + meter.scatter * rng.standard_normal()
        shown = f">{meter.reach:.0f}" if reading > meter.reach else f"{max(reading, 4.0):.0f}"
        rows.append([location, zone, section, shown, ""])

    for member, count in SCANNED[year].items():
        truth = TRUTH[zone_of(member)]
        cover = truth.cover + truth.cover_scatter * rng.standard_normal(count)
        for k in range(count):
            read(f"{member} link {k + 1}", zone_of(member), "", float(cover[k]))
    if year == 2025:
        for name, (zone, here) in SECTIONS.items():
            for k in range(AT_SECTION):
                read(f"{name} bar {k + 1}", zone, name, here.cover)
    return rows


def simulate_break_outs(
    rng: np.random.Generator, year: int, places: dict[str, tuple[str, float, float]]
) -> list[Row]:
    """Break-outs: location, zone, section, original and residual diameter, note.

    ``places`` holds zone, onset and current of the places seen so far; new ones are added.
    """
    wanted = []
    for name in SECTIONS if year == 2025 else OPENED_TWICE:
        zone, here = SECTIONS[name]
        wanted.append((name, zone, name, here.onset, here.current))
    for again in SEEN_AGAIN if year == 2025 else ():
        zone, start, rate = places[again]
        wanted.append((again, zone, "", start, rate))
    for (zone, truth), count in zip(TRUTH.items(), BREAK_OUTS[year], strict=True):
        onset = truth.onset * np.exp(truth.onset_scatter * rng.standard_normal(count))
        current = truth.current * np.exp(truth.current_scatter * rng.standard_normal(count))
        for k in range(count):
            location = f"{CODES[zone]}{year % 100}-{k + 1}"
            places[location] = (zone, float(onset[k]), float(current[k]))
            wanted.append((location, zone, "", float(onset[k]), float(current[k])))
    rows = []
    for location, zone, section, start, rate in wanted:
        loss = float(penetration_depth(rate, max(age_at(year) - start, 0.0)))
        measured = loss * np.exp(LOSS_ERROR * rng.standard_normal())
        residual = "none" if loss < DETECTABLE else f"{BAR - 2.0 * measured:.2f}"
        rows.append([location, zone, section, f"{BAR:.0f}", residual, ""])
    return rows


def separated(rows: Iterable[Row], separator: str, *, comma: bool = False, blank: int = 0) -> str:
    """Join rows to text, with decimal commas or blank columns at the end if wanted."""
    lines = []
    for row in rows:
        cells = [_with_comma(cell) if comma else cell for cell in row]
        lines.append(separator.join([*cells, *[""] * blank]))
    return "\n".join(lines) + "\n"


def _with_comma(cell: str) -> str:
    return cell.replace(".", ",") if cell.replace(".", "", 1).isdigit() else cell


def write_workbook(path: Path, rows: Sequence[Row], stamp: datetime) -> None:
    """Write an XLSX that carries no trace of when it was written."""
    book = Workbook()
    sheet = book.worksheets[0]
    sheet.title = "cores"
    for row in rows:
        sheet.append([_cell(cell) for cell in row])
    book.properties.created = book.properties.modified = stamp
    loose = path.with_suffix(".loose")
    book.save(loose)
    with zipfile.ZipFile(loose) as packed, zipfile.ZipFile(path, "w") as fixed:
        for name in packed.namelist():
            content = packed.read(name)
            if name == "docProps/core.xml":  # the writer puts the time of saving there
                content = _restamped(content.decode(), stamp).encode()
            fixed.writestr(zipfile.ZipInfo(name, stamp.timetuple()[:6]), content)
    loose.unlink()


def _cell(cell: str) -> str | float | None:
    number = cell.replace(".", "", 1).isdigit()
    return float(cell) if number else (cell or None)


def _restamped(properties: str, stamp: datetime) -> str:
    before, mark, after = properties.partition("</dcterms:modified>")
    start = before.rindex(">") + 1
    return f"{before[:start]}{stamp.isoformat()}Z{mark}{after}"


def main(folder: Path) -> None:
    """Write all six tables."""
    rng = np.random.default_rng(SEED)
    folder.mkdir(parents=True, exist_ok=True)
    places: dict[str, tuple[str, float, float]] = {}
    head = ["location", "zone", "section"]
    core_head = [*head, "strength [MPa]", "diameter [mm]", "length [mm]", "moisture", "note"]
    cover_head = [*head, "cover [mm]", "note"]
    loss_head = [*head, "original diameter [mm]", "residual diameter [mm]", "note"]

    # A spreadsheet that counts in decimal commas, with blank columns and rows at the end.
    rows = [core_head, *simulate_cores(rng, 2018)]
    text = separated(rows, ";", comma=True, blank=2) + ";" * (len(core_head) + 1) + "\n"
    (folder / "cores_2018.csv").write_bytes(text.replace("\n", "\r\n").encode("utf-8-sig"))

    rows = simulate_covers(rng, 2018)
    rows[700][3] = "2.9"  # written in centimetres
    rows[1500][3:] = ["78", "over a spacer block?"]
    rows[1980][3:] = [">80", "no signal at lapped bars"]
    rows[1981][3:] = [">80", "no signal at lapped bars"]
    rows.insert(901, rows[900])  # pasted twice
    comment = "# cover scan 11 to 13 September 2018, meter A, soffits, one reading at each link\n"
    text = comment + separated([cover_head, *rows], ",")
    (folder / "cover_2018.csv").write_bytes(text.encode())

    rows = simulate_break_outs(rng, 2018, places)
    rows[6][5] = "rust stains before opening"
    (folder / "section_loss_2018.csv").write_bytes(separated([loss_head, *rows], ",").encode())

    rows = [[name[0].upper() + name[1:] for name in core_head], *simulate_cores(rng, 2025)]
    write_workbook(folder / "cores_2025.xlsx", rows, datetime(2025, 5, 28, 9, 30))

    rows = simulate_covers(rng, 2025)
    for row in rows:
        row[0] = row[0].replace("link", "span 2 link")
    rows[130][4] = "soffit damp, 4 °C"  # the degree sign is what makes this Latin-1
    text = separated([cover_head, *rows], ";").replace("\n", "\r\n")
    (folder / "cover_2025.csv").write_bytes(text.encode("latin-1"))

    rows = simulate_break_outs(rng, 2025, places)
    rows.append(rows[-2])  # pasted twice
    (folder / "section_loss_2025.csv").write_bytes(separated([loss_head, *rows], "\t").encode())


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
