"""Make the sample logs: probes for refrigerated produce trailers. All of it is invented.

Run ``python make_samples.py [FOLDER]``; it needs numpy and scipy, and not tauworkbench.
"""

from __future__ import annotations

import json
import sys
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from simulated_rig import FRACTIONS, Current, Divider, Law, Logger, Network, Phase, Rig, lagged

SEED = 20260302

# -------------------------------------------------------------------------------------- probes


@dataclass(frozen=True)
class Probe:
    """One of the invented probes.

    Heat capacities [J/K] and inner conductances [W/K] from the bead outwards; the film's
    conductance [W/K] in still air, in the bath, and in a stream ``air[0] + air[1] sqrt(m/s)``.
    """

    sensor: str
    mounting: str
    capacities: tuple[float, ...]
    inner: tuple[float, ...]
    still_air: float
    bath: float
    air: tuple[float, float]
    law: Law
    law_toml: str

    def network(self, film: float) -> Network:
        """Return the chain with this film."""
        return Network(self.capacities, self.inner, film)

    def stream(self, speed_m_s: float) -> float:
        """Return the film's conductance in moving air [W/K]."""
        return self.air[0] + self.air[1] * speed_m_s**0.5


def _beta(resistance: float, beta_k: float) -> tuple[Law, str]:
    words = f'kind = "beta"\nresistance = {resistance}\ntemperature_c = 25.0\nbeta_k = {beta_k}'
    return Law.beta(resistance, 25.0, beta_k), words


BARE = Probe(
    "bare bead", "bare", (0.0042,), (), 0.0006, 0.0140, (0.0004, 0.0011), *_beta(1e4, 3900.0)
)
POTTED = Probe(
    "epoxy-potted bead", "epoxy-potted", (0.0042, 0.045), (0.0080,), 0.0011, 0.0400,
    (0.0009, 0.0021), *_beta(5e3, 3700.0),
)  # fmt: skip
SHEATHED = Probe(
    "steel-sheathed probe", "steel sheath", (0.35, 0.50), (0.090,), 0.0080, 0.350,
    (0.006, 0.014), Law(1.1e-3, 2.36e-4, 8.2e-8),
    'kind = "steinhart-hart"\na = 1.1e-3\nb = 2.36e-4\nc = 8.2e-8',
)  # fmt: skip

# ------------------------------------------------------------------------------------ scenario


@dataclass(frozen=True)
class Sample:
    """A log to be written, with its run file.

    ``film`` is the last phase's [W/K]; ``test`` and the tables in ``more`` go into the run file.
    ``reference`` is a faster thermometer's time constant [s], when the medium was logged too.
    """

    name: str
    about: str
    probe: Probe
    phases: list[Phase]
    logger: Logger
    test: dict
    form: str = "volts"
    circuit: Divider | Current = field(default_factory=Divider)
    more: dict = field(default_factory=dict)
    reference: float | None = None

    @property
    def network(self) -> Network:
        """The chain in the medium that it is tested in."""
        return self.probe.network(self.phases[-1].film)


def plunge(name: str, probe: Probe, course: tuple, logger: Logger, **how) -> Sample:
    """Plunge out of still air into the bath; ``course``: start [degC], bath [degC], onset [s]."""
    start_c, final_c, onset_s = course
    film = probe.bath * how.pop("stirring", 1.0)
    phases = [Phase(0.0, probe.still_air, start_c), Phase(onset_s, film, final_c)]
    test = {
        "kind": "plunge", "sensor": probe.sensor, "medium": "stirred bath", "speed_m_s": 0.4,
        "immersion_mm": 60.0, "medium_c": final_c, "mounting": probe.mounting,
    }  # fmt: skip
    about = f"{probe.sensor}: out of still air at {start_c} degC into a stirred bath"
    return Sample(name, about, probe, phases, logger, test, **how)


