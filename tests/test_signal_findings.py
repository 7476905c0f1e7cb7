"""Each signal finding is found in a signal made with its fault, and not in a clean one."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from casefile import write_case
from test_findings import ALWAYS, QUIET

from springlife.duty.signal import SignalAccumulator
from springlife.life.assess import Assessment, assess

BLOCKS = 'blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]'
RATE = 200.0
EVENT = 'record = "work.csv"\nchannel = "y"\nsample_rate = "200 Hz"\nunit = "mm"\nmeasures = "deflection"'
# 60 s, 60 times: one hour, which is the quiet case's pass.
REPEATS = "\nrepeats = 60"


def ride(seconds: float = 60.0, top: float = 3.0, seed: int = 1) -> np.ndarray:
    """A clean random ride about 12 mm in mm: band-limited to ``top`` Hz, within 4 to 20 mm."""
    n = int(seconds * RATE)
    rng = np.random.default_rng(seed)
    frequency = np.fft.rfftfreq(n, 1 / RATE)
    shape = (frequency > 0.2) & (frequency < top)
    motion = np.fft.irfft(shape * np.exp(2j * np.pi * rng.random(frequency.size)), n)
    return 12 + 2.2 * motion / motion.std()


def judged(
    folder: Path, samples: np.ndarray, event: str = EVENT, repeats: str = REPEATS, case: str = QUIET
) -> Assessment:
    record = "y\n" + "\n".join(f"{value:.4f}" for value in samples) + "\n"
    return assess(write_case(folder, case.replace(BLOCKS, event + repeats), record))


def codes(result: Assessment) -> set[tuple[str, str]]:
    return {(finding.code, finding.level) for finding in result.findings}


def test_a_clean_ride_has_no_signal_finding(tmp_path: Path) -> None:
    found = {code for code, _ in codes(judged(tmp_path, ride()))}
    assert found <= ALWAYS | {"one-cycle-rules", "noise-counted"}


def with_spike(y: np.ndarray) -> np.ndarray:
    y = y.copy()
    y[5000] += 9.0
    return y


def clipped(y: np.ndarray) -> np.ndarray:
    return np.minimum(y, 14.0)


def drifting(y: np.ndarray) -> np.ndarray:
    return y - 3 + np.linspace(0, 6, y.size)


def coarse(y: np.ndarray) -> np.ndarray:
    return np.round(y / 0.5) * 0.5


def noisy(y: np.ndarray) -> np.ndarray:
    return y + 0.05 * np.random.default_rng(5).standard_normal(y.size)


TRAVEL = EVENT.replace('"deflection"', '"travel"')

FAULTS: list[tuple[str, str, Callable[[np.ndarray], np.ndarray], str]] = [
    ("swapped-signal", "stop", lambda y: 55 - y, EVENT),  # lengths called deflections
    ("swapped-signal", "stop", lambda y: -(y - 12) - 3 - 12, TRAVEL + '\ninstalled_deflection = "15 mm"'),
    ("wrong-datum", "stop", lambda y: y + 2, TRAVEL + '\ninstalled_deflection = "12 mm"'),  # preload counted twice
    ("wrong-datum", "stop", lambda y: y, TRAVEL + '\ninstalled_deflection = "0 mm"'),
    ("ac-coupled", "stop", lambda y: y - y.mean(), EVENT),
    ("spikes", "warn", with_spike, EVENT),
    ("clipped-sensor", "warn", clipped, EVENT),
    ("drift", "warn", drifting, EVENT),
    ("coarse-steps", "note", coarse, EVENT),
    ("noise-counted", "note", noisy, EVENT),
    ("undersampled", "warn", lambda y: y[:: int(RATE / 10)], EVENT.replace("200 Hz", "10 Hz")),
]


@pytest.mark.parametrize(("code", "level", "fault", "event"), FAULTS, ids=[f"{f[0]}-{i}" for i, f in enumerate(FAULTS)])
def test_fault_is_found(
    code: str, level: str, fault: Callable[[np.ndarray], np.ndarray], event: str, tmp_path: Path
) -> None:
    assert (code, level) in codes(judged(tmp_path, fault(ride()), event))


def test_spike_s_damage_is_told_with_and_without(tmp_path: Path) -> None:
    result = judged(tmp_path, with_spike(ride()))
    (message,) = (finding.message for finding in result.findings if finding.code == "spikes")
    assert "1 isolated samples (first at 5001)" in message and "times as large" in message


def test_half_the_rate_changes_the_damage_of_a_poorly_sampled_ride(tmp_path: Path) -> None:
    result = judged(tmp_path, ride()[::20], EVENT.replace("200 Hz", "10 Hz"))
    assert any("every second sample" in f.message for f in result.findings if f.code == "undersampled")


def test_short_record_stands_for_long(tmp_path: Path) -> None:
    assert ("short-record", "warn") in codes(judged(tmp_path, ride(), repeats="\nrepeats = 1001"))
    assert ("short-record", "warn") not in codes(judged(tmp_path, ride(), repeats="\nrepeats = 999"))


@pytest.mark.parametrize(("repeats", "found"), [(60, False), (62, False), (70, True), (40, True)])
def test_durations_add_up_to_a_pass(repeats: int, found: bool, tmp_path: Path) -> None:
    result = codes(judged(tmp_path, ride(), repeats=f"\nrepeats = {repeats}"))
    assert (("repeats-mismatch", "warn") in result) == found


def test_a_pass_that_is_no_time_has_no_duration(tmp_path: Path) -> None:
    case = QUIET.replace("1 h", "1 round").replace("100 h", "100 rounds")
    assert "repeats-mismatch" not in {code for code, _ in codes(judged(tmp_path, ride(), case=case, repeats=""))}


def test_fast_motion_is_near_surge(tmp_path: Path) -> None:
    """f1 is 282 Hz; a thirteenth is 21.7 Hz."""
    assert ("near-surge", "warn") in codes(judged(tmp_path, ride(top=40.0)))
    assert ("near-surge", "warn") not in codes(judged(tmp_path, ride(top=15.0)))


def test_content_at_the_surge_frequency_itself(tmp_path: Path) -> None:
    t = np.arange(20000) / 2000.0
    slow = 12 + 5 * np.sin(2 * np.pi * 2 * t)
    ringing = slow + 0.3 * np.sin(2 * np.pi * 281.5 * t)
    event = EVENT.replace("200 Hz", "2000 Hz")
    messages = [f.message for f in judged(tmp_path, ringing, event, "").findings if f.code == "near-surge"]
    assert messages and "1 f1" in messages[0]
    assert "near-surge" not in {code for code, _ in codes(judged(tmp_path, slow, event, ""))}


def test_a_step_faster_than_the_wave(tmp_path: Path) -> None:
    """At 5 kHz a sample (0.2 ms) is shorter than half the wave's 1.8 ms; 1 mm in it is 5 m/s, K v sqrt(2 rho G)."""
    t = np.arange(10000) / 5000.0
    slow = 12 + 5 * np.sin(2 * np.pi * 2 * t)
    event = EVENT.replace("200 Hz", "5000 Hz")
    stepped = slow + (t > 1.0) * 1.0
    messages = [f.message for f in judged(tmp_path, stepped, event, "").findings if f.code == "impact"]
    # 35.66 MPa per m/s (81.01 GPa, 7850 kg/m3) times KB(8) = 1.1724 times 5.063 m/s: 211.7 MPa, by hand.
    assert messages and "212 MPa" in messages[0]
    assert "impact" not in {code for code, _ in codes(judged(tmp_path, slow, event, ""))}


