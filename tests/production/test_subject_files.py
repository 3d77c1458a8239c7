from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.files.format import ReadHints
from wavegen.production.subject_files import FilePart, open_subject

HINTS = ReadHints(sample_rate_hz=Fraction(1_000_000))
BENCH = """bench:
  average_power_at_device: -10 dBm
  averaged_over: OVER
  path:
    - {name: cable, gain: -1 dB}
    - {name: amplifier, role: device}
"""


def span(text):
    return TimeSpan.parse(text)


@pytest.fixture
def ramp(tmp_path):
    path = tmp_path / "ramp.cf32_le"
    (np.arange(1000) / 1000).astype("<c8").tofile(path)
    return path


def test_a_plain_file_is_a_recording(ramp):
    subject = open_subject(ramp, HINTS)
    assert (subject.name, subject.loops, subject.is_described) == ("ramp.cf32_le", False, False)
    assert subject.facts["datatype"] == "cf32_le"
    assert subject.code_scale is None


@pytest.mark.parametrize(
    ("part", "first", "n", "loops"),
    [
        (FilePart(first=span("0.1 ms")), 100, 900, False),
        (FilePart(stop=span("7 samples")), 0, 7, False),
        (FilePart(period=span("300 samples"), first=span("50 samples")), 50, 300, True),
        (FilePart(loops=True), 0, 1000, True),
    ],
)
def test_parts(ramp, part, first, n, loops):
    subject = open_subject(ramp, HINTS, part)
    samples = samples_of(subject.signal)
    assert (samples.size, subject.loops) == (n, loops)
    assert samples[1].real == pytest.approx((first + 1) / 1000)


@pytest.mark.parametrize(
    "part",
    [
        FilePart(first=span("1 ms")),
        FilePart(period=span("0 samples")),
        FilePart(stop=span("1001 samples")),
        FilePart(first=span("0.5 samples")),
    ],
)
def test_parts_that_are_not_there(ramp, part):
    with pytest.raises(ArgumentsError):
        open_subject(ramp, HINTS, part)


def test_markers_beside_a_file_are_read_when_wanted(ramp):
    marks = ramp.with_name("ramp.markers.csv")
    marks.write_text("start_sample,n_samples,label\n40,20,burst on\n500,,note\n")
    assert open_subject(ramp, HINTS).annotations == ()
    found = open_subject(ramp, HINTS, FilePart(first=span("50 samples")), reads_markers=True)
    assert [item.start_sample for item in found.annotations] == [-10, 450]
    marks.write_text("nonsense\n")
    assert open_subject(ramp, HINTS).loops is False
    with pytest.raises(FileError):
        open_subject(ramp, HINTS, reads_markers=True)


def made(lab, tmp_path, text):
    lab.make(text, tmp_path)
    (path,) = tmp_path.rglob("*.sigmf-data")
    return path


def test_a_stimulus_is_a_loop_with_all_that_its_sidecar_says(lab, tmp_path):
    gate = "stages: [{kind: gate, duty: 50 %, period: 1 ms}]\n"
    path = made(lab, tmp_path, lab.NOISE + gate)
    subject = open_subject(path)
    assert subject.loops
    assert subject.is_described
    assert subject.cycle_samples is not None
    assert float(subject.bursts.duty) == 0.5
    assert subject.every_loop == ""
    cut = open_subject(path, part=FilePart(first=span("1 samples")))
    assert (cut.loops, cut.cycle_samples, cut.bursts) == (False, None, None)


def test_a_law_of_every_loop_is_told(lab, tmp_path):
    assert open_subject(made(lab, tmp_path, lab.CARRIER)).every_loop


@pytest.mark.parametrize("over", ["period", "burst"])
def test_the_bench_says_what_full_scale_is(lab, tmp_path, over):
    gate = "stages: [{kind: gate, duty: 50 %, period: 1 ms}]\n"
    text = lab.CARRIER + gate + BENCH.replace("OVER", over)
    subject = open_subject(made(lab, tmp_path, text))
    power = np.abs(samples_of(subject.signal).astype(np.complex128)) ** 2
    mean = power.mean() if over == "period" else power[power > 0].mean()
    assert subject.reference_level_dbm == pytest.approx(-10 - 10 * np.log10(mean), abs=1e-4)
    assert "bench" in subject.reference_is
