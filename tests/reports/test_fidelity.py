from wavegen.reports.fidelity import fidelity_table

SIDE = {
    "evm": [
        {
            "source": "signal",
            "percent": 4.5,
            "classes": [
                {
                    "name": "groups[0]",
                    "constellation": "qpsk",
                    "percent": 4.4,
                    "limit_percent": 17.5,
                },
                {"name": "groups[1]", "constellation": "", "percent": 4.6, "limit_percent": None},
            ],
        },
        {
            "source": "parts[1]",
            "percent": 1.0,
            "classes": [
                {"name": "symbols", "constellation": "8psk", "percent": 1.0, "limit_percent": None}
            ],
        },
    ],
    "total_error_percent": None,
    "aclr": [{"channel": "first", "offset_hz": -5e6, "ratio_db": 61.234}],
    "mask": {"margin_db": -0.5},
    "occupied_bandwidth_hz": 4.4e6,
    "raw_cubic_metric_db": 7.79,
    "papr_db": 9.87,
    "levels": [
        {"probability": 0.1, "level_db": 3.63, "resolved": True},
        {"probability": 1e-4, "level_db": 9.4, "resolved": False},
    ],
}


def test_one_side():
    table = fidelity_table({"before": SIDE, "after": None}, title="Pier")
    assert table.headings == ("figure", "value")
    rows = dict(table.rows)
    assert rows["EVM signal"] == "4.500 %"
    assert rows["EVM signal groups[0] (qpsk)"] == "4.400 % of 17.5 %"
    assert rows["EVM parts[1] (8psk)"] == "1.000 %"
    assert rows["ACLR first, -5 MHz"] == "61.23 dB"
    assert rows["mask margin"] == "-0.50 dB"
    assert rows["level at 0.01 %"] == "9.40 dB (few samples)"


def test_two_sides_and_what_one_does_not_have():
    after = {**SIDE, "total_error_percent": 4.7}
    table = fidelity_table({"before": SIDE, "after": after}, title="Pier")
    rows = {name: rest for name, *rest in table.rows}
    assert rows["error of the whole waveform"] == ["", "4.700 %"]
    assert rows["level at 10 %"] == ["3.63 dB", "3.63 dB"]
