import csv
import hashlib

import numpy as np
import pytest

from wavegen.files.format import ReadHints
from wavegen.production.check import check
from wavegen.production.convert import Conversion, convert
from wavegen.production.side_information import NumbersMeter, NumbersReading, _runs
from wavegen.production.stimulus import find_stimulus

N_FFT, N_SYMBOLS = 64, 12
RATE = (
    "sample_rate: 960 kHz\nduration: 12 symbols\noutput: {iq: [{format: raw, datatype: cf32_le}]}\n"
)
OFDM = (
    "kind: ofdm, subcarrier_spacing: 15 kHz, cyclic_prefix: 1/8, frame: 3 symbols, "
    "groups: [{subcarriers: '-20..-1, 1..20', constellation: qpsk, symbols: '0, 2'}, "
    "{subcarriers: '-20..-5, 6..20', constellation: 16qam, symbols: '1'}], "
    "pilots: [{subcarriers: '-4, 5', values: [1, -1], symbols: '1'}]"
)
STAGES = "stages: [{kind: selected_mapping, candidates: 5}]\n"
SINGLE = f"wavegen: 1\nseed: 3\n{RATE}signal: {{{OFDM}}}\n"


def table(path):
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def symbols_in(folder, name, *, prefix=8):
    """Return subcarriers of each symbol of a file, by a transform of the test's own."""
    samples = np.fromfile(folder / f"{name}.cf32_le", "<c8").astype(np.complex128)
    rows = samples.reshape(-1, N_FFT + prefix)[:, prefix:]
    return np.fft.fft(rows, axis=1)


def turned_back(bins, folder, name, stage="stages[0]"):
    """Undo selected mapping by what stands in the two tables and nothing else."""
    choice = {
        int(row["symbol"]): row["candidate"]
        for row in table(folder / f"{name}.choices.csv")
        if row["stage"] == stage
    }
    out = bins.copy()
    for row in table(folder / f"{name}.sequences.csv"):
        if row["stage"] != stage:
            continue
        listed = set()
        for run in row["symbols"].split(","):
            low, _, high = run.partition("..")
            listed |= set(range(int(low), int(high or low) + 1))
        for symbol, candidate in choice.items():
            if candidate == row["candidate"] and symbol % int(row["frame_symbols"]) in listed:
                out[symbol, int(row["subcarrier"])] *= (-1j) ** int(row["quarter_turns"])
    return out


def error_of(found, wanted):
    gain = np.vdot(wanted, found) / np.vdot(wanted, wanted)
    return np.linalg.norm(found / gain - wanted) / np.linalg.norm(wanted)


@pytest.fixture(scope="module")
def made(lab, tmp_path_factory):
    out = tmp_path_factory.mktemp("side")
    plain = lab.make(SINGLE, out, "plain")
    turned = lab.make(SINGLE + STAGES, out, "turned")
    return plain, turned


def test_the_files_alone_undo_it(made):
    plain, turned = made
    wanted = symbols_in(plain.folder, "plain")
    found = symbols_in(turned.folder, "turned")
    assert error_of(found, wanted) > 0.5  # most symbols took another candidate
    back = turned_back(found, turned.folder, "turned")
    assert error_of(back, wanted) < 1e-5  # single precision


def test_pilots_and_what_is_off_are_not_listed_as_turned(made):
    _, turned = made
    rows = table(turned.folder / "turned.sequences.csv")
    assert {row["frame_symbols"] for row in rows} == {"3"}
    where = {row["subcarrier"]: row["symbols"] for row in rows}
    assert where["5"] == "0, 2"  # a pilot stands there in symbol 1
    assert where["3"] == "0, 2"  # nothing does
    assert where["7"] == "0..2"
    assert {row["quarter_turns"] for row in rows if row["candidate"] == "0"} == {"0"}
    assert len(rows) == 5 * 40