@pytest.mark.parametrize(
    ("rate", "code", "words"),
    [
        ("3.956 N/mm", None, ""),
        ("4.2 N/mm", None, ""),
        ("100.5 N/mm", "unit-mismatch", "25.4 (inch and mm)"),
        ("17.6 N/mm", "unit-mismatch", "4.448 (lbf and N)"),
        ("0.403 N/mm", "unit-mismatch", "9.81 (kgf and N)"),
        ("3956 N/mm", "unit-mismatch", "1000"),
        ("5.9 N/mm", "rate-mismatch", "an outer diameter"),  # (14/16)^-3 = 1.49
        ("2.78 N/mm", "rate-mismatch", "an inner diameter"),  # (18/16)^-3 = 0.70
        ("3.3 N/mm", "rate-mismatch", "two more coils"),  # 10/12
        ("4.95 N/mm", "rate-mismatch", "two fewer coils"),  # 10/8
        ("8 N/mm", "rate-mismatch", "no other reading"),
    ],
)
def test_measured_rate_against_the_calculated_one(rate: str, code: str | None, words: str, tmp_path: Path) -> None:
    case = QUIET.replace("total_coils", f'measured_rate = "{rate}"\ntotal_coils')
    found = {f.code: f.message for f in assess(write_case(tmp_path, case, None)).findings}
    mismatches = {"unit-mismatch", "rate-mismatch"} & set(found)
    assert mismatches == ({code} if code else set())
    assert code is None or words in found[code]