def air_step(name: str, probe: Probe, speed: float, logger: Logger) -> Sample:
    """Open a shutter: still cold air gives way to a warm stream, in a ramp of 0.2 s."""
    start_c, final_c, onset_s, transfer_s = 6.0, 31.0, 15.2, 0.2
    film = probe.stream(speed)

    def opening(t):
        return start_c + (final_c - start_c) * np.clip((t - onset_s) / transfer_s, 0.0, 1.0)

    phases = [
        Phase(0.0, probe.still_air, start_c),
        Phase(onset_s, film, opening),
        Phase(onset_s + transfer_s, film, final_c),
    ]
    test = {
        "kind": "air-step", "sensor": probe.sensor, "medium": "air", "speed_m_s": speed,
        "medium_c": final_c, "mounting": probe.mounting, "transfer_s": transfer_s,
    }  # fmt: skip
    about = f"{probe.sensor}: a shutter lets warm air at {speed:g} m/s onto the cold probe"
    return Sample(name, about, probe, phases, logger, test, form="counts")


def slow_stream() -> Sample:
    """Switch on a heater that needs a while, so the stream's own temperature is logged beside."""
    probe, speed, onset_s = SHEATHED, 3.0, 20.0
    film = probe.stream(speed)

    def stream(t):
        return 6.0 + 25.0 * -np.expm1(-np.clip(np.asarray(t) - onset_s, 0, None) / 8.0)

    phases = [Phase(0.0, film, stream), Phase(onset_s, film, stream)]
    test = {
        "kind": "air-step", "sensor": probe.sensor, "medium": "air", "speed_m_s": speed,
        "mounting": probe.mounting,
    }  # fmt: skip
    reference = {"column": "stream", "unit": "degC", "time_constant_s": 0.4}
    return Sample(
        "sheathed_duct_3", "steel-sheathed probe in a duct whose heater is switched on", probe,
        phases, Logger(0.5, 320.0), test, "reference",
        more={"reference": reference, "model": {"input": "reference"}}, reference=0.4,
    )  # fmt: skip


def self_heating() -> Sample:
    """Heat by a current after a measuring current, in still air."""
    probe, at_s = POTTED, 60.0

    def current(t):
        return np.where(np.asarray(t) < at_s, 5e-5, 6e-4)

    phases = [Phase(0.0, probe.still_air, 20.0), Phase(at_s, probe.still_air, 20.0)]
    test = {
        "kind": "self-heating", "sensor": probe.sensor, "medium": "still air", "speed_m_s": 0.0,
        "ambient_c": 20.0, "mounting": probe.mounting,
    }  # fmt: skip
    logger = Logger(0.5, 420.0, noise_v=2e-4, bits=16, reference=5.0)
    about = "epoxy-potted bead in still air: 0.05 mA, then 0.6 mA"
    return Sample(
        "potted_self_heating", about, probe, phases, logger, test, "current", Current(current)
    )


def trailer_air_c(time_s):
    """Return the trailer's air [degC]: a compressor's cycle; a door is open from 600 to 870 s."""
    t = np.asarray(time_s, float)
    cycle = 3.0 + 0.7 * np.sin(2 * np.pi * t / 660.0)
    mixed = 1 - np.exp(-np.clip(t - 600.0, 0, 270.0) / 25.0)
    after = np.exp(-np.clip(t - 870.0, 0, None) / 140.0)
    gusts = 1.2 * np.sin(2 * np.pi * t / 47.0) * ((t > 600.0) & (t < 870.0))
    return cycle + (14.0 * mixed + gusts) * after


def door_opened() -> Sample:
    """Log a probe in the field: the air is what is to be recovered."""
    probe, speed = SHEATHED, 1.5
    film = probe.stream(speed)
    phases = [Phase(start, film, trailer_air_c) for start in (0.0, 600.0, 870.0)]
    test = {
        "kind": "field", "sensor": probe.sensor, "medium": "air", "speed_m_s": speed,
        "mounting": probe.mounting,
    }  # fmt: skip
    about = "steel-sheathed probe in the trailer's air stream; the door is opened for 270 s"
    taus = [round(t, 2) for t in probe.network(film).time_constants_s()]
    recover = {"recover": {"time_constants_s": taus}}
    return Sample(
        "door_opened", about, probe, phases, Logger(1.0, 2400.0), test, "stamps", more=recover
    )