def test_the_sidecar_lists_both_with_their_hashes(made):
    plain, turned = made
    listed = turned.document["side_information"]
    assert [item["name"] for item in listed] == ["turned.choices.csv", "turned.sequences.csv"]
    for item in listed:
        bytes_of = (turned.folder / item["name"]).read_bytes()
        assert item["sha512"] == hashlib.sha512(bytes_of).hexdigest()
        assert turned.folder / item["name"] in turned.files
    assert find_stimulus(turned.folder).document["side_information"] == listed
    assert plain.document["side_information"] is None
    assert not list(plain.folder.glob("*.choices.csv"))
    assert not list(plain.folder.glob("*.sequences.csv"))


@pytest.mark.parametrize("workers", [1, 3])
def test_parts_of_a_sum_are_told_apart(lab, tmp_path, workers):
    one = f"{{frequency_offset: 0 Hz, signal: {{{OFDM}}}, {STAGES.strip()}}}"
    other = one.replace("candidates: 5", "candidates: 3")
    text = f"wavegen: 1\nseed: 3\n{RATE}signal: {{kind: sum, parts: [{one}, {other}]}}\n"
    made = lab.make(text, tmp_path, "pair", workers=workers)
    rows = table(made.folder / "pair.choices.csv")
    stages = [row["stage"] for row in rows]
    assert (
        stages
        == ["signal.parts[0].stages[0]"] * N_SYMBOLS + ["signal.parts[1].stages[0]"] * N_SYMBOLS
    )
    assert [int(row["symbol"]) for row in rows] == 2 * list(range(N_SYMBOLS))
    second = table(made.folder / "pair.sequences.csv")[5 * 40 :]
    assert {row["candidate"] for row in second} == {"0", "1", "2"}


def test_of_two_stages_in_a_row_the_last_is_undone_first(lab, tmp_path):
    one = "{kind: selected_mapping, candidates: 4}"
    stages = f"stages: [{one}, {one.replace('4', '2')}]\n"
    lab.make(SINGLE, tmp_path, "plain")
    made = lab.make(SINGLE + stages, tmp_path, "twice")
    found = symbols_in(made.folder, "twice")
    for stage in ("stages[1]", "stages[0]"):
        found = turned_back(found, made.folder, "twice", stage)
    assert error_of(found, symbols_in(tmp_path / "plain", "plain")) < 1e-5


def test_numbers_of_strips_are_joined_in_order():
    readings = [NumbersMeter().begin(None) for _ in range(2)]
    readings[0].feed(0, np.array([3, 1], np.complex64))
    readings[1].feed(2, np.array([2], np.complex64))
    readings[0].merge(readings[1])
    assert isinstance(readings[0], NumbersReading)
    assert readings[0].result().tolist() == [3, 1, 2]


def test_runs_are_written_as_recipes_list_them():
    assert _runs(np.array([0, 1, 2, 4, 7, 8])) == "0..2, 4, 7..8"
    assert _runs(np.array([], np.intp)) == ""


def test_a_check_tells_a_table_of_another_stimulus(lab, tmp_path):
    made = lab.make(SINGLE + STAGES, tmp_path, "turned")
    assert check(find_stimulus(made.folder))["verdict"] == "match"
    path = made.folder / "turned.choices.csv"
    path.write_text(path.read_text().replace("stages[0],4,", "stages[0],4,1"))
    found = check(find_stimulus(made.folder))
    assert found["verdict"] == "differ"
    assert [row["hash"] for row in found["files"]] == ["equal", "differs", "equal"]
    path.unlink()
    found = check(find_stimulus(made.folder))
    assert not found["is_complete"]
    assert found["files"][1]["hash"] == "missing"


def test_a_converted_stimulus_says_where_the_tables_are(lab, tmp_path):
    made = lab.make(SINGLE + STAGES, tmp_path, "turned")
    wanted = Conversion(format="wav")
    done = convert(
        made.folder / "turned.cf32_le", wanted, hints=ReadHints(), out=tmp_path / "other"
    )
    assert done.document["side_information"] is None
    (note,) = [row for row in done.document["notes"] if row["where"] == "side_information"]
    assert "turned.choices.csv" in note["text"]
