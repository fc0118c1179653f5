"""The readings of examples/film_campaign, made from films that are known: all invented, all from a seed.

Run ``python tests/film_campaign.py`` in the repository to write the files again. Python's own
``random()`` gives the same numbers in every version, so the files can be compared with what is made here.
"""

from __future__ import annotations

import random
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from statistics import NormalDist

FOLDER = Path(__file__).parents[1] / "examples" / "film_campaign"
REFERENCE_DEGC = 25.0
LOTS = ("K1", "K2", "K3", "K4", "K5", "K6", "K7", "K8")
DEVICES = ("a", "b", "c")  # of each lot
UP = (-55.0, -30.0, -5.0, 25.0, 50.0, 75.0, 100.0, 125.0, 140.0)
CHAMBER_OFFSET_K = 0.06  # what the chamber was off by in this campaign: half of the stated uncertainty
CHAMBER_SCALE = -0.0005
METER_SCALE = 40e-6


@dataclass(frozen=True)
class Film:
    """What a film is: means, standard deviations of lots and of devices in a lot, and its readings.

    ``tc1_per_percent`` is what a lot gains in TC1 [ppm/K] for each per cent of sheet resistance.
    ``hysteresis_ppm`` is how far the way down lies above the way up, in the middle of it.
    """

    sheet_ohm: float
    squares: float
    tc1_ppm: float
    tc2_ppm: float
    sheet_lot_percent: float
    sheet_device_percent: float
    tc1_lot_ppm: float
    tc1_device_ppm: float
    tc2_device_ppm: float
    noise_ppm: float
    tc1_per_percent: float = 0.0
    hysteresis_ppm: float = 0.0


@dataclass(frozen=True)
class Device:
    """One resistor as it is, free of errors."""

    lot: str
    name: str
    ohms: float
    tc1_ppm: float
    tc2_ppm: float

    def at(self, degC: float) -> float:
        """Return R [ohm]."""
        x = degC - REFERENCE_DEGC
        return self.ohms * (1.0 + self.tc1_ppm * 1e-6 * x + self.tc2_ppm * 1e-6 * x * x)


FILMS = {
    "amber_film": Film(
        sheet_ohm=1100.0,
        squares=20.0,
        tc1_ppm=-640.0,
        tc2_ppm=0.9,
        sheet_lot_percent=1.2,
        sheet_device_percent=0.3,
        tc1_lot_ppm=1.5,
        tc1_device_ppm=1.0,
        tc2_device_ppm=0.006,
        noise_ppm=60.0,
        tc1_per_percent=-3.0,
    ),
    "moss_film": Film(
        sheet_ohm=240.0,
        squares=50.0,
        tc1_ppm=190.0,
        tc2_ppm=0.42,
        sheet_lot_percent=1.0,
        sheet_device_percent=0.3,
        tc1_lot_ppm=2.5,
        tc1_device_ppm=1.0,
        tc2_device_ppm=0.005,
        noise_ppm=60.0,
    ),
    "iron_film": Film(
        sheet_ohm=72.0,
        squares=120.0,
        tc1_ppm=1450.0,
        tc2_ppm=0.55,
        sheet_lot_percent=0.9,
        sheet_device_percent=0.2,
        tc1_lot_ppm=3.0,
        tc1_device_ppm=1.5,
        tc2_device_ppm=0.006,
        noise_ppm=50.0,
        hysteresis_ppm=120.0,
    ),
}

Noise = Callable[[float], float]


def noise_of(name: str) -> Noise:
    """Return a source of normal numbers with a standard deviation, the same for a name every time."""
    source, normal = random.Random(f"film campaign, {name}"), NormalDist()

    def draw(sigma: float) -> float:
        return sigma * normal.inv_cdf(source.random() or 0.5)

    return draw


def devices_of(name: str) -> list[Device]:
    """Return the devices of a film."""
    film, noise = FILMS[name], noise_of(f"{name}, devices")
    found = []
    for lot in LOTS:
        percent, tc1 = noise(film.sheet_lot_percent), noise(film.tc1_lot_ppm)
        tc1 += film.tc1_per_percent * percent
        for device in DEVICES:
            found.append(
                Device(
                    lot=lot,
                    name=device,
                    ohms=film.sheet_ohm
                    * film.squares
                    * (1.0 + (percent + noise(film.sheet_device_percent)) / 100.0),
                    tc1_ppm=film.tc1_ppm + tc1 + noise(film.tc1_device_ppm),
                    tc2_ppm=film.tc2_ppm + noise(film.tc2_device_ppm),
                )
            )
    return found


def readings_of(name: str) -> Iterator[tuple[Device, float, float]]:
    """Yield each reading of a film: its device, T as the chamber says [degC], and R as the meter says [ohm].

    The film with hysteresis is read on the way down as well.
    """
    film, noise = FILMS[name], noise_of(f"{name}, readings")
    temperatures = (*UP, *UP[-2::-1]) if film.hysteresis_ppm else UP
    for device in devices_of(name):
        for n, said in enumerate(temperatures):
            real = said + CHAMBER_OFFSET_K + CHAMBER_SCALE * (said - REFERENCE_DEGC)
            ohms = device.at(real) * (1.0 + METER_SCALE + noise(film.noise_ppm * 1e-6))
            part = (said - UP[0]) / (UP[-1] - UP[0])
            side = 0.5 if n >= len(UP) else -0.5  # the loop is closed at both ends, widest in the middle
            ohms *= 1.0 + side * 4.0 * part * (1.0 - part) * film.hysteresis_ppm * 1e-6
            yield device, said, ohms


def amber() -> str:
    """Return the file of the first film: commas, ohm, u(R), two rows that are no readings."""
    lines = ["# film lab, run 12, four-wire, invented readings", "T [degC],R [ohm],u(R) [ppm],device,lot"]
    for n, (device, degC, ohms) in enumerate(readings_of("amber_film")):
        shown = {40: "overload", 131: ""}.get(n, f"{ohms:.2f}")
        lines.append(f"{degC:g},{shown},60,{device.name},{device.lot}")
    return "\n".join(lines) + "\n"


def moss() -> str:
    """Return the file of the second film: semicolons, decimal commas, kohm, and one reading far off."""
    lines = ["lot;device;T [degC];R [kohm];operator"]
    for n, (device, degC, ohms) in enumerate(readings_of("moss_film")):
        ohms *= 1.0 + 2200e-6 * (n == 97)  # the reading was taken before the chamber had settled
        row = f"{device.lot};{device.name};{degC:g};{ohms / 1e3:.6f};F"
        lines.append(row.replace(".", ","))
    return "\n".join(lines) + "\n"


def iron() -> str:
    """Return the file of the third film: tabs, up and down, kelvin, one comment among the readings."""
    lines = ["device\tlot\tT/K\tR (ohm)\tu(R) (%)"]
    for n, (device, degC, ohms) in enumerate(readings_of("iron_film")):
        if n == 200:
            lines.append("# chamber refilled")
        lines.append(f"{device.name}\t{device.lot}\t{degC + 273.15:.2f}\t{ohms:.3f}\t0.005")
    return "\n".join(lines) + "\n"


def files() -> dict[str, str]:
    """Return the content of the files of readings, by name."""
    return {"amber_film.csv": amber(), "moss_film.csv": moss(), "iron_film.csv": iron()}


if __name__ == "__main__":
    for name, text in files().items():
        (FOLDER / name).write_text(text, encoding="utf-8", newline="\n")