def scenario() -> list[Sample]:
    """Return every sample; the first is the one that the bench opens."""
    ten, twenty, fifty = Logger(0.1, 80.0, jitter_s=0.002), Logger(0.05, 25.0), Logger(0.02, 8.0)
    return [
        plunge("sheathed_bath_heating", SHEATHED, (4.0, 42.0, 12.37), ten),
        plunge("sheathed_bath_heating_2", SHEATHED, (4.3, 42.0, 10.91), ten, stirring=0.985),
        plunge("sheathed_bath_heating_3", SHEATHED, (3.8, 41.9, 14.08), ten, stirring=1.02),
        plunge("sheathed_bath_cooling", SHEATHED, (24.0, 2.0, 11.64), ten, form="counts"),
        plunge("potted_bath_heating", POTTED, (4.0, 38.0, 5.213), twenty, form="counts"),
        plunge("potted_bath_cooling", POTTED, (24.0, 2.0, 4.871), twenty, form="counts"),
        plunge("bare_bath_heating", BARE, (4.0, 38.0, 2.1337), fifty, form="semicolons"),
        plunge("bare_bath_cooling", BARE, (24.0, 2.0, 2.4262), fifty, form="semicolons"),
        *(air_step(f"potted_duct_{v}", POTTED, float(v), Logger(0.1, 160.0)) for v in (1, 2, 3, 5)),
        slow_stream(),
        self_heating(),
        door_opened(),
    ]


# --------------------------------------------------------------------------------------- files

INVENTED = "# Invented data, made by make_samples.py; the truth is in known_answers.json."

# Of each form of log: its header, its row and the keys of [log] that read it.
COUNTS = 'time = "elapsed_s"\nsignal = "adc"\nunits = { time = "s", signal = "counts" }'
STAMPS = 'time = "stamp"\nsignal = "adc"\nunits = { signal = "counts" }'
FORMS = {
    "volts": (
        "elapsed [s],v_mid [V]", "{t:.4f},{v:.4f}", 'time = "elapsed"\nsignal = "v_mid"',
    ),
    "counts": ("elapsed_s,adc", "{t:.4f},{code}", COUNTS),
    "semicolons": (
        "elapsed [s];v_mid [mV]", "{t:.4f};{mv:.2f}", 'time = "elapsed"\nsignal = "v_mid"',
    ),
    "stamps": ("stamp,adc", "{stamp},{code}", STAMPS),
    "reference": ("elapsed_s,adc,stream", "{t:.4f},{code},{reference:.2f}", COUNTS),
    "current": (
        "elapsed [s],v_sensor [V],i_source [mA]", "{t:.4f},{v:.5f},{ma:.4f}",
        'time = "elapsed"\nsignal = "v_sensor"',
    ),
}  # fmt: skip


def log_file(sample: Sample, rng: np.random.Generator) -> tuple[str, np.ndarray]:
    """Return the log's text and the element's true temperature at each row."""
    times = sample.logger.times(rng)
    rig = Rig(sample.network, sample.probe.law, sample.circuit)
    element = rig.element_c(times, sample.phases)
    resistance = sample.probe.law.resistance(element)
    codes = sample.logger.codes(sample.circuit.signal(resistance, times), rng)
    volts = sample.logger.volts(codes)
    more = {"reference": np.zeros(times.size), "ma": np.zeros(times.size)}
    if sample.reference is not None:
        medium = lagged(times, sample.phases[-1].medium, sample.reference)
        more["reference"] = medium + rng.normal(0, 0.02, times.size)
    if isinstance(sample.circuit, Current):
        more["ma"] = 1e3 * sample.circuit.current(times)
    header, row, _ = FORMS[sample.form]
    lines = [header]
    for i, t in enumerate(times):
        stamp = np.datetime64("2026-03-02T06:00:00") + np.timedelta64(int(t), "s")
        values = {"t": t, "code": codes[i], "v": volts[i], "mv": 1e3 * volts[i], "stamp": stamp}
        lines.append(row.format(**values, **{name: column[i] for name, column in more.items()}))
    text = "\n".join(lines) + "\n"
    return (text.replace(".", ",") if sample.form == "semicolons" else text), element