def test_peaks_between_samples_are_an_estimate_beside_the_plain_count(tmp_path: Path) -> None:
    """A sine sampled eight times a cycle, never at its peaks, loses 1 - cos(22.5 deg) of its amplitude."""
    n = np.arange(8 * 500)
    y = 12 + 6 * np.cos(2 * np.pi * (n + 0.5) / 8)
    event = EVENT.replace("200 Hz", "16 Hz")
    asked = QUIET.replace("[judge]", "[judge]\npeaks_between_samples = true")
    plain, beside = judged(tmp_path, y, event, ""), judged(tmp_path, y, event, "", asked)
    assert plain.judgement is not None and beside.judgement is not None
    assert beside.judgement.damage_per_pass == plain.judgement.damage_per_pass
    (message,) = (f.message for f in beside.findings if f.code == "peaks-between")
    factor = float(message.split("would be ")[1].split()[0])
    # Haibach's slope 2k - 1 = 11.06 on the amplitude alone (k = 6.03), by hand: 1.0824^11.06 = 2.40.
    assert factor == pytest.approx(2.40, rel=0.02)
    assert "peaks-between" not in {code for code, _ in codes(plain)}


@pytest.mark.parametrize("size", [1, 7, 1000, 100_000])
def test_facts_do_not_depend_on_the_blocks(size: int) -> None:
    """Fed sample by sample or whole: the same count at half rate, steps, crossings and runs."""
    y = with_spike(ride(40.0))[2000:]
    y[100:130] = 12.0
    whole, parts = SignalAccumulator(), SignalAccumulator()
    whole.feed(y)
    for start in range(0, y.size, size):
        parts.feed(y[start : start + size])
    one, other = whole.result(RATE), parts.result(RATE)
    assert one.half_rate == other.half_rate and one.samples == other.samples and one.fastest == other.fastest
    if size >= 1000:
        assert (one.spikes, one.longest_inside) == (other.spikes, other.longest_inside)


def test_spectrum_finds_the_sine() -> None:
    t = np.arange(40000) / 1000.0
    signal = SignalAccumulator()
    signal.feed(5 + np.sin(2 * np.pi * 20 * t) + 0.1 * np.sin(2 * np.pi * 150 * t))
    spectrum = signal.result(1000.0).spectrum
    assert spectrum is not None
    assert float(spectrum.frequency[np.argmax(spectrum.power)]) == pytest.approx(20, abs=0.3)
    # Powers of two sines are as their amplitudes squared: 1 to 0.01.
    assert spectrum.share_near(150.0, 0.02) == pytest.approx(0.01 / 1.01, rel=0.02)
    assert spectrum.below(0.9) < 21