def run_file(sample: Sample) -> str:
    """Return the run file's text."""
    parts = [
        f"# {sample.about}.\n{INVENTED}",
        f'[log]\nfile = "{sample.name}.csv"\n{FORMS[sample.form][2]}',
        f"[circuit]\n{_circuit_toml(sample)}",
        f"[law]\n{sample.probe.law_toml}",
        f"[test]\n{_table(sample.test)}",
        *(f"[{name}]\n{_table(values)}" for name, values in sample.more.items()),
    ]
    return "\n\n".join(parts) + "\n"


def _circuit_toml(sample: Sample) -> str:
    if isinstance(sample.circuit, Current):
        return 'kind = "current"\ncurrent = "i_source"'
    divider, logger = sample.circuit, sample.logger
    words = (
        f'kind = "divider"\nsupply = {divider.supply}\nfixed = {divider.fixed}\n'
        'sensor_leg = "low"\nfixed_rel_u = 0.0005'
    )
    if "{code}" in FORMS[sample.form][1]:
        words += f"\ncounts = {{ bits = {logger.bits}, reference = {logger.reference} }}"
    return words


def _table(values: dict) -> str:
    """TOML and JSON write such numbers, words and lists alike."""
    return "\n".join(f"{k} = {json.dumps(v)}" for k, v in values.items())


def answers(sample: Sample, element: np.ndarray) -> dict:
    """Return what is known; start and final are the element's, self-heating included."""
    known = {"sensor": sample.probe.sensor, "test": sample.test["kind"], **sample.network.truth()}
    if sample.test["kind"] != "field":
        known["onset_s"] = sample.phases[1].start_s
        known |= {"start_c": float(element[0]), "final_c": float(element[-1])}
    return known


def _rounded(value):
    if isinstance(value, dict):
        return {k: _rounded(v) for k, v in value.items()}
    if isinstance(value, list):
        return [_rounded(v) for v in value]
    return float(f"{value:.7g}") if isinstance(value, float) else value


CAMPAIGN = """\
# Invented data: every plunge and air step of the three probes, pooled per medium and speed.
[campaign]
name = "three probes for refrigerated produce trailers"
runs = ["*_bath_*.toml", "*_duct_*.toml"]
limit_s = 10.0
speed_exponent = "fit"
"""


def main(folder: Path) -> None:
    """Write logs, run files, campaign file and known answers."""
    folder.mkdir(parents=True, exist_ok=True)

    def write(name: str, text: str) -> None:
        (folder / name).write_text(text, encoding="utf-8", newline="\n")

    known = {}
    for number, sample in enumerate(scenario()):
        text, element = log_file(sample, np.random.default_rng([SEED, number]))
        write(f"{sample.name}.csv", text)
        write(f"{sample.name}.toml", run_file(sample))
        known[sample.name] = answers(sample, element)
        print(f"{sample.name}: {len(element)} rows")
    about = "Invented data. True values at zero power, of the network behind each log."
    document = _rounded({"about": about, "fractions": FRACTIONS, "runs": known})
    write("known_answers.json", json.dumps(document, indent=1) + "\n")
    write("campaign.toml", CAMPAIGN)
    times = np.arange(0.0, 2400.0)
    rows = (f"{t:.0f},{a:.4f}" for t, a in zip(times, trailer_air_c(times), strict=True))
    write("door_opened_truth.csv", "\n".join(["time_s,ambient_c", *rows]) + "\n")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
